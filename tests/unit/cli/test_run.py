"""``fitlib run``: options reach the engine, the outcome is readable for one dataset and for hundreds."""

import os

import pytest

import fitlib.engine
from fitlib.cli.outcome import LISTED, describe_dry_run, describe_run
from fitlib.engine import DryRun, RunSummary, SummaryRow
from fitlib.errors import FitlibError, Problem


def row(dataset, verdict="adequate", choice="decided", candidate="polynomial-2", **more):
    """The outcome of one dataset."""
    return SummaryRow(dataset, candidate, verdict, choice, 1.23456e-5, 2.5e-5, "polynomial-3", 0.1234567, **more)


def summary(*rows, **changes):
    """The outcome of a run."""
    settings = {"computed": 7, "kept": 3, **changes}
    path = os.path.join("results", "level-sensors", "rev-0001")
    return RunSummary("level-sensors", "rev-0001", path, True, "first revision.", rows, **settings)


@pytest.fixture
def engine(monkeypatch, study):
    """Replace the engine; what it was asked is in ``calls``."""
    calls = []

    def plant(result):
        def run_study(*words, **settings):
            calls.append((words, settings))
            if isinstance(result, BaseException):
                raise result
            return result

        def dry_run(*words, **settings):
            calls.append((words, settings))
            return result

        monkeypatch.setattr(fitlib.engine, "run_study", run_study)
        monkeypatch.setattr(fitlib.engine, "dry_run", dry_run)
        return calls

    return plant


def test_the_table_and_the_path_are_printed(engine, fitlib):
    engine(summary(row("LS-101"), row("LS-102-long", "inadequate", "tie")))
    status, out, err = fitlib("run", "study.yaml")
    assert (status, err) == (0, "")
    lines = out.splitlines()
    assert lines[:3] == [
        "dataset      candidate     verdict     choice        loss  outer_loss  runner_up     margin  warnings",
        "LS-101       polynomial-2  adequate    decided  1.235e-05     2.5e-05  polynomial-3   0.123         0",
        "LS-102-long  polynomial-2  inadequate  tie      1.235e-05     2.5e-05  polynomial-3   0.123         0",
    ]
    assert "2 datasets: 1 adequate, 1 inadequate, 1 tie" in lines
    assert "first revision: 7 steps computed, 3 kept" in lines
    assert lines[-1] == "revision: " + os.path.join("results", "level-sensors", "rev-0001")


def test_what_is_not_there_is_shown_as_absent():
    empty = SummaryRow("LS-101", None, "not_evaluated", None, None, None, None, None)
    assert describe_run(summary(empty))[1].split() == ["LS-101", "-", "not_evaluated", "-", "-", "-", "-", "-", "0"]


def test_of_hundreds_those_that_need_a_person_are_shown_first_and_the_table_is_named():
    rows = [row(f"LS-{n:03}") for n in range(300)]
    rows[250] = row("LS-250", "inadequate")
    rows[299] = row("LS-299", choice="tie")
    lines = describe_run(summary(*rows))
    shown = [line.split()[0] for line in lines[1 : LISTED + 1]]
    assert shown == [f"LS-{n:03}" for n in range(LISTED - 2)] + ["LS-250", "LS-299"]
    table = os.path.join("results", "level-sensors", "rev-0001", "tables", "chosen.csv")
    assert lines[LISTED + 1] == f"and {300 - LISTED} more datasets; all 300 are in {table}"
    assert "300 datasets: 299 adequate, 1 inadequate, 1 tie" in lines


def test_all_are_shown_when_there_are_few():
    lines = describe_run(summary(*[row(f"LS-{n:03}") for n in range(LISTED)]))
    assert not any(line.startswith("and ") for line in lines)


def test_warnings_are_told_again_the_first_of_many():
    warnings = tuple(Problem("study.yaml", f"warning {n}", line=n) for n in range(1, 31))
    lines = describe_run(summary(row("LS-101"), warnings=warnings))
    assert "warning: study.yaml:1: warning 1" in lines
    assert "and 20 more warnings: fitlib check tells them all" in lines


def test_options_reach_the_engine(engine, fitlib):
    calls = engine(summary(row("LS-101")))
    words = ("--cores", "3", "--results", "out", "--profile", "default", "--batches", "4", "--fresh", "--quiet")
    assert fitlib("run", "study.yaml", *words)[0] == 0
    ((given, settings),) = calls
    assert given == ("study.yaml", "out")
    stream = settings.pop("stream")
    assert stream is not None and stream.writable()
    assert settings == {"cores": 3, "profile": "default", "fresh": True, "batches": 4}


def test_defaults_leave_the_number_of_batches_to_the_engine_and_use_all_cores(engine, fitlib):
    calls = engine(summary(row("LS-101")))
    fitlib("run", "study.yaml")
    ((given, settings),) = calls
    assert given == ("study.yaml", "results")
    assert settings["cores"] >= 1
    assert (settings["stream"], settings["fresh"], "batches" in settings) == (None, False, False)


