"""Figures `residuals` and `level_loss`."""

from __future__ import annotations

from xml.etree import ElementTree

import numpy as np
import pytest

from fitlib.figures.level_loss import draw_level_loss, end_share
from fitlib.figures.residuals import draw_residuals
from fitlib.figures.style import drawing_style
from fitlib.figures.view import View


def draw(function, result: dict) -> list[str]:
    """The lines of text of a figure."""
    with drawing_style():
        svg = function(View(result))
    return [element.text or "" for element in ElementTree.fromstring(svg).iter("{http://www.w3.org/2000/svg}text")]


def test_residuals_stand_against_stimulus_fitted_value_and_order(result):
    lines = draw(draw_residuals, result)
    for label in ("water level /\N{NO-BREAK SPACE}m", "fitted loop current /\N{NO-BREAK SPACE}mA", "order read"):
        assert label in lines
    chosen = next(row for row in result["candidates"] if row["chosen"])
    value = f"{chosen['residual_standard_deviation']:.3g}"
    assert f"± residual standard deviation, {value} mA" in lines


def test_a_weighted_fit_has_no_common_residual_standard_deviation(result):
    result["settings"]["weighting"] = "inverse_stimulus_squared"
    lines = draw(draw_residuals, result)
    assert not any(line.startswith("± residual standard deviation") for line in lines)
    assert any("differs from point to point" in line for line in lines)


def test_without_a_choice_the_residual_panels_say_so(without_choice):
    assert draw(draw_residuals, without_choice).count("No residuals: no function was chosen.") == 3


def test_the_share_of_the_end_levels_is_that_of_the_sum_of_squares(result):
    losses = np.full(11, 1.0)
    losses[[0, -1]] = 9.0
    for level in result["levels"]:
        level["observations"] = 3
    assert end_share(View(result), losses) == pytest.approx(18 / 27)
    result["levels"][0]["observations"] = 6
    assert end_share(View(result), losses) == pytest.approx((6 * 9 + 3 * 9) / (6 * 9 + 3 * 9 + 27))


def test_the_share_counts_each_level_by_its_weight(result):
    for at, level in enumerate(result["levels"]):
        level.update(level=2.0**at, observations=1)
    result["settings"]["weighting"] = "inverse_stimulus"
    weights = 0.5 ** np.arange(11)
    share = end_share(View(result), np.ones(11))
    assert share == pytest.approx((weights[0] + weights[-1]) / weights.sum())


def test_the_share_is_said_in_words(result):
    lines = draw(draw_level_loss, result)
    assert any("the 2 end levels of 11 carry" in line and "(an equal share would be 18 %)" in line for line in lines)


def test_without_level_losses_the_panel_says_so(result):
    for scheme in result["schemes"]:
        scheme["level_losses"] = {}
    assert "No scheme gave a loss per level." in draw(draw_level_loss, result)


def test_levels_that_were_not_left_out_leave_gaps(result):
    for scheme in result["schemes"]:
        for losses in scheme["level_losses"].values():
            losses[3] = None
    assert any("carry" in line for line in draw(draw_level_loss, result))
