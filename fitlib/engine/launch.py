"""One run of a study: the whole check first, then Snakemake, unless there is nothing to do."""

from __future__ import annotations

import os
import sys
from collections.abc import Sequence
from dataclasses import dataclass
from datetime import UTC, datetime
from pathlib import Path
from typing import Any, TextIO

from fitlib.engine.altered import WAY_OUT, altered_revision, published_from
from fitlib.engine.batch import read_batch_output
from fitlib.engine.compute import Account
from fitlib.engine.failure import failure, shown
from fitlib.engine.files import WorkFolder, plain_os_errors, work_folder
from fitlib.engine.locks import take_lock
from fitlib.engine.planfile import plan_study, read_latest_plan, write_plan_file
from fitlib.engine.prepare import forget_results, read_marker, read_record, remove_unfinished
from fitlib.engine.process import Ended, run_child
from fitlib.engine.profiles import profile_options
from fitlib.engine.progress import Events, Progress
from fitlib.engine.store import Store
from fitlib.engine.summary import DryRun, RunSummary
from fitlib.engine.workflow import ANOTHER_RUN, CHANGED, checked_mark, require_sound_data
from fitlib.errors import FitlibError, InputError, Problem, VerificationError
from fitlib.plan import BATCHES, Plan, describe_changes, workflow_folder

UNCHANGED = "nothing has changed since: no work, no new revision"


@dataclass(frozen=True)
class _Request:
    """What was asked for, with the study read and planned."""

    study: Any
    plan: Plan
    work: WorkFolder
    results_dir: str
    study_file: Path
    batches: int


def run_study(
    path: str | os.PathLike,
    results_dir: str | os.PathLike = "results",
    cores: int | None = None,
    profile: str | None = None,
    batches: int = BATCHES,
    fresh: bool = False,
    stream: TextIO | None = None,
) -> RunSummary:
    """Check a study, compute what is missing, and publish a revision if the results are new.

    Parameters
    ----------
    path : path
        The study.
    results_dir : path, default "results"
        Gets ``<study>/rev-0001`` and so on.
    cores : int, optional
        How many processor cores may be used; all by default.
    profile : str, optional
        A profile of this workflow by name, or one of Snakemake's.
    batches : int, default 16
        Into how many jobs the datasets are dealt.
    fresh : bool, default False
        Compute everything again, whatever is stored.
    stream : text stream, optional
        Takes the progress; standard error by default.

    Returns
    -------
    RunSummary

    Raises
    ------
    InputError
        The study, its data or the profile cannot be used; nothing was done.
    VerificationError
        The latest revision should hold these results, but was altered since it was published.
    FitlibError
        Another run is active, a dataset failed (nothing is published then), or a job did.
    """
    with plain_os_errors("the run stopped"):
        profiles = profile_options(profile)
        request = _plan(path, results_dir, batches)
        if not fresh and (marker := _published(request)):
            return _summary(request, marker, new=False, note=UNCHANGED, warnings=request.study.warnings)
        warnings = (*request.study.warnings, *require_sound_data(request.study))
        altered = altered_revision(request.work)
        reasons = _make_ready(request, fresh)
        _tell(stream, [f"{request.study.name}: {reason}" for reason in reasons])
        log = request.work.logs / f"run-{datetime.now(UTC).strftime('%Y%m%dT%H%M%S%f')}.log"
        before = _existing_outputs(request)
        ended, events = _run_workflow(request, cores, profiles, log, stream)
        if ended.status != 0 or ended.interrupted:
            raise failure(request.plan, request.work, ended, events, log)
        return _finished(request, before, log, altered, reasons=reasons, warnings=warnings)


def dry_run(path: str | os.PathLike, results_dir: str | os.PathLike = "results", batches: int = BATCHES) -> DryRun:
    """Tell what a run would compute and why; nothing is written.

    Parameters
    ----------
    path, results_dir, batches
        As for :func:`run_study`.

    Returns
    -------
    DryRun

    Raises
    ------
    InputError
        The study or its data cannot be used.
    """
    request = _plan(path, results_dir, batches)
    if marker := read_marker(request.plan, request.work):
        return DryRun(request.study.name, True, marker["revision"], {}, (), request.study.warnings)
    warnings = (*request.study.warnings, *require_sound_data(request.study))
    store, steps = Store(request.work.store), {}
    for dataset in request.plan.datasets:
        missing = tuple(step for step, mark in dataset.steps.items() if not store.has(Store.key(step, mark)))
        if missing:
            steps[dataset.id] = missing
    reasons = tuple(describe_changes(read_latest_plan(request.work), request.plan))
    altered, blocked = altered_revision(request.work), published_from(request.plan, request.work)
    if altered:
        outlook = (
            f"a run would publish nothing: {WAY_OUT}" if blocked else "a run would publish the new results beside it"
        )
        altered = f"{altered}; {outlook}"
    return DryRun(request.study.name, False, None, steps, reasons, warnings, altered, bool(altered) and blocked)


