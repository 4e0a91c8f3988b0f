"""The rules against each other on a small part of the simulation bench, and the verdict on 100 seeded studies.

The bench is choices.py; its full tables are in choices.md. Here: all scenarios of half B in which some candidate is
adequate, with a fifth of the studies.
"""

import importlib.util
import sys
from pathlib import Path

import numpy as np
import pytest

STUDIES = 20
#: Least distance between the 95th percentiles of the regret.
MARGIN = 0.1
OTHERS = ("smallest_loss", "bic", "f_test", "rows_smallest_loss")
VERDICTS = 100


@pytest.fixture(scope="module")
def bench():
    """The script, loaded without running it."""
    spec = importlib.util.spec_from_file_location("choices_bench", Path(__file__).with_name("choices.py"))
    module = importlib.util.module_from_spec(spec)
    sys.modules[spec.name] = module  # dataclasses look their module up
    spec.loader.exec_module(module)
    yield module
    del sys.modules[spec.name]


@pytest.fixture(scope="module")
def outcomes(bench):
    half = [scenario for scenario in bench.scenarios() if scenario.half == "B"]
    adequate = [item for item in half if bench.best_misfit(item) < bench.ADEQUATE * item.level_noise]
    return [bench.simulate(scenario, STUDIES) for scenario in adequate]


@pytest.fixture(scope="module")
def high(bench, outcomes):
    """95th percentile of the regret of each rule, averaged over the scenarios."""
    rules = (*bench.RULES, *bench.ALTERNATIVES)
    return {rule: float(bench.high_regrets(outcomes, rule).mean()) for rule in rules}


@pytest.mark.parametrize("other", OTHERS)
def test_the_default_rule_seldom_goes_far_wrong(high, other):
    assert high["supported_gain"] < high[other] - MARGIN


def test_without_its_two_looks_the_rule_would_not_pass(bench, outcomes, monkeypatch):
    """The twin, on a quarter of the scenarios: any smaller loss is preferred, whatever its support."""
    part = outcomes[::4]
    monkeypatch.setattr(bench.gains, "LEAST_STANDARD_ERRORS", 0.0)
    monkeypatch.setattr(bench, "ALPHA", 1.1)  # every p is below it
    loose = [bench.simulate(outcome.scenario, STUDIES) for outcome in part]
    others = [bench.high_regrets(part, other).mean() for other in OTHERS]
    assert not bench.high_regrets(loose, "supported_gain").mean() < min(others) - MARGIN


def test_both_halves_share_every_pair_of_settings(bench):
    """Otherwise half B would speak of other designs than half A."""
    pairs = {"A": set(), "B": set()}
    for item in bench.scenarios():
        settings = (item.shape, item.levels, item.series, (item.repeatability, item.shared))
        pairs[item.half] |= {(a, b, settings[a], settings[b]) for a in range(4) for b in range(a)}
    assert pairs["A"] == pairs["B"]
    assert len(pairs["A"]) == 7 * 4 + 7 * 3 + 7 * 5 + 4 * 3 + 4 * 5 + 3 * 5


def test_regret_counts_from_the_best_candidate_in_hindsight(bench, outcomes):
    """Against numpy's own least squares, for one study of each scenario."""
    for outcome in outcomes[:5]:
        scenario = outcome.scenario
        x, y, _, _ = bench.make_rows(scenario, 0)
        truth = bench.SHAPES[scenario.shape](bench.GRID)
        curves = [np.polynomial.Polynomial.fit(x, y, degree)(bench.GRID) for degree in scenario.degrees]
        errors = [np.sqrt(np.mean((curve - truth) ** 2)) for curve in curves]
        possible = np.array(errors) / min(errors)
        for regret in outcome.regret.values():
            assert np.abs(possible - regret[0]).min() < 1e-6


def _inadequate(made, bench, degree: int, shape: str) -> int:
    """Studies of 100 in which one polynomial is called inadequate, through all steps."""
    study = bench.with_rule(made.study((made.family([degree]),)))
    count = 0
    for seed in range(VERDICTS):
        rows = made.load_cell(np.random.default_rng([2026, seed]), shape=shape)
        count += made.run_steps(study, made.observations(*rows))["selection"]["verdict"] == "inadequate"
    return count


def test_a_straight_line_through_an_s_is_inadequate(made, bench):
    """S of 0.005 mV/V, level deviations of 0.0003, on story A's design."""
    assert _inadequate(made, bench, 1, "s") >= 95


def test_the_right_quadratic_is_not_called_inadequate(made, bench):
    assert _inadequate(made, bench, 2, "bowed") <= 5


def test_a_straight_line_through_the_same_bowed_data_is_inadequate(made, bench):
    """The twin: with the quadratic's data a wrong candidate is found out."""
    assert _inadequate(made, bench, 1, "bowed") >= 95
