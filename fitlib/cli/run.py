"""``fitlib run``: compute what is missing of a study and publish a revision."""

from __future__ import annotations

import io
import os

from fitlib.cli.arguments import add_command, available_cores, positive_whole_number, require_file
from fitlib.cli.outcome import describe_dry_run, describe_run
from fitlib.cli.output import counted, say
from fitlib.errors import DecisionError, InputError, Problem, VerificationError


def add(commands) -> None:
    """Add the command to the parser."""
    parser = add_command(
        commands,
        "run",
        execute,
        "run a study and publish a revision",
        "Check a study, compute what is missing, and publish a revision when the results are new.",
        "  fitlib run configs/level-sensors/study.yaml --cores 4",
    )
    parser.add_argument("study", metavar="STUDY", help="the study, a YAML file")
    parser.add_argument("--cores", metavar="N", type=positive_whole_number, help="processor cores (default: all)")
    parser.add_argument("--results", metavar="DIR", default="results", help="folder of the results (default: results)")
    parser.add_argument("--profile", metavar="P", help="a workflow profile, by name or folder (default: default)")
    parser.add_argument(
        "--batches",
        metavar="N",
        type=positive_whole_number,
        help="jobs into which the datasets are dealt (default: 16)",
    )
    parser.add_argument(
        "--strict",
        action="store_true",
        help="status 4 when a verdict is not adequate, a choice is a tie, or the target uncertainty is not met",
    )
    parser.add_argument("--fresh", action="store_true", help="compute everything again, whatever is stored")
    parser.add_argument("--dry-run", action="store_true", help="tell what would be computed, and why; write nothing")
    parser.add_argument("--quiet", action="store_true", help="no progress on standard error")


def execute(arguments) -> int:
    """Run, or tell what a run would do; print the outcome of each dataset."""
    require_file(arguments.study, "the study")
    _require_results_folder(arguments.results)
    batches = {} if arguments.batches is None else {"batches": arguments.batches}
    return _dry_run(arguments, batches) if arguments.dry_run else _run(arguments, batches)


def _require_results_folder(path: str) -> None:
    """The folder need not exist yet, but nothing else may stand in its place."""
    if not path:
        raise InputError([Problem(file="''", key="--results", message="is not a folder")])
    if os.path.lexists(path) and not os.path.isdir(path):
        raise InputError([Problem(file=path, key="--results", message="is not a folder; results need a folder")])


def _dry_run(arguments, batches: dict[str, int]) -> int:
    from fitlib.engine import dry_run

    _refuse_without_effect(arguments)
    plan = dry_run(arguments.study, arguments.results, **batches)
    for line in describe_dry_run(plan):
        say(line)
    _require_unaltered(plan.altered)
    return 0


def _require_unaltered(altered: str) -> None:
    if altered:
        raise VerificationError(altered)


def _refuse_without_effect(arguments) -> None:
    given = {"--strict": arguments.strict, "--fresh": arguments.fresh, "--cores": arguments.cores is not None}
    problems = [
        Problem(file="fitlib run", key=name, message="has no effect with --dry-run")
        for name, present in {**given, "--profile": arguments.profile is not None}.items()
        if present
    ]
    if problems:
        raise InputError(problems)


def _run(arguments, batches: dict[str, int]) -> int:
    from fitlib.engine import run_study

    summary = run_study(
        arguments.study,
        arguments.results,
        cores=arguments.cores or available_cores(),
        profile=arguments.profile,
        fresh=arguments.fresh,
        stream=io.StringIO() if arguments.quiet else None,
        **batches,
    )
    for line in describe_run(summary):
        say(line)
    _require_unaltered(summary.altered)
    if arguments.strict:
        _require_decided(summary.rows)
    return 0


def _require_decided(rows) -> None:
    """In strict mode a person has to look before work goes on."""
    verdicts = sum(row.verdict != "adequate" for row in rows)
    ties = sum(row.choice == "tie" for row in rows)
    missed = sum(row.target_met is False for row in rows)
    counts = ((verdicts, "not adequate"), (ties, "with a tie"), (missed, "above the target uncertainty"))
    found = [f"{count} {what}" for count, what in counts if count]
    if found:
        raise DecisionError(f"of {counted(len(rows), 'dataset')}, {' and '.join(found)}: a person has to decide")