@pytest.mark.parametrize(
    ("rows", "status", "said"),
    [
        ([row("a"), row("b")], 0, ""),
        ([row("a"), row("b", "inadequate")], 4, "of 2 datasets, 1 not adequate: a person has to decide"),
        ([row("a", "not_evaluated", None)], 4, "of 1 dataset, 1 not adequate: a person has to decide"),
        ([row("a"), row("b", choice="tie")], 4, "of 2 datasets, 1 with a tie: a person has to decide"),
        ([row("a", "inadequate", "tie")], 4, "of 1 dataset, 1 not adequate and 1 with a tie: a person has to decide"),
        ([row("a", target_met=True), row("b", target_met=None)], 0, ""),
        (
            [row("a", target_met=False), row("b")],
            4,
            "of 2 datasets, 1 above the target uncertainty: a person has to decide",
        ),
    ],
)
def test_strict_asks_for_a_person(rows, status, said, engine, fitlib):
    engine(summary(*rows))
    found, out, err = fitlib("run", "study.yaml", "--strict")
    assert (found, err) == (status, f"fitlib: {said}\n" if said else "")
    assert "revision: " in out
    assert fitlib("run", "study.yaml")[0] == 0


def test_a_failure_of_the_engine_is_told(engine, fitlib):
    engine(FitlibError("LS-101: failed\nnothing was published"))
    assert fitlib("run", "study.yaml") == (1, "", "fitlib: LS-101: failed\nnothing was published\n")


def test_results_need_a_folder(study, fitlib):
    status, out, err = fitlib("run", "study.yaml", "--results", "LS-101.csv")
    assert (status, out) == (2, "")
    assert err == "LS-101.csv: --results: is not a folder; results need a folder\n"
    assert fitlib("run", "study.yaml", "--results", "")[0] == 2


def test_a_dry_run_tells_what_would_be_computed(engine, fitlib):
    steps = {f"LS-{n}": ("fits", "selection") for n in range(8)} | {"LS-9": ("selection",)}
    calls = engine(DryRun("level-sensors", False, None, steps, ("8 datasets were added",)))
    status, out, _ = fitlib("run", "study.yaml", "--dry-run", "--results", "out", "--batches", "2")
    assert status == 0
    assert out.splitlines() == [
        "level-sensors: 8 datasets were added",
        "level-sensors: 17 steps would be computed",
        "  8 datasets (LS-0, LS-1, LS-2, LS-3, LS-4 and 3 more): fits, selection",
        "  1 dataset (LS-9): selection",
    ]
    assert calls == [(("study.yaml", "out"), {"batches": 2})]


def test_a_dry_run_says_when_there_is_nothing_to_do():
    assert describe_dry_run(DryRun("level-sensors", True, "rev-0003", {})) == [
        "level-sensors: nothing to do, rev-0003 holds these results"
    ]
    assert "every step is stored" in describe_dry_run(DryRun("level-sensors", False, None, {}))[-1]


def test_options_without_effect_are_refused_in_a_dry_run(engine, fitlib):
    calls = engine(None)
    status, _, err = fitlib("run", "study.yaml", "--dry-run", "--strict", "--cores", "2", "--fresh", "--profile", "x")
    assert status == 2 and not calls
    assert sorted(line.split(": ")[1] for line in err.splitlines()) == ["--cores", "--fresh", "--profile", "--strict"]


def test_below_the_table_stands_why_a_dataset_is_not_adequate():
    reason = "a smooth misfit of 0.02 m:\nlevel residuals follow one another"
    rows = [
        row("LS-101", reason="no smooth misfit", warnings=2),
        row("LS-102", "inadequate", reason=reason, warnings=12),
        row("LS-103", "not_evaluated", None, reason=""),
        row("LS-104", reason="no smooth misfit", target_met=False),
    ]
    lines = describe_run(summary(*rows))
    assert [line.split()[-1] for line in lines[:5]] == ["warnings", "2", "12", "0", "0"]
    assert lines[5:8] == [
        "LS-102: inadequate: a smooth misfit of 0.02 m: level residuals follow one another",
        "LS-103: not_evaluated",
        "LS-104: the target uncertainty is not met",
    ]
    assert "4 datasets: 2 adequate, 1 inadequate, 1 not_evaluated, 1 above the target uncertainty" in lines


def test_a_dataset_above_the_target_is_among_those_shown_first():
    rows = [row(f"LS-{n:03}") for n in range(300)]
    rows[299] = row("LS-299", target_met=False)
    assert describe_run(summary(*rows))[LISTED].startswith("LS-299")


def test_an_altered_revision_is_told_after_the_table(engine, fitlib):
    engine(summary(row("LS-101", "inadequate"), altered="rev-0001 is not as it was published"))
    status, out, err = fitlib("run", "study.yaml", "--strict")
    assert (status, err) == (3, "fitlib: rev-0001 is not as it was published\n")
    assert out.splitlines()[-1].startswith("revision: ")


def test_a_dry_run_says_that_the_latest_revision_was_altered(engine, fitlib):
    engine(DryRun("level-sensors", False, None, {}, ("results are made again",), (), "rev-0001 is altered", True))
    status, out, err = fitlib("run", "study.yaml", "--dry-run")
    assert (status, err) == (3, "fitlib: rev-0001 is altered\n")
    assert out.splitlines() == ["level-sensors: results are made again", "level-sensors: nothing else has changed"]
