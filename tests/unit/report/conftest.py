"""Invented bundles for the tests of the report; the results are those of the tests of the figures."""

from __future__ import annotations

import copy
import importlib.util
from pathlib import Path

import pytest

_PLACE = Path(__file__).parents[1] / "figures" / "conftest.py"
_SPEC = importlib.util.spec_from_file_location("fitlib_figures_conftest", _PLACE)
_figures = importlib.util.module_from_spec(_SPEC)
_SPEC.loader.exec_module(_figures)

HOSTILE = _figures.HOSTILE
result, without_choice, empty, hostile = (
    _figures.result,
    _figures.without_choice,
    _figures.empty,
    _figures.hostile,
)

STUDY = {
    "format": 1, "study": "level-sensors", "title": "Submersible level sensors", "random_seed": 20260401,
    "purpose": "Convert loop current to water level.",
    "stimulus": {"quantity": "water level", "unit": "m"}, "response": {"quantity": "loop current", "unit": "mA"},
    "datasets": [], "weighting": "none",
    "families": [{"family": "polynomial", "degree": [0, 1], "candidates": ["polynomial-0", "polynomial-1"]}],
    "validation": [
        {"id": "leave_one_level_out", "scheme": "leave_one_level_out", "unit": None, "folds": None},
        {"id": "k_fold", "scheme": "k_fold", "unit": "level", "folds": 5, "repeats": 20},
    ],
    "selection": {
        "loss": "leave_one_level_out", "rule": "one_standard_error", "alpha": None,
        "require": {"monotone": True, "degrees_of_freedom": 3},
        "target_uncertainty": {"expanded": 0.01, "coverage_factor": 2},
    },
}  # fmt: skip


@pytest.fixture
def make_bundle():
    """A function that makes a bundle of results."""

    def make(*results: dict, failures: tuple = ()) -> dict:
        return {"study": copy.deepcopy(STUDY), "results": list(results), "failures": list(failures)}

    return make


@pytest.fixture
def hostile_text() -> str:
    """A text that tries to break out."""
    return HOSTILE


SVG = (
    '<svg xmlns="http://www.w3.org/2000/svg" role="img" aria-labelledby="{0}-title {0}-description">'
    '<title id="{0}-title">t</title><desc id="{0}-description">d</desc>'
    '<defs><path id="{0}-1" d="M 0 0"/></defs><use href="#{0}-1" clip-path="url(#{0}-1)"/></svg>\n'
)


@pytest.fixture
def drawings() -> dict[str, str]:
    """Four tiny drawings shaped as the figures write them."""
    return {name: SVG.format(name) for name in ("data", "loss", "residuals", "level_loss")}
