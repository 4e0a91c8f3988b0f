"""A small valid study, and helpers to change it and load it."""

from __future__ import annotations

from pathlib import Path

import pytest

from fitlib.errors import InputError, Problem
from fitlib.study import Study, load_study

VALID = """\
format: 1
study: flow-meters
title: Turbine flow meters
stimulus: {quantity: flow, unit: L/min}
response: {quantity: frequency, unit: Hz}
datasets:
  - id: FM-1
    files: [data/fm-1.csv]
    columns: {stimulus: flow, response: hertz}
families:
  - {family: polynomial, degree: 1..3}
selection:
  loss: leave_one_level_out
  rule: one_standard_error
"""

FULL = """\
format: 1
study: level-sensors                 # names the results folder
title: Submersible level sensors, spring batch
purpose: Convert loop current to water level.
random_seed: 20260401

stimulus: {quantity: water level, unit: m}
response: {quantity: loop current, unit: mA}

dataset_defaults:
  columns: {stimulus: level_m, response: current_mA, series: run, direction: way}
  measuring_interval: [0, 10]
  evaluation: inverse
  level_tolerance: 0.02
  function: calibration
  record: {conditions: 23 °C, reference_standard: dip gauge D-2, certificate: C-118, due: 2027-03-01}

datasets:
  - id: LS-101
    files: [data/LS-101-spring.csv, data/LS-101-autumn.csv]
    record: {serial_number: LS-101, date: 2026-04-03}
    exclusions:
      - {where: {run: 2, level_m: 4.0}, reason: cable moved, person: shift lead, date: 2026-04-03}
    verification_points: {where: {run: 9}}
  - {ids_from: "data/batch-*.csv"}

families:
  - {family: polynomial, degree: 0..6}
  - {family: polynomial, degree: 1..3, fixed_points: [[0, 4]]}

weighting: none

validation:
  - {scheme: leave_one_level_out}
  - {scheme: leave_one_series_out}
  - {scheme: leave_one_out}
  - {scheme: k_fold, folds: 5, repeats: 20}
  - {scheme: bootstrap, draws: 2000, unit: level}

selection:
  loss: leave_one_level_out
  rule: one_standard_error
  require: {monotone: true, degrees_of_freedom: 3}
  target_uncertainty: {expanded: 0.01, coverage_factor: 2}
"""
DATA_FILES = ("fm-1.csv", "fm-2.csv", "LS-101-spring.csv", "LS-101-autumn.csv", "batch-1.csv", "batch-2.csv")


class Bench:
    """A folder with data files, in which studies are written and loaded."""

    def __init__(self, folder: Path):
        self.folder = folder
        self.path = folder / "study.yaml"
        (folder / "data").mkdir()
        for name in DATA_FILES:
            (folder / "data" / name).write_text("a,b\n1,2\n")

    def load(self, text: str | bytes = VALID, *changes: tuple[str, str]) -> Study:
        """Write a study with some passages replaced, and load it; each passage has to be there."""
        for old, new in changes:
            assert old in text, f"the study has no {old!r}"
            text = text.replace(old, new)
        self.path.write_bytes(text if isinstance(text, bytes) else text.encode())
        return load_study(self.path)

    def problems(self, text: str | bytes = VALID, *changes: tuple[str, str]) -> tuple[Problem, ...]:
        """Return the problems of a study that must not load."""
        with pytest.raises(InputError) as caught:
            self.load(text, *changes)
        return caught.value.problems

    def only(self, text: str | bytes = VALID, *changes: tuple[str, str]) -> tuple[int | None, str, str]:
        """Return line, key and message of the one problem of a study."""
        problems = self.problems(text, *changes)
        assert len(problems) == 1, [str(problem) for problem in problems]
        return problems[0].line, problems[0].key, problems[0].message


@pytest.fixture
def bench(tmp_path: Path) -> Bench:
    return Bench(tmp_path)


@pytest.fixture(scope="session")
def valid() -> str:
    return VALID


@pytest.fixture(scope="session")
def full() -> str:
    return FULL
