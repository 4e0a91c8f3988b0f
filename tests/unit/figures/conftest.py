"""Invented results for the tests of the figures."""

from __future__ import annotations

import copy
import importlib.util
from pathlib import Path

import pytest

_SPEC = importlib.util.spec_from_file_location("fitlib_invented_result", Path(__file__).with_name("invented.py"))
invented = importlib.util.module_from_spec(_SPEC)
_SPEC.loader.exec_module(invented)

HOSTILE = '<script>alert(1)</script> $x^2$ 100 % "onload=x" {{7*7}} 水位 \x00 &amp; \\frac{1}{2}'
_RESULT = invented.make_result()


@pytest.fixture
def result() -> dict:
    """The invented result of one level sensor, to be changed at will."""
    return copy.deepcopy(_RESULT)


@pytest.fixture
def make_result():
    """The function that invents results."""
    return invented.make_result


@pytest.fixture
def without_choice(result) -> dict:
    """A result in which no candidate was chosen."""
    for key in ("candidate", "runner_up", "threshold", "smallest_loss_candidate", "choice", "loss", "margin"):
        result["selection"][key] = None
    result["selection"]["verdict"] = "not_evaluated"
    for key in ("fitted", "residual", "leverage", "studentized_residual"):
        result["observations"][key] = [None] * len(result["observations"]["state"])
    for row in result["candidates"]:
        row.update(chosen=False, reason="no choice: the deciding scheme does not apply")
    result["curves"].update(confidence_band=None, prediction_interval=None)
    return result


@pytest.fixture
def empty(result) -> dict:
    """A result without any observation, candidate or scheme."""
    result["observations"] = {key: [] for key in result["observations"]}
    result.update(candidates=[], schemes=[], levels=[], verification=[], account=[], warnings=[])
    result["curves"].update(stimulus=[], candidates={}, confidence_band=None, prediction_interval=None)
    result["selection"] = dict.fromkeys(result["selection"]) | {"verdict": "not_evaluated", "rankings": {}}
    return result


@pytest.fixture
def hostile(result) -> dict:
    """A result whose every text of a user tries to break out."""
    result["dataset"] = HOSTILE
    for key in ("stimulus", "response", "fitted", "evaluated"):
        result["settings"][key] = {"quantity": f"{key} {HOSTILE}", "unit": "$m/s$<b>"}
    for key in ("series", "direction", "file"):
        result["observations"][key] = [f"{value}{HOSTILE}" for value in result["observations"][key]]
    result["observations"]["reason"] = [f"{value}{HOSTILE}" for value in result["observations"]["reason"]]
    result["warnings"] = [HOSTILE]
    result["settings"]["record"] = {HOSTILE: HOSTILE}
    result["selection"]["verdict_reason"] = HOSTILE
    for row in result["candidates"]:
        row["reason"] = HOSTILE
    return result
