"""What analysis issues is what conversion reads: the test vectors of a function hold for the function itself."""

import json
import random

import pytest

from fitlib.analysis import assemble, run_step
from fitlib.conversion import load_function
from fitlib.observations import read_observations
from fitlib.study import load_study

STUDY = """\
format: 1
study: issued
title: A function is issued
purpose: Test that it converts.
stimulus: {{quantity: level, unit: m}}
response: {{quantity: current, unit: mA}}
datasets:
  - {{id: A, files: [a.csv], columns: {{stimulus: x, response: y, series: run}}, {settings}}}
families:
  - {{family: polynomial, degree: 1..3{fixed}}}
weighting: {weighting}
validation:
  - {{scheme: leave_one_level_out}}
selection: {{loss: leave_one_level_out, rule: one_standard_error, require: {{monotone: {monotone}}}}}
"""

RISING, FALLING, HUMP = (
    lambda x: 4 + 1.6 * x + 0.01 * x**2,
    lambda x: 20 - 1.6 * x - 0.01 * x**2,
    lambda x: 5 + 2 * x - 0.25 * x**2,
)

CASES = {
    "calibration, rising": (RISING, {}),
    "calibration, falling": (FALLING, {}),
    "calibration through a fixed point": (RISING, {"fixed": ", fixed_points: [[1, 5.61]]"}),
    "weights that follow the stimulus": (RISING, {"weighting": "inverse_stimulus_squared"}),
    "part of the levels": (RISING, {"settings": "measuring_interval: [2, 8]"}),
    "analysis, rising": (RISING, {"settings": "function: analysis"}),
    "analysis, falling": (FALLING, {"settings": "function: analysis"}),
    "direct": (HUMP, {"settings": "evaluation: direct", "monotone": "false"}),
}


@pytest.fixture
def issue(tmp_path):
    """Run all steps of one dataset and write the function that is issued."""

    def write(curve, **changes):
        source = random.Random(20260401)
        rows = [f"{x},{curve(x) + source.gauss(0, 0.002):.6f},{run}" for run in (1, 2, 3) for x in range(1, 11)]
        (tmp_path / "a.csv").write_text("x,y,run\n" + "\n".join(rows) + "\n")
        defaults = {"settings": "evaluation: inverse", "fixed": "", "weighting": "none", "monotone": "true"}
        (tmp_path / "study.yaml").write_text(STUDY.format(**{**defaults, **changes}))
        study = load_study(str(tmp_path / "study.yaml"))
        (dataset,) = study.datasets
        observations, steps = read_observations(study, dataset), {}
        for step in ("fits", "scheme:leave_one_level_out", "selection"):
            steps[step] = run_step(step, study, dataset, observations, steps)
        record = assemble(study, dataset, observations, steps)["function"]
        (tmp_path / "function.json").write_text(json.dumps(record, allow_nan=False))
        return load_function(tmp_path / "function.json")

    return write


@pytest.mark.parametrize("name", CASES)
def test_the_test_vectors_hold(name, issue):
    curve, changes = CASES[name]
    function = issue(curve, **changes)
    direct = function.record["evaluation"] == "direct"
    given, wanted = ("stimulus", "response") if direct else ("response", "stimulus")
    vectors = function.record["test_vectors"]
    assert len(vectors) >= 20
    for vector in vectors:
        answer = function.convert(vector[given])
        assert answer.verdict == vector["verdict"]
        if answer.value is not None:
            assert answer.value == pytest.approx(vector[wanted], abs=1e-9)
            assert 0 < answer.standard_uncertainty < answer.expanded_uncertainty < 0.1


@pytest.mark.parametrize("name", [name for name in CASES if name != "direct"])
def test_both_ends_are_inside_and_the_vectors_outside_are_there(name, issue):
    curve, changes = CASES[name]
    function = issue(curve, **changes)
    verdicts = [vector["verdict"] for vector in function.record["test_vectors"]]
    assert verdicts[-2:] == ["below_range", "above_range"]
    for response in function.record["response_at_ends"]:
        assert function.convert(response).verdict == "within_interval"


def test_the_hump_is_not_unique_where_it_is_taken_twice(issue):
    function = issue(*CASES["direct"][:1], **CASES["direct"][1])
    answer = function.invert(HUMP(3.0))
    assert answer.verdict == "not_unique"
    assert answer.competing == pytest.approx((3.0, 5.0), abs=0.02)
    assert answer.turning_points == pytest.approx((4.0,), abs=0.02)
