"""Before Snakemake starts: the check, the command line, what a dry run tells."""

import io
import os

import pytest

from fitlib.engine import batch_main, dry_run, launch, prepare_workflow, publish_main, run_study
from fitlib.engine.locks import LockedError, take_lock
from fitlib.engine.process import Ended
from fitlib.errors import FitlibError, InputError


def start(bench, **options):
    return run_study(bench.root / "study.yaml", bench.results, stream=io.StringIO(), **options)


@pytest.fixture
def no_workflow(monkeypatch):
    """Nothing is started; the commands that would be are kept."""
    commands = []

    def run_child(command, folder, log, on_line):
        commands.append(command)
        log.parent.mkdir(parents=True, exist_ok=True)
        log.write_text("fitlib: the child said this\n")
        return Ended(1, False)

    monkeypatch.setattr(launch, "run_child", run_child)
    return commands


def test_an_unchanged_study_starts_no_workflow(done, no_workflow):
    summary = start(done)
    assert no_workflow == []
    assert (summary.revision, summary.new, summary.log) == ("rev-0001", False, "")
    assert summary.note == "nothing has changed since: no work, no new revision"
    assert summary.path == str(done.results / "trial" / "rev-0001")
    assert [row.dataset for row in summary.rows] == ["cell-1", "cell-2"]
    assert [(row.warnings, row.target_met) for row in summary.rows] == [(2, None), (2, None)]


def test_fresh_starts_the_workflow_all_the_same(done, no_workflow):
    with pytest.raises(FitlibError, match="the child said this"):
        start(done, fresh=True)
    assert len(no_workflow) == 1
    assert not done.work.store.exists()


def test_faults_in_study_or_data_stop_before_anything_is_written(bench, no_workflow):
    bench.edit("cell-1.csv", "1,3,1.499600", "1,3,reading")
    bench.edit("cell-2.csv", "1,3,1.199600", "1,3,")
    with pytest.raises(InputError) as refused:
        start(bench)
    assert {"cell-1.csv", "cell-2.csv"} <= {problem.file.split("/")[-1] for problem in refused.value.problems}
    assert no_workflow == []
    assert not bench.results.exists()


def test_a_study_that_can_be_read_only_once_is_refused(bench, no_workflow):
    os.mkfifo(bench.root / "pipe.yaml")
    with pytest.raises(InputError, match=r"pipe\.yaml: is not a regular file"):
        run_study(bench.root / "pipe.yaml", bench.results)


def test_a_second_run_is_told_of_the_first(done, no_workflow):
    with take_lock(done.work.run_lock, "x"), pytest.raises(LockedError, match="another run of this study is active"):
        start(done)
    assert no_workflow == []


def test_the_study_goes_to_snakemake_as_a_path_that_it_does_not_open(bench, no_workflow):
    with pytest.raises(FitlibError):
        start(bench, cores=3)
    command = no_workflow[0]
    assert "--configfile" not in command
    assert f"study_file={(bench.root / 'study.yaml').as_uri()}" in command
    assert command[command.index("--cores") + 1] == "3"


@pytest.mark.parametrize("profile", [None, "default"])
def test_a_profile_of_the_workflow_is_given_by_name(bench, no_workflow, profile):
    with pytest.raises(FitlibError):
        start(bench, profile=profile)
    command = no_workflow[0]
    assert command[command.index("--workflow-profile") + 1].endswith("workflow/profiles/default")
    assert "--profile" not in command


def test_a_profile_folder_is_found_from_where_the_user_stands(bench, no_workflow, monkeypatch):
    (bench.root / "mine").mkdir()
    (bench.root / "mine" / "profile.yaml").write_text("rerun-triggers: mtime\n")
    monkeypatch.chdir(bench.root)
    with pytest.raises(FitlibError):
        start(bench, profile="mine")
    command = no_workflow[0]
    assert command[command.index("--profile") + 1] == str(bench.root / "mine")


def test_a_profile_file_is_found_from_where_the_user_stands(bench, no_workflow, monkeypatch):
    bench.write("mine.yaml", "rerun-triggers: mtime\n")
    monkeypatch.chdir(bench.root)
    with pytest.raises(FitlibError):
        start(bench, profile="mine.yaml")
    command = no_workflow[0]
    assert command[command.index("--profile") + 1] == str(bench.root / "mine.yaml")


