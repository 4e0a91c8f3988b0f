"""Runs through Snakemake: the same bytes whatever the cores, order and way of starting, and nothing done twice."""

import json
import os
import shutil
import subprocess
import sys

import pytest

from fitlib.plan import workflow_folder
from fitlib.revision import verify_revision

STEPS = 6  # of a dataset: fits, two schemes, selection, result, figures


def test_cores_batches_and_order_change_no_byte(bench):
    first = bench.run(cores=1, batches=16)
    assert (first.revision, first.new, first.computed, first.kept) == ("rev-0001", True, 3 * STEPS, 0)
    assert verify_revision(first.path) == []
    before = bench.contents("rev-0001")
    shutil.rmtree(bench.results)
    bench.list_backwards()
    bench.run(cores=2, batches=2)
    after = bench.contents("rev-0001")
    assert before.pop("inputs/study.yaml") != after.pop("inputs/study.yaml")
    assert after == before
    assert {"report.html", "tables/folds.csv", "functions/cell-1.json", "figures/cell-1/data.svg"} <= set(after)


def test_plain_snakemake_gives_the_same_bytes_and_then_nothing_to_do(bench):
    bench.run()
    before = bench.contents("rev-0001", apart=("run.json", "run.sha256"))
    shutil.rmtree(bench.results)
    done = bench.snakemake("--configfile", "study.yaml")
    assert done.returncode == 0, done.stderr
    assert bench.contents("rev-0001", apart=("run.json", "run.sha256")) == before
    again = bench.snakemake("--configfile", "study.yaml")
    assert "Nothing to be done" in again.stderr
    summary = bench.run()
    assert (summary.new, summary.log) == (False, "")


def test_only_what_changed_is_computed(bench):
    bench.run()
    unchanged = bench.run()
    assert (unchanged.revision, unchanged.new, unchanged.log) == ("rev-0001", False, "")
    assert bench.shown.getvalue() == ""

    older = bench.root / "cell-1.csv"
    bench.edit("cell-1.csv", "1,3,1.199600", "1,3,1.199700")
    os.utime(older, (0, 0))
    changed = bench.run()
    assert (changed.revision, changed.new) == ("rev-0002", True)
    assert changed.reasons == ("cell-1: cell-1.csv has other content",)
    assert (changed.computed, changed.kept) == (STEPS, 2 * STEPS)

    bench.edit("study.yaml", "weighting: none", "weighting: none  # as before")
    os.utime(older)
    assert bench.run().log == ""


def test_the_first_run_tells_progress_in_plain_words(bench):
    bench.run(batches=1)
    assert bench.shown.getvalue().splitlines() == [
        "trial: first run of this study",
        "  fitting and validating: 0 of 1 batches done (0 of 3 datasets)",
        "  fitting and validating: 1 of 1 batches done (3 of 3 datasets)",
        "  publishing tables, functions, figures and report",
    ]


NASTY = """O'Brien "5" ; touch gone; $(touch gone) `touch gone` {x} <b>&"""


def test_names_that_mean_something_to_shells_and_html_do_no_harm(tmp_path, bench):
    folder = tmp_path / """a b'c "d"; {e} <f> $(g) %41 #h: i"""
    shutil.copytree(bench.root, folder)
    nasty = type(bench)(folder)
    file = """cell 'x' {y} <z>;$(touch gone).csv"""
    (folder / "cell-2.csv").rename(folder / file)
    quoted = json.dumps(NASTY)
    nasty.write_study(f"  - {{id: {quoted}, files: [{json.dumps(file)}]}}\n", "  - {id: cell-1, files: [cell-1.csv]}\n")
    summary = nasty.run(batches=1)
    assert [row.dataset for row in summary.rows] == ["cell-1", NASTY]
    assert verify_revision(summary.path) == []
    assert not list(tmp_path.rglob("gone"))
    assert "<b>&" not in nasty.contents("rev-0001")["report.html"].decode()
    assert f"inputs/{file}" in nasty.contents("rev-0001")


def test_names_that_are_not_utf8_and_a_plain_locale_do_no_harm(tmp_path, bench):
    folder = tmp_path / os.fsdecode(b"by\xff te")
    try:
        shutil.copytree(bench.root, folder)
    except OSError:
        pytest.skip("file names are text here")
    results = tmp_path / os.fsdecode("résultats".encode())
    environment = {**os.environ, "LC_ALL": "C", "PYTHONUTF8": "0", "PYTHONCOERCECLOCALE": "0"}
    command = [sys.executable, "-m", "fitlib", "run", "study.yaml", "--results", results, "--batches", "1"]
    for status, told in ((0, "rev-0001 was published"), (0, "nothing has changed since")):
        done = subprocess.run(command, cwd=folder, env=environment, capture_output=True, timeout=120)
        assert done.returncode == status, done.stderr
        assert told in done.stdout.decode(errors="replace")
    assert verify_revision(results / "trial" / "rev-0001") == []


def test_the_workflow_runs_from_an_installed_package(bench, tmp_path):
    """A copy in the layout of a wheel, found before any other, and started away from the repository."""
    site = tmp_path / "site"
    import fitlib

    package = os.path.dirname(fitlib.__file__)
    shutil.copytree(package, site / "fitlib", ignore=shutil.ignore_patterns("__pycache__"))
    shutil.copytree(workflow_folder(), site / "fitlib" / "_workflow")
    environment = {**os.environ, "PYTHONPATH": str(site)}
    command = bench.command("--batches", "1")
    done = subprocess.run(command, cwd=tmp_path, env=environment, capture_output=True, text=True, timeout=120)
    assert done.returncode == 0, done.stderr
    log = next(bench.work.logs.glob("run-*.log")).read_text()
    assert str(site / "fitlib" / "_workflow") in log
    assert (bench.results / "trial" / "rev-0001" / "report.html").exists()


@pytest.mark.parametrize("options", [("--lint",), ("--dry-run",)])
def test_snakemake_finds_no_fault_in_the_rules(bench, options):
    done = bench.snakemake("--configfile", "study.yaml", *options)
    assert done.returncode == 0, done.stdout + done.stderr
    assert not (bench.results / "trial" / "rev-0001").exists()


def test_the_rules_are_formatted():
    pytest.importorskip("snakefmt")
    done = subprocess.run(
        [sys.executable, "-m", "snakefmt", "--check", str(workflow_folder())], capture_output=True, text=True
    )
    assert done.returncode == 0, done.stderr


def test_a_mistake_in_the_study_is_told_plainly_by_plain_snakemake(bench):
    bench.edit("study.yaml", "weighting", "wieghting")
    bench.edit("study.yaml", "degree: 1..2", "degree: 1..99")
    done = bench.snakemake("--configfile", "study.yaml")
    told = [line for line in done.stderr.splitlines() if not line.startswith("Using workflow specific profile")]
    assert done.returncode == 2
    assert len(told) == 2
    assert any(line.startswith("study.yaml:15: families[0].degree: ") for line in told)
    assert "study.yaml:16: wieghting: unknown key; did you mean 'weighting'?" in told
    assert not bench.results.exists()