def _plan(path: str | os.PathLike, results_dir: str | os.PathLike, batches: int) -> _Request:
    from fitlib.study import load_study

    if os.path.exists(path) and not os.path.isfile(path):
        message = "is not a regular file; a run reads the study more than once, so that it must be one"
        raise InputError([Problem(os.fspath(path), message)])
    study = load_study(os.fspath(path))
    work = work_folder(results_dir, study.name)
    return _Request(
        study, plan_study(study, work, batches), work, os.fspath(results_dir), Path(path).absolute(), batches
    )


def _published(request: _Request) -> dict[str, Any] | None:
    """The first look, before anything is written; a second run is told of the first here already."""
    if not request.work.root.is_dir():
        return None
    with take_lock(request.work.run_lock, ANOTHER_RUN):
        return read_marker(request.plan, request.work)


def _make_ready(request: _Request, fresh: bool) -> tuple[str, ...]:
    request.work.create()
    with take_lock(request.work.run_lock, ANOTHER_RUN):
        if fresh:
            forget_results(request.work)
        remove_unfinished(request.plan, request.work)
        write_plan_file(request.plan, request.study_file, request.work)
    reasons = describe_changes(read_latest_plan(request.work), request.plan)
    return tuple(reasons or ["results are made again"])


def _tell(stream: TextIO | None, lines: Sequence[str]) -> None:
    print("\n".join(lines), file=stream or sys.stderr, flush=True)


def _run_workflow(
    request: _Request, cores: int | None, profiles: Sequence[str], log: Path, stream: TextIO | None
) -> tuple[Ended, Events]:
    progress = Progress({batch.name: len(batch.members) for batch in request.plan.batches}, stream)
    try:
        ended = run_child(_command(request, cores, profiles), request.work.root, log, progress.line)
        return ended, progress.events
    finally:
        progress.close()


def _command(request: _Request, cores: int | None, profiles: Sequence[str]) -> list[str]:
    """The study goes to Snakemake as a path that it never opens; a URI passes its reading of values unchanged."""
    return [
        *(sys.executable, "-P", "-m", "snakemake", "--snakefile", str(workflow_folder() / "Snakefile")),
        *profiles,
        *("--cores", str(cores or _all_cores()), "--nocolor"),
        *("--config", f"study_file={request.study_file.as_uri()}"),
        *(f"results_dir={request.work.results_dir.as_uri()}", f"batches={request.batches}"),
        f"checked_plan={checked_mark(request.plan)}",
    ]


def _all_cores() -> int:
    return len(os.sched_getaffinity(0)) if hasattr(os, "sched_getaffinity") else os.cpu_count() or 1


def _existing_outputs(request: _Request) -> set[str]:
    return {batch.name for batch in request.plan.batches if (request.work.batches / batch.file_name).exists()}


def _finished(request: _Request, before: set[str], log: Path, altered: str, **told) -> RunSummary:
    """Nobody is handed a revision that was altered; a new one beside it is told of with what is wrong."""
    marker = read_record(request.plan, request.work)
    if marker is None:
        raise FitlibError(f"{CHANGED}; details in {shown(log)}")
    if altered and not marker["new"]:
        raise VerificationError(f"{altered}; nothing was published: {WAY_OUT}")
    account = _account(request, before)
    return _summary(
        request,
        marker,
        new=marker["new"],
        note=marker["note"],
        computed=account.computed.total(),
        kept=account.kept.total(),
        log=shown(log),
        altered=f"{altered}; {marker['revision']} was published all the same: do not use the altered one"
        if altered
        else "",
        **told,
    )


def _account(request: _Request, before: set[str]) -> Account:
    """What jobs of this run computed; the steps of batches that were there before are kept ones."""
    account = Account()
    for batch in request.plan.batches:
        if batch.name in before:
            for planned in map(request.plan.dataset, batch.members):
                account.kept.update([*planned.steps, "figures"])
        elif output := read_batch_output(request.work.batches / batch.file_name, batch):
            account.add(output["account"])
    return account


def _summary(request: _Request, marker: dict[str, Any], **found) -> RunSummary:
    return RunSummary(
        study=request.study.name,
        revision=marker["revision"],
        path=os.path.join(request.results_dir, request.study.name, marker["revision"]),
        rows=marker["rows"],
        **found,
    )
