"""The load-cell study as a user runs it, against NIST's published values.

Source: NIST Statistical Reference Datasets, "Pontius", and NIST/SEMATECH e-Handbook of Statistical Methods, section
4.6.1 (doi 10.18434/M32189); values in cases/nist_pmd61_pontius.json.
"""

import json
from pathlib import Path

import pytest

from fitlib.analysis import assemble, run_step, step_names
from fitlib.observations import read_observations
from fitlib.study import load_study

ROOT = Path(__file__).parents[2]
CASE = json.loads((ROOT / "tests/reference/cases/nist_pmd61_pontius.json").read_text(encoding="utf-8"))
PUBLISHED = {check["quantity"]: float(check["published"]) for check in CASE["checks"] if check.get("published")}


@pytest.fixture(scope="module")
def result():
    study = load_study(ROOT / "configs/reference-load-cell/study.yaml")
    (dataset,) = study.datasets
    observations = read_observations(study, dataset)
    steps: dict[str, dict] = {}
    for step in step_names(study):
        steps[step] = run_step(step, study, dataset, observations, steps)
    return assemble(study, dataset, observations, steps)


def _candidate(result, name):
    return next(item for item in result["candidates"] if item["candidate"] == name)


def test_the_quadratic_is_chosen_by_levels_and_one_standard_error(result):
    assert (result["settings"]["loss"], result["settings"]["rule"]) == ("leave_one_level_out", "one_standard_error")
    assert result["selection"]["candidate"] == "polynomial-2"
    assert result["selection"]["verdict"] == "adequate"


def _digits(result, change=1.0):
    terms = _candidate(result, "polynomial-2")["terms"]
    for k, term in enumerate(terms):
        assert term["estimate"] * change == pytest.approx(PUBLISHED[f"StRD B{k}"], rel=1e-13, abs=0.0)
        assert term["standard_uncertainty"] * change == pytest.approx(PUBLISHED[f"StRD sd B{k}"], rel=1e-13, abs=0.0)
    deviation = _candidate(result, "polynomial-2")["residual_standard_deviation"]
    assert deviation * change == pytest.approx(PUBLISHED["StRD residual SD"], rel=1e-13, abs=0.0)


def test_coefficients_and_their_standard_deviations_to_thirteen_digits(result):
    _digits(result)


def test_a_change_in_the_twelfth_digit_is_seen(result):
    with pytest.raises(AssertionError):
        _digits(result, 1 + 2e-12)


def test_the_line_is_rejected_by_lack_of_fit(result):
    line = _candidate(result, "polynomial-1")
    lack = line["lack_of_fit"]
    assert lack["f"] == pytest.approx(214.75, abs=0.005)
    assert (lack["numerator_df"], lack["denominator_df"]) == (18, 20)
    assert "lack of fit F = 214.75 on 18 and 20 degrees of freedom" in line["reason"]
    assert not line["chosen"]
