"""A small study on disk, written anew for each test, and its plan."""

from pathlib import Path

import pytest

from fitlib.plan import CodeIdentity, make, make_plan
from fitlib.study import load_study

HEAD = """\
format: 1
study: trial
title: Trial
purpose: Try the plan.
random_seed: 7
stimulus: {quantity: force, unit: kN}
response: {quantity: voltage ratio, unit: mV/V}
"""
DEFAULTS = """\
dataset_defaults:
  columns: {stimulus: load, response: reading, series: run}
"""
DATASETS = """\
datasets:
  - {id: cell-1, files: [cell-1.csv]}
  - {id: cell-2, files: [cell-2.csv], record: {serial_number: '2'}}
"""
TAIL = """\
families:
  - {family: polynomial, degree: 1..2}
weighting: none
validation:
  - {scheme: leave_one_level_out}
  - {scheme: bootstrap, draws: 20}
selection: {loss: leave_one_level_out, rule: one_standard_error}
"""
STUDY = HEAD + DEFAULTS + DATASETS + TAIL


def rows(slope: float) -> str:
    lines = [f"{run},{load},{slope * load + 0.001 * run}" for run in (1, 2) for load in range(7)]
    return "\n".join(["run,load,reading", *lines]) + "\n"


class Folder:
    """A study folder that a test edits and plans again."""

    def __init__(self, root: Path):
        self.root = root
        self.write("study.yaml", STUDY)
        self.write("cell-1.csv", rows(0.5))
        self.write("cell-2.csv", rows(0.4))

    def write(self, name: str, text: str) -> Path:
        path = self.root / name
        path.write_text(text, encoding="utf-8")
        return path

    def edit(self, old: str, new: str) -> None:
        path = self.root / "study.yaml"
        text = path.read_text(encoding="utf-8")
        assert old in text
        path.write_text(text.replace(old, new), encoding="utf-8")

    def plan(self, **options):
        return make_plan(load_study(str(self.root / "study.yaml")), **options)


@pytest.fixture
def folder(tmp_path, monkeypatch):
    """The program's own text is left out: `test_code.py` looks at it, and a plan takes its hashes as they come."""
    monkeypatch.setattr(make, "code_identity", lambda cache=None: CodeIdentity("n" * 64, "d" * 64, "r" * 64))
    return Folder(tmp_path)