@pytest.mark.parametrize("profile", ["nosuch", "no/such", "empty", ""])
def test_a_profile_that_is_nowhere_is_refused_before_anything_is_made(bench, no_workflow, monkeypatch, profile):
    (bench.root / "empty").mkdir()  # a folder without settings
    monkeypatch.chdir(bench.root)
    with pytest.raises(InputError, match=rf"^--profile ?{profile}: no such profile: .* this workflow \(default\)"):
        start(bench, profile=profile)
    assert no_workflow == []
    assert not bench.results.exists()


def test_a_failed_workflow_says_where_the_details_are(bench, no_workflow):
    with pytest.raises(FitlibError, match=r"nothing was published; details in .*run-.*\.log"):
        start(bench)


def test_a_dry_run_tells_every_step_of_a_first_run_and_writes_nothing(bench):
    told = dry_run(bench.root / "study.yaml", bench.results)
    assert not told.unchanged
    assert told.reasons == ("first run of this study",)
    assert told.steps["cell-1"] == ("fits", "scheme:leave_one_level_out", "scheme:bootstrap", "selection", "result")
    assert not bench.results.exists()


def test_a_dry_run_tells_only_what_is_missing(done):
    assert dry_run(done.root / "study.yaml", done.results).unchanged
    done.edit("study.yaml", "draws: 20", "draws: 30")
    told = dry_run(done.root / "study.yaml", done.results)
    assert told.reasons == ("cell-1, cell-2: validation bootstrap changed",)
    assert told.steps == dict.fromkeys(["cell-1", "cell-2"], ("scheme:bootstrap", "selection", "result"))


@pytest.mark.parametrize(("call", "argv"), [(batch_main, []), (batch_main, ["a"]), (publish_main, ["a", "b", "c"])])
def test_a_job_called_by_hand_says_how_it_is_called(call, argv):
    with pytest.raises(FitlibError, match="is called by the workflow with"):
        call(argv)


@pytest.mark.parametrize("content", ["", "{}", '{"plan": {}, "study_file": "x"}'])
def test_a_damaged_plan_file_is_told(tmp_path, content):
    path = tmp_path / "plans" / "p.json"
    path.parent.mkdir()
    path.write_text(content)
    with pytest.raises(FitlibError, match="run again"):
        batch_main([str(path), "00", str(tmp_path / "out.json")])


def stopped(capsys, config, files=()):
    with pytest.raises(SystemExit) as stop:
        prepare_workflow(config, files)
    return stop.value.code, capsys.readouterr().err


@pytest.mark.parametrize(
    ("config", "files", "message"),
    [
        ({}, (), "which study?"),
        ({}, ("a.yaml", "b.yaml"), "one study at a time"),
        ({"study_file": {"a": "b"}}, (), "is not a path"),
    ],
)
def test_the_snakefile_says_plainly_what_it_needs(capsys, config, files, message):
    status, said = stopped(capsys, config, files)
    assert status == 1
    assert said.startswith("fitlib: ")
    assert message in said
    assert said.count("\n") == 1


def test_the_snakefile_tells_faults_of_the_study_and_of_its_data(bench, capsys, monkeypatch):
    monkeypatch.chdir(bench.root)
    bench.edit("cell-1.csv", "1,3,1.499600", "1,3,reading")
    status, said = stopped(capsys, {"study_file": "study.yaml"})
    assert status == 2
    assert said.startswith("cell-1.csv:5: ")
    bench.edit("study.yaml", "weighting", "wieghting")
    status, said = stopped(capsys, {}, ["study.yaml"])
    assert (status, said) == (2, "study.yaml:15: wieghting: unknown key; did you mean 'weighting'?\n")
    assert not bench.results.exists()


def test_the_snakefile_refuses_another_plan_than_the_one_that_was_checked(bench, capsys):
    config = {"study_file": str(bench.root / "study.yaml"), "results_dir": str(bench.results), "checked_plan": "0" * 64}
    status, said = stopped(capsys, config)
    assert status == 1
    assert "changed while the run was going on: run again" in said


@pytest.mark.parametrize("batches", [0, "four", 2.5, True])
def test_the_snakefile_refuses_odd_numbers_of_batches(bench, capsys, batches):
    status, said = stopped(capsys, {"study_file": str(bench.root / "study.yaml"), "batches": batches})
    assert status == 1
    assert "a whole number of 1 or more" in said
