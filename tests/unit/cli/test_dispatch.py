"""Every failure ends as one exit status and plain lines, never as a traceback."""

import errno
import os
import subprocess
import sys
from types import SimpleNamespace

import pytest

import fitlib.cli.check
import fitlib.engine
from fitlib.cli import main
from fitlib.cli.dispatch import build_parser
from fitlib.errors import DecisionError, FitlibError, InputError, Problem, VerificationError

COMMANDS = ("start", "check", "run", "compare", "verify", "convert", "schema")


@pytest.fixture
def failing(monkeypatch, study):
    """Make ``fitlib check`` fail with an exception of choice."""

    def plant(error):
        def check(path):
            raise error

        monkeypatch.setattr(fitlib.cli.check, "check", check)

    return plant


def run_program(*words, **settings):
    """The command in a process of its own."""
    command = [sys.executable, "-m", "fitlib", *words]
    return subprocess.run(command, capture_output=True, text=True, check=False, **settings)


def test_help_shows_every_command_an_example_and_the_exit_statuses(fitlib):
    status, out, err = fitlib("--help")
    assert (status, err) == (0, "")
    assert all(f"    {command} " in out for command in COMMANDS)
    assert "fitlib run study.yaml" in out and "4 a verdict needs a person" in out
    assert "_batch" not in out and "_publish" not in out


@pytest.mark.parametrize("command", COMMANDS)
def test_help_of_a_command_has_an_example(command, fitlib):
    status, out, _ = fitlib(command, "--help")
    assert status == 0
    assert f"example:\n  fitlib {command}" in out


@pytest.mark.parametrize("command", COMMANDS)
def test_every_option_has_a_help_text(command):
    (commands,) = (action for action in build_parser()._actions if hasattr(action.choices, "items"))
    for action in commands.choices[command]._actions:
        assert action.help, action.dest


def test_version(fitlib):
    status, out, _ = fitlib("--version")
    assert status == 0 and out.startswith("fitlib 0.")


@pytest.mark.parametrize(
    "words", [(), ("chek", "study.yaml"), ("check",), ("run", "a", "--cores", "0"), ("run", "a", "--c", "2")]
)
def test_a_fault_in_the_arguments_is_status_2(words, fitlib):
    status, out, err = fitlib(*words)
    assert (status, out) == (2, "")
    assert "error:" in err and "Traceback" not in err


@pytest.mark.parametrize("value", ["0", "-1", "1.5", "x", "", "\u0663"])
def test_cores_are_a_whole_number_of_one_or_more(value, fitlib):
    status, _, err = fitlib("run", "study.yaml", f"--cores={value}")
    assert status == 2 and "is not allowed; a whole number of 1 or more" in err


@pytest.mark.parametrize(
    ("error", "status", "said"),
    [
        (FitlibError("the disk is full"), 1, "fitlib: the disk is full\n"),
        (VerificationError("altered"), 3, "fitlib: altered\n"),
        (DecisionError("look at it"), 4, "fitlib: look at it\n"),
        (KeyboardInterrupt(), 130, "fitlib: interrupted\n"),
        (
            InputError([Problem("s.yaml", "bad", line=3, key="a.b"), Problem("d.csv", "worse", line=9)]),
            2,
            "s.yaml:3: a.b: bad\nd.csv:9: worse\n",
        ),
        (OSError(errno.ENOSPC, "No space left on device", "x/y"), 1, "fitlib: x/y: No space left on device\n"),
    ],
)
def test_each_failure_has_its_status_and_its_lines(error, status, said, failing, fitlib):
    failing(error)
    assert fitlib("check", "study.yaml") == (status, "", said)


def test_an_unexpected_failure_is_one_line_with_the_place_of_the_details(failing, fitlib, tmp_path, monkeypatch):
    monkeypatch.setattr("tempfile.tempdir", str(tmp_path))
    monkeypatch.delenv("FITLIB_DEBUG", raising=False)
    failing(ZeroDivisionError("division\nby zero"))
    status, out, err = fitlib("check", "study.yaml")
    assert (status, out) == (1, "")
    assert err.startswith("fitlib: unexpected failure: ZeroDivisionError: division by zero; details in ")
    assert err.count("\n") == 1 and "Traceback" not in err
    details = err.strip().split("details in ")[1]
    with open(details, encoding="utf-8") as file:
        assert "Traceback" in file.read()


