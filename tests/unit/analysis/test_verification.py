"""Verification points: kept out, compared with the prediction interval, never extrapolated."""

from dataclasses import replace

import numpy as np
import pytest


def _observed(made, extra_force, extra_shift):
    rng = np.random.default_rng(8)
    force, ratio, run = made.load_cell(rng, deviation=0.0)
    force = np.append(force, extra_force)
    ratio = np.append(ratio, 0.04 * np.asarray(extra_force) + 8e-6 * np.asarray(extra_force) * 20 + extra_shift)
    run = np.append(run, [9] * len(extra_force))
    observations = made.observations(force, ratio, run)
    used = len(force) - len(extra_force)
    state = ("used",) * used + ("verification",) * len(extra_force)
    index = np.append(np.unique(force[:used], return_inverse=True)[1], [-1] * len(extra_force))
    return replace(observations, state=state, level_index=index)


@pytest.fixture
def result(made):
    study = made.study((made.family([1, 2, 3]),))
    return made.run(study, _observed(made, [30.0, 30.0, 62.5], [0.0, 0.02, 0.0]))


def test_points_are_compared_with_the_prediction_interval(result):
    inside, off, _ = result["verification"]
    assert inside["within_prediction_interval"] is True
    assert inside["prediction_lower"] < inside["response"] < inside["prediction_upper"]
    assert off["within_prediction_interval"] is False
    assert off["evaluated_deviation"] == pytest.approx(0.02 / 0.04, rel=0.01)


def test_a_point_outside_the_measuring_interval_is_not_evaluated(result):
    beyond = result["verification"][2]
    assert beyond["verdict"] == "above_range"
    for name in ("fitted", "residual", "evaluated_deviation", "prediction_lower", "within_prediction_interval"):
        assert beyond[name] is None


def test_page_one_says_so(result):
    text = "\n".join(result["warnings"])
    assert "1 of 3 verification points lie outside the 95 % prediction interval: data/LC-1.csv row 102" in text
    assert "not evaluated, as outside the measuring interval: 1 verification point" in text
