"""A small study that is run by Snakemake, as a person would run it."""

import io
import os
import subprocess
import sys
from pathlib import Path

import pytest

from fitlib.engine import run_study
from fitlib.engine.files import work_folder
from fitlib.plan import workflow_folder

HEAD = """\
format: 1
study: trial
title: Trial
purpose: Try the workflow.
random_seed: 7
stimulus: {quantity: force, unit: kN}
response: {quantity: voltage ratio, unit: mV/V}
dataset_defaults:
  columns: {stimulus: load, response: reading, series: run}
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
DATASETS = (
    "  - {id: cell-1, files: [cell-1.csv]}\n",
    "  - {id: cell-2, files: [cell-2.csv]}\n",
    "  - {id: cell-3, files: [cell-3.csv]}\n",
)
APART = ("run.json", "run.sha256", "manifest.json", "CHANGES.md", "changes.json")


def rows(slope: float) -> str:
    """Readings of a straight line with a small irregular deviation."""
    deviations = (3, -1, 2, -4, 0, 1, -2, 4, -3, 1, 0, -1, 2, -2)
    points = [(run, load, deviations[7 * run - 7 + load]) for run in (1, 2) for load in range(7)]
    lines = [f"{run},{load},{slope * load + 0.0001 * deviation:.6f}" for run, load, deviation in points]
    return "\n".join(["run,load,reading", *lines]) + "\n"


class Bench:
    """A study folder and its results."""

    def __init__(self, root: Path):
        self.root = root
        self.study = root / "study.yaml"
        self.results = root / "results"
        self.work = work_folder(self.results, "trial")
        root.mkdir(parents=True, exist_ok=True)
        self.write_study(*DATASETS)
        for number in (1, 2, 3):
            (root / f"cell-{number}.csv").write_text(rows(0.3 + 0.1 * number), encoding="utf-8")

    def write_study(self, *datasets: str) -> None:
        self.study.write_text(HEAD + "datasets:\n" + "".join(datasets) + TAIL, encoding="utf-8")

    def list_backwards(self) -> None:
        self.write_study(*reversed(DATASETS))

    def edit(self, name: str, old: str, new: str) -> None:
        path = self.root / name
        text = path.read_text(encoding="utf-8")
        assert old in text
        path.write_text(text.replace(old, new), encoding="utf-8")

    def run(self, **options):
        self.shown = io.StringIO()
        return run_study(self.study, self.results, stream=self.shown, **{"batches": 2, "cores": 2, **options})

    def command(self, *options: str) -> list[str]:
        return [sys.executable, "-m", "fitlib", "run", str(self.study), "--results", str(self.results), *options]

    def snakemake(self, *options: str, folder: Path | None = None) -> subprocess.CompletedProcess:
        """Plain Snakemake, away from the repository."""
        command = [sys.executable, "-m", "snakemake", "-s", str(workflow_folder() / "Snakefile"), "--cores", "2"]
        return subprocess.run(
            [*command, *options], cwd=folder or self.root, capture_output=True, text=True, timeout=120
        )

    def contents(self, revision: str, apart=APART) -> dict[str, bytes]:
        """Files of a revision but for those that tell of history and of the run."""
        folder = self.results / "trial" / revision
        return {
            path.relative_to(folder).as_posix(): path.read_bytes()
            for path in folder.rglob("*")
            if path.is_file() and path.name not in apart
        }

    def processes(self) -> list[int]:
        """Snakemake and its jobs that are alive, found by their working folder."""
        found = []
        for entry in Path("/proc").iterdir():
            try:
                if entry.name.isdigit() and os.readlink(entry / "cwd") == str(self.work.root):
                    found.append(int(entry.name))
            except OSError:
                continue
        return found


@pytest.fixture
def bench(tmp_path):
    return Bench(tmp_path / "study")