def test_without_a_place_for_the_details_the_way_to_see_them_is_told(failing, fitlib, tmp_path, monkeypatch):
    monkeypatch.setattr("tempfile.tempdir", str(tmp_path / "missing"))
    monkeypatch.delenv("FITLIB_DEBUG", raising=False)
    failing(ZeroDivisionError())
    status, _, err = fitlib("check", "study.yaml")
    assert status == 1 and "set FITLIB_DEBUG=1" in err


def test_debugging_shows_the_traceback(failing, fitlib, tmp_path, monkeypatch):
    monkeypatch.setattr("tempfile.tempdir", str(tmp_path))
    monkeypatch.setenv("FITLIB_DEBUG", "1")
    failing(ZeroDivisionError())
    status, _, err = fitlib("check", "study.yaml")
    assert status == 1 and err.startswith("Traceback")
    assert err.splitlines()[-1].startswith("fitlib: unexpected failure: ZeroDivisionError")
    assert list(tmp_path.glob("fitlib-failure-*")) == []


def test_the_log_of_a_job_has_the_traceback_and_the_line_last(monkeypatch, fitlib, tmp_path):
    def batch_main(argv):
        raise ZeroDivisionError("oh")

    monkeypatch.setattr("tempfile.tempdir", str(tmp_path))
    monkeypatch.delenv("FITLIB_DEBUG", raising=False)
    monkeypatch.setattr("fitlib.engine.batch_main", batch_main)
    status, _, err = fitlib("_batch", "plan")
    assert status == 1 and err.startswith("Traceback")
    assert err.splitlines()[-1] == "fitlib: unexpected failure: ZeroDivisionError: oh"
    assert list(tmp_path.glob("fitlib-failure-*")) == []


@pytest.mark.parametrize(("word", "name"), [("_batch", "batch_main"), ("_publish", "publish_main")])
def test_hidden_commands_go_to_the_engine_with_their_words(word, name, monkeypatch):
    seen = []
    monkeypatch.setattr(fitlib.engine, name, lambda argv: seen.append(argv) or 0)
    assert main([word, "-plan", "--help", "-1e-3"]) == 0
    assert seen == [["-plan", "--help", "-1e-3"]]


def test_a_failure_of_a_hidden_command_has_its_status(monkeypatch, fitlib):
    def batch_main(argv):
        raise FitlibError("no such plan")

    monkeypatch.setattr("fitlib.engine.batch_main", batch_main)
    assert fitlib("_batch") == (1, "", "fitlib: no such plan\n")


def test_a_closed_pipe_ends_quietly(monkeypatch, study, capsys):
    def check(path):
        raise BrokenPipeError

    monkeypatch.setattr(fitlib.cli.check, "check", check)
    monkeypatch.setattr("os.dup2", lambda *descriptors: None)
    assert main(["check", "study.yaml"]) == 141
    assert capsys.readouterr() == ("", "")


@pytest.mark.parametrize("words", [("schema",), ("--help",), ("--version",)])
def test_a_reader_that_goes_away_is_no_failure_of_the_program(words):
    """A pipe whose reading end is closed before anything is written."""
    reading, writing = os.pipe()
    os.close(reading)
    try:
        ended = subprocess.run(
            [sys.executable, "-m", "fitlib", *words], stdout=writing, stderr=subprocess.PIPE, check=False
        )
    finally:
        os.close(writing)
    assert (ended.returncode, ended.stderr) == (141, b"")


def test_units_never_end_in_a_traceback_where_the_terminal_knows_ascii_only(study):
    text = (study / "study.yaml").read_text().replace("unit: m}", 'unit: "\u00b0C"}')
    (study / "study.yaml").write_text(text, encoding="utf-8")
    environment = {**os.environ, "PYTHONIOENCODING": "ascii", "PYTHONUTF8": "0"}
    ended = run_program("check", "study.yaml", cwd=study, env=environment)
    assert (ended.returncode, ended.stderr) == (0, "")
    assert "water level, \\xb0C" in ended.stdout


def test_help_loads_no_numeric_library():
    """The reason why help comes at once; names of modules are checked, not time."""
    code = (
        "import sys; from fitlib.cli import main; main(['--help']); print(sorted(m.split('.')[0] for m in sys.modules))"
    )
    ended = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    loaded = ended.stdout.splitlines()[-1]
    assert "'argparse'" in loaded
    for name in ("numpy", "scipy", "pandas", "pydantic", "yaml", "matplotlib", "snakemake", "jinja2"):
        assert f"'{name}'" not in loaded


def test_the_module_is_the_command():
    ended = run_program("check", "nowhere.yaml")
    assert (ended.returncode, ended.stdout, ended.stderr) == (
        2,
        "",
        "nowhere.yaml: does not exist; expected the study\n",
    )


