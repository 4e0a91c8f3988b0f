"""Figure `data`."""

from __future__ import annotations

import re
from xml.etree import ElementTree

import numpy as np
import pytest

from fitlib.figures.data import draw_data
from fitlib.figures.style import drawing_style
from fitlib.figures.view import View


def draw(result: dict) -> list[str]:
    """The lines of text of the figure."""
    with drawing_style():
        svg = draw_data(View(result))
    return [element.text or "" for element in ElementTree.fromstring(svg).iter("{http://www.w3.org/2000/svg}text")]


def ticks(lines: list[str]) -> list[str]:
    """Texts that are numbers only."""
    return [line for line in lines if re.fullmatch(r"−?\d+(\.\d+)?", line)]


def test_the_legend_names_series_states_and_counts(result):
    lines = draw(result)
    for wanted in ("series 1, n = 10", "series 2, n = 11", "verification points, n = 11", "excluded, n = 1",
                   "suspect (kept), n = 1", "rising (filled)", "falling (open)"):  # fmt: skip
        assert wanted in lines


def test_band_and_interval_are_named_apart_with_their_coverage_probability(result):
    lines = draw(result)
    assert "confidence band of the mean response, coverage probability 0.95" in lines
    assert "prediction interval of one new observation, coverage probability 0.95" in lines


def test_an_inadequate_function_is_marked_and_has_no_band(result):
    result["selection"]["verdict"] = "inadequate"
    lines = draw(result)
    assert "LS-101: observations and functions – verdict inadequate" in lines
    assert any(line.startswith(f"{result['selection']['candidate']} (chosen, verdict inadequate") for line in lines)
    assert not any("coverage probability" in line for line in lines)
    assert any(line.startswith("No confidence band and no prediction interval") for line in lines)


def test_a_function_that_was_not_evaluated_is_marked_and_its_band_has_a_reserve(result):
    result["selection"]["verdict"] = "not_evaluated"
    lines = draw(result)
    assert any("(chosen, verdict not evaluated" in line for line in lines)
    assert any("coverage probability" in line for line in lines)
    assert "Band and interval hold only if the function is adequate, which was not evaluated." in lines


def test_axes_carry_quantity_and_unit(result):
    lines = draw(result)
    assert "loop current /\N{NO-BREAK SPACE}mA" in lines
    assert "water level /\N{NO-BREAK SPACE}m" in lines


def test_a_wild_rival_does_not_move_the_limits_and_is_told(result):
    quiet = draw(result)
    wild = np.array(result["curves"]["candidates"]["polynomial-9"])
    wild[100] += 1e4
    result["curves"]["candidates"]["polynomial-9"] = wild.tolist()
    lines = draw(result)
    assert ticks(lines) == ticks(quiet)
    told = [line for line in lines if line.startswith("polynomial-9 leaves the upper panel: it reaches 1 × 10⁴ mA")]
    assert len(told) == 1
    assert not any(line.startswith("polynomial-9 leaves the upper panel") for line in quiet)


def test_a_far_excluded_observation_stays_at_the_edge_and_is_named(result):
    quiet = draw(result)
    at = result["observations"]["state"].index("excluded")
    result["observations"]["response"][at] = 1e6
    lines = draw(result)
    row = result["observations"]["row"][at]
    assert f"Excluded observations far from the rest are drawn at the edge: row {row}." in lines
    assert ticks(lines) == ticks(quiet)


def test_an_excluded_row_that_cannot_be_read_is_counted(result):
    at = result["observations"]["state"].index("excluded")
    result["observations"]["response"][at] = None
    assert "1 excluded observation has no readable number and cannot be drawn." in draw(result)


def test_never_more_than_four_curves_and_each_once(result):
    result["selection"].update(
        candidate="polynomial-2", runner_up="polynomial-3", smallest_loss_candidate="polynomial-4"
    )
    drawn = View(result).drawn
    assert [one.candidate for one in drawn] == ["polynomial-2", "polynomial-3", "polynomial-4", "polynomial-9"]
    result["selection"].update(runner_up="polynomial-9", smallest_loss_candidate="polynomial-2")
    assert [one.label for one in View(result).drawn] == [
        "polynomial-2 (chosen, smallest loss)",
        "polynomial-9 (runner-up, most parameters)",
    ]


def test_without_a_choice_the_lower_panel_says_so(without_choice):
    assert "No function was chosen, so there are no deviations to show." in draw(without_choice)


@pytest.mark.parametrize("key", ["stimulus", "response"])
def test_an_analysis_function_is_drawn_against_the_response(result, key):
    settings, curves = result["settings"], result["curves"]
    settings.update(function="analysis", fitted=settings["stimulus"])
    curves["abscissa"] = settings["response"]
    curves[key] = curves.pop("stimulus")
    lines = draw(result)
    upward, across = "water level /\N{NO-BREAK SPACE}m", "loop current /\N{NO-BREAK SPACE}mA"
    assert lines.index(upward) < lines.index(across)  # the label of the upper panel's vertical axis comes first
