"""Data that are constant, too few, exact, or repeat exactly: plain messages and sound verdicts."""

import numpy as np
import pytest

ALL_SCHEMES = ("leave_one_level_out", "leave_one_series_out", "leave_one_out")


@pytest.mark.parametrize("function", ["calibration", "analysis"])
def test_a_constant_stimulus_is_a_plain_message(made, function):
    rows = made.observations(np.full(9, 3.0), np.linspace(1, 2, 9), np.tile([1, 2, 3], 3))
    result = made.run(made.study(validation=ALL_SCHEMES, function=function), rows)
    assert result["selection"]["verdict"] == "not_evaluated"
    assert {item["status"] for item in result["candidates"]} == {"not_fitted"}
    assert all(item["message"] for item in result["candidates"])
    if function == "calibration":
        assert result["candidates"][0]["message"] == "the stimulus is constant: no function of it can be fitted"


def test_a_constant_response_of_an_analysis_function_is_a_plain_message(made):
    x, _, run = made.load_cell(np.random.default_rng(1))
    result = made.run(made.study(function="analysis"), made.observations(x, np.full(x.size, 4.2), run))
    assert result["selection"]["verdict"] == "not_evaluated"
    assert result["candidates"][0]["message"] == "the response is constant: no function of it can be fitted"


def test_a_constant_response_has_no_inverse(made):
    x, _, run = made.load_cell(np.random.default_rng(1))
    result = made.run(made.study((made.family(range(4)),)), made.observations(x, np.full(x.size, 4.2), run))
    assert (result["selection"]["candidate"], result["selection"]["verdict"]) == (None, "inadequate")
    assert result["selection"]["verdict_reason"] == "none of the candidates is eligible"
    assert all("monotone" in item["reason"] for item in result["candidates"])


def test_one_observation(made):
    result = made.run(made.study(validation=ALL_SCHEMES), made.observations([1.0], [2.0], [1]))
    assert result["selection"]["verdict"] == "not_evaluated"
    assert result["design"] == {
        "observations": 1,
        "levels": 1,
        "series": 1,
        "replicates": False,
        "largest_supported_parameters": 0,
        "notes": [],
    }


EXACT = {
    "line": lambda x: 1 + 0.04 * x,
    "quadratic": lambda x: 1.7 + 0.0412345 * x + 1e-4 * x**2 / 3,
}


@pytest.mark.parametrize("replicates", [1, 3])
@pytest.mark.parametrize("rule", ["one_standard_error", "smallest_loss", "aicc", "bic", "f_test"])
@pytest.mark.parametrize("shape", EXACT)
def test_exact_data_are_adequate_and_warned_of(made, shape, rule, replicates):
    """What is left is rounding: it decides nothing, flags nothing, and is not held against the function."""
    x = np.repeat(np.linspace(0, 50, 11), replicates)
    result = made.run(made.study((made.family(range(1, 7)),), rule=rule), made.observations(x, EXACT[shape](x)))
    selection = result["selection"]
    assert selection["candidate"] == {"line": "polynomial-1", "quadratic": "polynomial-2"}[shape]
    assert (selection["verdict"], selection["choice"]) == ("adequate", "decided")
    assert any("look computed" in line for line in result["warnings"])
    assert not any(result["observations"]["flag"])
    assert not any("residual standard deviations" in line for line in result["warnings"])
    assert not selection["components"]["level_deviation_found"]


def test_exact_data_that_bend_beyond_the_candidates_are_inadequate(made):
    x = np.repeat(np.linspace(0, 50, 11), 3)
    result = made.run(made.study((made.family([1]),)), made.observations(x, EXACT["quadratic"](x)))
    assert result["selection"]["verdict"] == "inadequate"
    assert not any("look computed" in line for line in result["warnings"])


def test_replicates_that_agree_exactly_do_not_hide_a_misfit(made):
    x = np.repeat(np.linspace(0, 10, 11), 2)
    wave = made.observations(x, x + 0.3 * np.sin(0.628 * x))
    result = made.run(made.study((made.family([1]),)), wave)
    assert result["selection"]["verdict"] == "inadequate"
    few = np.repeat(np.arange(6.0), 2)
    result = made.run(made.study((made.family([1]),)), made.observations(few, few + 0.3 * np.sin(few)))
    assert result["selection"]["verdict"] != "adequate"
    assert "there are no replicates" not in result["selection"]["verdict_reason"]