def test_schema_is_the_one_that_is_shipped(fitlib):
    from importlib.resources import files

    status, out, _ = fitlib("schema")
    assert status == 0
    assert out == files("fitlib.study").joinpath("study.schema.json").read_text(encoding="utf-8")


def test_public_names_are_fetched_on_first_use():
    code = (
        "import sys, fitlib; assert 'numpy' not in sys.modules and 'fitlib.errors' not in sys.modules\n"
        "assert {'check', 'run', 'read_revision', 'load_function', 'FitlibError'} <= set(dir(fitlib))\n"
        "from fitlib import FitlibError, check, load_function, read_revision, run\n"
        "assert all(map(callable, (check, run, read_revision, load_function)))\n"
        "assert fitlib.FitlibError is FitlibError and issubclass(FitlibError, Exception)\n"
        "assert fitlib.__version__.startswith('0.')\n"
        "try:\n    fitlib.nothing\nexcept AttributeError as error:\n    print(error)\n"
    )
    ended = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=False)
    assert (ended.returncode, ended.stderr) == (0, "")
    assert ended.stdout == "module 'fitlib' has no attribute 'nothing'\n"


@pytest.mark.parametrize(
    ("command", "kind", "message"),
    [
        (("check",), "folder", "is a folder; expected the study"),
        (("run",), "folder", "is a folder; expected the study"),
        (("start",), "folder", "is a folder; expected a data file"),
        (("convert", "--response", "1", "--"), "folder", "is a folder; expected the function of a dataset"),
        (("verify",), "file", "is not a folder; expected a revision"),
        (("verify",), "missing", "does not exist; expected a revision"),
        (("check",), "missing", "does not exist; expected the study"),
        (("check",), "file/below", "cannot be read: Not a directory"),
        (("check",), "", "does not exist; expected the study"),
        (("check",), "nul\0byte", "cannot be read: embedded null byte"),
    ],
)
def test_a_wrong_path_is_told_in_plain_words(command, kind, message, tmp_path, monkeypatch, fitlib):
    monkeypatch.chdir(tmp_path)
    (tmp_path / "folder").mkdir()
    (tmp_path / "file").write_text("")
    status, out, err = fitlib(*command, kind)
    assert (status, out) == (2, "")
    assert message in err and err.count("\n") == 1


def test_an_unreadable_file_is_told(tmp_path, monkeypatch, fitlib):
    """The system lets an administrator read everything, so its answer is replaced."""
    path = tmp_path / "study.yaml"
    path.write_text("")
    monkeypatch.setattr("fitlib.cli.arguments.os.access", lambda *question: False)
    assert fitlib("check", path) == (2, "", f"{path}: cannot be read: permission denied\n")
    assert fitlib("verify", tmp_path) == (2, "", f"{tmp_path}: cannot be read: permission denied\n")


def test_both_revisions_to_compare_are_looked_for(tmp_path, monkeypatch, fitlib):
    monkeypatch.chdir(tmp_path)
    (tmp_path / "rev-0001").mkdir()
    status, _, err = fitlib("compare", "rev-0001", "rev-0002")
    assert (status, err) == (2, "rev-0002: does not exist; expected a revision\n")


def test_compare_prints_what_the_comparison_says(tmp_path, monkeypatch, fitlib):
    seen = []

    def compare_revisions(earlier, later):
        seen.append((earlier, later))
        return SimpleNamespace(lines=lambda: ["2 series added", "no setting changed"])

    monkeypatch.setattr("fitlib.revision.compare_revisions", compare_revisions)
    one, two = tmp_path / "a", tmp_path / "b"
    one.mkdir()
    two.mkdir()
    assert fitlib("compare", one, two) == (0, "2 series added\nno setting changed\n", "")
    assert seen == [(str(one), str(two))]


def test_verify_tells_every_difference_and_ends_with_status_3(tmp_path, monkeypatch, fitlib):
    monkeypatch.setattr("fitlib.revision.verify_revision", lambda path: ["tables/chosen.csv: altered", "x: missing"])
    status, out, err = fitlib("verify", tmp_path)
    assert (status, out) == (3, "")
    assert err.splitlines() == [
        "tables/chosen.csv: altered",
        "x: missing",
        f"fitlib: {tmp_path} is not what its manifest says: 2 differences",
    ]


def test_verify_says_that_all_is_well(tmp_path, monkeypatch, fitlib):
    monkeypatch.setattr("fitlib.revision.verify_revision", lambda path: [])
    assert fitlib("verify", tmp_path) == (0, f"{tmp_path}: every file is as its manifest says\n", "")
