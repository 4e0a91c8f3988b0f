"""Figure `loss`."""

from __future__ import annotations

from xml.etree import ElementTree

import pytest

from fitlib.figures.loss import RULE_NOTES, draw_loss
from fitlib.figures.style import PAPER, drawing_style
from fitlib.figures.view import View


def draw(result: dict) -> tuple[str, list[str]]:
    """The figure and its lines of text."""
    with drawing_style():
        svg = draw_loss(View(result))
    return svg, [e.text or "" for e in ElementTree.fromstring(svg).iter("{http://www.w3.org/2000/svg}text")]


def hollow(svg: str) -> int:
    """Number of hollow points, the legend's included."""
    uses = ElementTree.fromstring(svg).iter("{http://www.w3.org/2000/svg}use")
    return sum(f"fill: {PAPER}" in (use.get("style") or "") for use in uses)


def test_schemes_fitted_points_threshold_and_choice_are_named(result):
    lines = draw(result)[1]
    chosen = result["selection"]["candidate"]
    for wanted in ("held out, leave_one_level_out (decides)", "held out, leave_one_series_out",
                   "held out, leave_one_out", "fitted points (not held out)", "one-standard-error threshold",
                   f"chosen: {chosen}", "hollow: not eligible", "root of loss /\N{NO-BREAK SPACE}mA"):  # fmt: skip
        assert wanted in lines


def test_ineligible_candidates_are_hollow_under_every_scheme(result):
    result["candidates"] = result["candidates"][1:]  # degree 0 lies above the panel
    ineligible = [row for row in result["candidates"] if not row["eligible"]]
    assert ineligible
    some = hollow(draw(result)[0])
    for row in result["candidates"]:
        row["eligible"] = True
    svg, lines = draw(result)
    assert "hollow: not eligible" not in lines
    assert some - hollow(svg) == 3 * len(ineligible) + 1  # three schemes, and the legend


def test_losses_above_the_panel_are_named(result):
    lines = draw(result)[1]
    assert any(line.startswith("Losses above the panel: polynomial-0 (all)") for line in lines)
    result["candidates"] = result["candidates"][1:3]
    assert not any(line.startswith("Losses above the panel") for line in draw(result)[1])


def test_candidates_without_a_loss_are_named(result):
    result["candidates"][7]["losses"]["leave_one_level_out"]["loss"] = None
    assert "Without a deciding loss (reasons in the table): polynomial-7." in draw(result)[1]


def test_entries_of_the_families_are_told_apart(result):
    for row in result["candidates"][1:4]:
        result["candidates"].append(row | {"candidate": row["candidate"] + "-fixed", "group": 1})
    assert "polynomial-1-fixed … polynomial-3-fixed" in draw(result)[1]


def test_a_weighted_loss_is_drawn_without_a_root(result):
    result["settings"]["weighting"] = "inverse_stimulus"
    assert "loss, weighted /\N{NO-BREAK SPACE}mA²" in draw(result)[1]


@pytest.mark.parametrize("rule", ["aicc", "f_test"])
def test_without_a_deciding_loss_the_rule_is_named(result, rule):
    result["settings"].update(loss=None, rule=rule)
    result["selection"]["threshold"] = None
    lines = draw(result)[1]
    assert f"The rule {rule} decides without a held-out loss." in lines
    assert not any("(decides)" in line for line in lines)


@pytest.mark.parametrize("rule", ["supported_gain", "smallest_loss"])
def test_without_a_threshold_the_rule_is_said_in_words_and_the_choice_is_ringed(result, rule):
    result["settings"]["rule"] = rule
    result["selection"]["threshold"] = None
    lines = draw(result)[1]
    assert "one-standard-error threshold" not in lines
    assert f"chosen: {result['selection']['candidate']}" in lines
    told = " ".join(lines)
    assert RULE_NOTES[rule] in told


def test_losses_of_zero_are_kept_and_told(result):
    for row in result["candidates"]:
        for entry in row["losses"].values():
            entry.update(loss=0.0, standard_error=0.0)
        row["fitted_point_loss"] = 0.0
    result["selection"]["threshold"] = 0.0
    assert "A loss of zero is drawn at the foot of the panel." in draw(result)[1]
