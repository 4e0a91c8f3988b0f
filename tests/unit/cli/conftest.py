"""A small study on disk, an issued function, and the command line in this process."""

import importlib.util
import json
import random
from pathlib import Path

import pytest

from fitlib.cli import main

STUDY = """\
format: 1
study: level-sensors
title: Submersible level sensors
purpose: Convert loop current to water level.
stimulus: {quantity: water level, unit: m}
response: {quantity: loop current, unit: mA}
dataset_defaults:
  columns: {stimulus: level_m, response: current_mA, series: run}
datasets:
  - {id: LS-101, files: [LS-101.csv]}
  - id: LS-102
    files: [LS-102.csv]
    exclusions:
      - {where: {run: 2, level_m: 4}, reason: cable moved, person: shift lead, date: 2026-04-03}
    verification_points: {where: {run: 3}}
families:
  - {family: polynomial, degree: 1..3}
selection: {loss: leave_one_level_out, rule: one_standard_error}
"""


def observations(seed):
    """Three passes through eleven levels; numbers invented."""
    source = random.Random(seed)
    rows = ["level_m,current_mA,run"]
    for run in (1, 2, 3):
        for level in range(11):
            current = 4 + 1.6 * level + 0.004 * level * (10 - level) + source.gauss(0, 0.002)
            rows.append(f"{level},{current:.5f},{run}")
    return "\n".join(rows) + "\n"


@pytest.fixture
def study(tmp_path, monkeypatch):
    """Stand in a folder with a study of two datasets."""
    monkeypatch.chdir(tmp_path)
    Path("study.yaml").write_text(STUDY, encoding="utf-8")
    for number in (101, 102):
        Path(f"LS-{number}.csv").write_text(observations(number), encoding="utf-8")
    return tmp_path


@pytest.fixture(scope="session")
def function_records():
    """The function files of the tests of conversion."""
    path = Path(__file__).parents[1] / "conversion" / "conftest.py"
    spec = importlib.util.spec_from_file_location("function_records", path)
    module = importlib.util.module_from_spec(spec)
    spec.loader.exec_module(module)
    return module


@pytest.fixture
def issue(tmp_path, monkeypatch, function_records):
    """Write an issued function to ``LS-101.json`` of the folder in which we stand."""
    monkeypatch.chdir(tmp_path)

    def write(kind="rising", **changes):
        record = getattr(function_records, kind)(**changes)
        Path("LS-101.json").write_text(json.dumps(function_records.sealed(record)), encoding="utf-8")
        return record

    return write


@pytest.fixture
def fitlib(capsys):
    """Call the command in this process: status, standard output, standard error."""

    def call(*words):
        status = main([str(word) for word in words])
        captured = capsys.readouterr()
        return status, captured.out, captured.err

    return call
