"""What a person is told when a run did not come to its end."""

import pytest

from fitlib.engine.failure import failure, last_lines
from fitlib.engine.files import write_sealed
from fitlib.engine.process import Ended
from fitlib.engine.progress import Events


@pytest.fixture
def run(bench, tmp_path):
    """A run that was started; a test says what is there when it ended."""
    plan, _ = bench.plan_file(batches=1)
    log = tmp_path / "run.log"
    log.write_text("first\n\nfitlib: last\n")

    def ended(status=1, interrupted=False, started=True, stage="fitting"):
        events = Events(planned=1, started=["00"] if started else [], stage=stage)
        return failure(plan, bench.work, Ended(status, interrupted), events, log)

    ended.batch, ended.work, ended.plan = plan.batches[0], bench.work, plan
    return ended


def say(path, text):
    path.parent.mkdir(parents=True, exist_ok=True)
    path.write_text(text)


def write_output(run, failures):
    content = {"format": 1, "batch": "00", "digest": run.batch.digest, "failures": failures}
    account = {"computed": {}, "kept": {}}
    path = run.work.batches / run.batch.file_name
    write_sealed(path, {**content, "members": {}, "account": account, "seconds": 0.1})


def test_an_interrupted_run_has_the_status_that_shells_give(run):
    error = run(interrupted=True)
    assert error.exit_status == 130
    assert str(error) == "interrupted: what was computed is kept, and the same command goes on from there"


def test_a_killed_workflow_is_told(run):
    assert str(run(status=-9)).startswith("the workflow was ended from outside (signal 9)\nnothing was published; ")


def test_a_silent_job_is_told_with_its_datasets(run):
    assert str(run()).startswith("batch 00 (cell-1, cell-2): ended from outside, or out of memory\n")


def test_a_job_is_quoted_by_its_last_line(run):
    say(run.work.batch_log(run.batch.file_name), "Traceback\nfitlib: batch 00: no space left on device\n")
    assert str(run()).startswith("batch 00: no space left on device\nnothing was published; ")


def test_the_log_of_an_earlier_job_is_not_quoted(run):
    say(run.work.batch_log(run.batch.file_name), "fitlib: an old story\n")
    assert str(run(started=False)).startswith("first\nlast\nnothing was published; ")


def test_failed_datasets_are_named(run):
    write_output(run, [{"dataset": "cell-2", "message": "planted"}])
    assert str(run(stage="publishing")).startswith("cell-2: planted\nnothing was published; ")


def test_a_failed_publication_is_quoted(run):
    write_output(run, [])
    say(run.work.publish_log(run.plan.digest), "fitlib: the folder cannot be written\n")
    assert str(run(stage="publishing")).startswith("the folder cannot be written\nnothing was published; ")


def test_a_missing_log_says_nothing(tmp_path):
    assert last_lines(tmp_path / "none.log", 3) == []


SNAKEMAKE = """\
Using workflow specific profile /place/workflow/profiles/default for setting default command line arguments.
Traceback (most recent call last):

  File "/place/snakemake/cli.py", line 2101, in args_to_api
    workflow_api = snakemake_api.workflow(
                   ^^^^^^^^^^^^^^^^^^^^^^^
  File "/place/fitlib/engine/workflow.py", line 128, in _prepare
    work.create()

PlantedError: what went wrong
"""


def test_code_and_profiles_are_not_quoted(tmp_path):
    log = tmp_path / "run.log"
    log.write_text(SNAKEMAKE)
    assert last_lines(log, 8) == ["PlantedError: what went wrong"]


def test_lines_with_an_indent_are_quoted_where_they_are_no_code(tmp_path):
    log = tmp_path / "run.log"
    log.write_text(SNAKEMAKE + "Error in rule fit_batch:\n    jobid: 1\n")
    assert last_lines(log, 8) == ["PlantedError: what went wrong", "Error in rule fit_batch:", "jobid: 1"]
