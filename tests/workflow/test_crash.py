"""Stopped, killed and doubled runs: nothing is half written, and the same command goes on."""

import json
import os
import shutil
import signal
import subprocess
import time

import pytest

from fitlib.engine import run_study
from fitlib.engine.locks import LockedError, take_lock
from fitlib.errors import FitlibError
from fitlib.revision import latest_revision, verify_revision

LONG = ("draws: 20", "draws: 30000")
"""Long enough to be stopped in the middle; fits and the first scheme of a dataset are stored by then."""


def wait_until(condition, what: str):
    """Return the first true value; a machine under load may take its time."""
    deadline = time.monotonic() + 60
    while time.monotonic() < deadline:
        if value := condition():
            return value
        time.sleep(0.02)
    raise AssertionError(f"{what} did not happen")


def jobs(bench) -> list[int]:
    """Processes that work on a batch."""
    found = []
    for process in bench.processes():
        try:
            with open(f"/proc/{process}/cmdline", "rb") as stream:
                words = stream.read().split(b"\0")
        except OSError:
            continue
        if b"_batch" in words:
            found.append(process)
    return found


def is_at_work(bench) -> list[int]:
    """Jobs that run, once the first steps are in the store."""
    return jobs(bench) if len(list(bench.work.store.rglob("*.json"))) >= 2 else []


@pytest.fixture
def long_run(bench):
    """A run in the middle of its work."""
    bench.edit("study.yaml", *LONG)
    process = subprocess.Popen(
        bench.command("--batches", "1"), stdout=subprocess.PIPE, stderr=subprocess.STDOUT, text=True
    )
    try:
        bench.jobs = wait_until(lambda: is_at_work(bench), "work")
        yield process
    finally:
        process.kill()
        process.stdout.close()
        for left in bench.processes():
            os.kill(left, signal.SIGKILL)


def finish(bench):
    """The same study with few draws again: what was stored before the crash is used."""
    bench.edit("study.yaml", *reversed(LONG))
    summary = bench.run(batches=1)
    assert verify_revision(summary.path) == []
    assert not list(bench.work.leftovers())
    return summary


def test_a_killed_run_leaves_no_process_and_no_lock_and_the_next_one_goes_on(bench, long_run):
    os.kill(long_run.pid, signal.SIGKILL)
    wait_until(lambda: not bench.processes(), "the end of every job")
    take_lock(bench.work.run_lock, "another run").release()
    assert latest_revision(bench.results, "trial") is None
    summary = finish(bench)
    assert summary.revision == "rev-0001"
    assert summary.kept >= 2  # what does not depend on the number of draws


def test_a_killed_job_fails_the_run_and_the_next_one_goes_on(bench, long_run):
    for job in bench.jobs:
        os.kill(job, signal.SIGKILL)
    said, _ = long_run.communicate(timeout=60)
    assert long_run.returncode == 1
    assert "batch 00 (cell-1, cell-2, cell-3): ended from outside, or out of memory" in said
    assert "nothing was published" in said
    assert "Traceback" not in said
    assert latest_revision(bench.results, "trial") is None
    assert finish(bench).kept >= 2


@pytest.mark.parametrize("number", [signal.SIGINT, signal.SIGTERM])
def test_an_interrupted_run_says_so_and_leaves_nothing_half_done(bench, long_run, number):
    long_run.send_signal(number)
    said, _ = long_run.communicate(timeout=60)
    assert long_run.returncode == 130
    assert "interrupted: what was computed is kept" in said
    assert "Traceback" not in said
    assert wait_until(lambda: not bench.processes(), "the end of every job")
    assert not list(bench.work.leftovers())
    assert latest_revision(bench.results, "trial") is None


def test_a_second_run_is_told_of_the_first(bench, long_run):
    with pytest.raises(LockedError, match=r"another run of this study is active \(.*, process \d+, since .* UTC\)"):
        run_study(bench.study, bench.results)
    assert long_run.poll() is None


def test_plain_snakemake_is_told_of_the_first_run_too(bench):
    with take_lock(bench.work.run_lock, "x"):
        done = bench.snakemake("--configfile", "study.yaml")
    assert done.returncode == 1
    assert "another run of this study is active" in done.stderr
    assert f"process {os.getpid()}" in done.stderr
    assert "Traceback" not in done.stderr
    assert not list(bench.work.batches.glob("*.json"))


def test_a_file_that_changes_during_the_run_stops_it(bench, long_run):
    bench.edit("cell-3.csv", "1,3,1.799600", "1,3,1.799700")
    bench.edit("study.yaml", *reversed(LONG))
    said, _ = long_run.communicate(timeout=60)
    assert long_run.returncode == 1
    assert "changed while the run was going on: run again" in said
    assert latest_revision(bench.results, "trial") is None


def test_a_damaged_batch_output_and_store_are_made_again(bench):
    bench.run()
    before = bench.contents("rev-0001")
    for path in [*bench.work.store.rglob("*.json"), *bench.work.batches.glob("*.json")]:
        path.write_text(path.read_text()[:-20])
    for marker in bench.work.published.glob("*.json"):
        marker.unlink()
    summary = bench.run()
    assert (summary.revision, summary.new) == ("rev-0001", False)
    assert summary.computed == 18
    assert bench.contents("rev-0001") == before


def test_whatever_stands_in_the_working_folder_nobody_is_asked(bench):
    """Folders in place of files, files in place of folders, not a number, brackets without end."""
    bench.run()
    before = bench.contents("rev-0001")
    (marker,) = bench.work.published.glob("*.json")
    content = json.loads(marker.read_text())
    marker.write_text(json.dumps({**content, "rows": content["rows"][:1]}))
    first, second = sorted(bench.work.batches.glob("*.json"))
    first.write_text(first.read_text().replace("{", '{"more": NaN,', 1))
    second.unlink()
    (second / "inner").mkdir(parents=True)
    (plan,) = (bench.work.root / "plans").glob("*.json")
    plan.unlink()
    plan.mkdir()
    bench.work.latest_plan.write_text("[" * 100_000)
    bench.work.trees.unlink()
    bench.work.trees.mkdir()
    shutil.rmtree(bench.work.logs)
    bench.work.logs.write_text("")
    summary = bench.run()
    assert (summary.revision, summary.new, summary.kept) == ("rev-0001", False, 18)
    assert [row.dataset for row in summary.rows] == ["cell-1", "cell-2", "cell-3"]
    assert bench.contents("rev-0001") == before


def test_a_run_with_a_failed_dataset_names_it_and_publishes_nothing(bench, tmp_path):
    """The failure is planted in the jobs' interpreter: a module that Python imports at its start."""
    (tmp_path / "sitecustomize.py").write_text(
        "import sys\n"
        "if '_batch' in sys.argv:\n"
        "    import fitlib.analysis as analysis\n"
        "    original = analysis.run_step\n"
        "    def run_step(step, study, dataset, *rest):\n"
        "        if dataset.id == 'cell-2':\n"
        "            raise ZeroDivisionError('planted')\n"
        "        return original(step, study, dataset, *rest)\n"
        "    analysis.run_step = run_step\n"
    )
    with pytest.MonkeyPatch.context() as patch:
        patch.setenv("PYTHONPATH", os.pathsep.join([str(tmp_path), os.environ.get("PYTHONPATH", "")]))
        with pytest.raises(FitlibError) as failed:
            bench.run()
    assert "cell-2: ZeroDivisionError: planted" in str(failed.value)
    assert "cell-1" not in str(failed.value)
    assert latest_revision(bench.results, "trial") is None
    summary = bench.run()
    assert (summary.computed, summary.new) == (6, True)
