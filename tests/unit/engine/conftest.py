"""A small study that is run step by step in this process, as the jobs of the workflow would run it."""

import shutil
from pathlib import Path

import pytest

from fitlib import figures
from fitlib.engine import batch
from fitlib.engine.batch import run_batch
from fitlib.engine.files import work_folder
from fitlib.engine.planfile import write_plan_file
from fitlib.engine.prepare import remove_unfinished
from fitlib.engine.publish import run_publish
from fitlib.plan import CodeIdentity, make, make_plan
from fitlib.study import load_study

STUDY = """\
format: 1
study: trial
title: Trial
purpose: Try the engine.
random_seed: 7
stimulus: {quantity: force, unit: kN}
response: {quantity: voltage ratio, unit: mV/V}
dataset_defaults:
  columns: {stimulus: load, response: reading, series: run}
datasets:
  - {id: cell-1, files: [cell-1.csv]}
  - {id: cell-2, files: [cell-2.csv]}
families:
  - {family: polynomial, degree: 1..2}
weighting: none
validation:
  - {scheme: leave_one_level_out}
  - {scheme: bootstrap, draws: 20}
selection: {loss: leave_one_level_out, rule: one_standard_error}
"""


def rows(slope: float) -> str:
    """Readings of a straight line with a small irregular deviation."""
    deviations = (3, -1, 2, -4, 0, 1, -2, 4, -3, 1, 0, -1, 2, -2)
    lines = [
        f"{run},{load},{slope * load + 0.0001 * deviations[7 * run - 7 + load]:.6f}"
        for run in (1, 2)
        for load in range(7)
    ]
    return "\n".join(["run,load,reading", *lines]) + "\n"


class Bench:
    """A study folder, its results, and the chain of jobs."""

    def __init__(self, root: Path):
        self.root = root
        self.results = root / "results"
        self.work = work_folder(self.results, "trial")
        self.write("study.yaml", STUDY)
        self.write("cell-1.csv", rows(0.5))
        self.write("cell-2.csv", rows(0.4))

    def write(self, name: str, text: str) -> Path:
        path = self.root / name
        path.write_text(text, encoding="utf-8")
        return path

    def edit(self, name: str, old: str, new: str) -> None:
        text = (self.root / name).read_text(encoding="utf-8")
        assert old in text
        self.write(name, text.replace(old, new))

    def plan(self, batches: int = 16):
        return make_plan(load_study(str(self.root / "study.yaml")), batches)

    def plan_file(self, batches: int = 16) -> tuple:
        plan = self.plan(batches)
        self.work.create()
        return plan, write_plan_file(plan, self.root / "study.yaml", self.work)

    def run(self, batches: int = 16) -> tuple[dict | None, dict]:
        """Do what Snakemake would do; return the marker (None when there was nothing to do) and the steps computed."""
        plan, plan_file = self.plan_file(batches)
        remove_unfinished(plan, self.work)
        if self.work.marker(plan.digest).exists():
            return None, {}
        computed = self.run_batches(plan, plan_file)
        return run_publish(plan_file, self.work.marker(plan.digest)), computed

    def run_batches(self, plan, plan_file) -> dict:
        """Return how many steps were computed, by batch that had no output."""
        missing = [batch for batch in plan.batches if not (self.work.batches / batch.file_name).exists()]
        outputs = {each.name: run_batch(plan_file, each.name, self.work.batches / each.file_name) for each in missing}
        return {name: sum(output["account"]["computed"].values()) for name, output in outputs.items()}

    def contents(self, revision: str) -> dict[str, bytes]:
        """Files of a revision but for those that tell of history and of the run."""
        folder = self.results / "trial" / revision
        apart = ("run.json", "run.sha256", "manifest.json", "CHANGES.md", "changes.json", "report.html")
        return {
            path.relative_to(folder).as_posix(): path.read_bytes()
            for path in folder.rglob("*")
            if path.is_file() and path.name not in apart
        }


def stand_ins(patch: pytest.MonkeyPatch) -> None:
    """Tests in ``tests/workflow`` use the real ones: the text of the program, and figures, which take their time."""
    for module in (make, batch):
        patch.setattr(module, "code_identity", lambda cache=None: CodeIdentity("n" * 64, "d" * 64, "r" * 64))
    patch.setattr(figures, "draw_dataset", lambda result: {"data": f"<svg><!-- {len(str(result))} --></svg>"})


@pytest.fixture
def bench(tmp_path, monkeypatch):
    """A study that has never run."""
    stand_ins(monkeypatch)
    return Bench(tmp_path)


@pytest.fixture(scope="session")
def published(tmp_path_factory):
    """A study that has run once; tests take copies of it."""
    root = tmp_path_factory.mktemp("published")
    with pytest.MonkeyPatch.context() as patch:
        stand_ins(patch)
        bench = Bench(root)
        return bench, *bench.run()


@pytest.fixture
def done(published, tmp_path, monkeypatch):
    """A bench whose study has been published once."""
    stand_ins(monkeypatch)
    original, marker, computed = published
    shutil.copytree(original.results, tmp_path / "results")
    bench = Bench(tmp_path)
    bench.first, bench.computed = marker, computed
    return bench
