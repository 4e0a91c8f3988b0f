"""What the Snakefile needs: the plan of the study that Snakemake was given, and the run lock."""

from __future__ import annotations

import os
import sys
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any, NoReturn
from urllib.parse import unquote_to_bytes, urlsplit

from fitlib.engine.files import WorkFolder, work_folder
from fitlib.engine.locks import Lock, LockedError, take_lock
from fitlib.engine.planfile import plan_study, write_plan_file
from fitlib.engine.prepare import forget_results, read_record, remove_unfinished
from fitlib.engine.process import follow_parent, share_package
from fitlib.errors import FitlibError, InputError, Problem
from fitlib.plan import BATCHES, Plan

ANOTHER_RUN = "another run of this study"
CHANGED = "the study, its data or the program changed while the run was going on: run again"


@dataclass
class WorkflowRun:
    """One study as the Snakefile sees it; all paths are relative to the working folder.

    Attributes
    ----------
    plan : Plan
    work : WorkFolder
    lock : Lock or None
        Held from ``onstart`` to the end of the process.
    """

    plan: Plan
    work: WorkFolder
    lock: Lock | None = None

    @property
    def folder(self) -> str:
        """The working folder."""
        return str(self.work.root)

    @property
    def marker(self) -> str:
        """The file that says that the plan is published."""
        return self.work.marker(self.plan.digest).relative_to(self.work.root).as_posix()

    @property
    def plan_file(self) -> str:
        """The file from which the jobs take the plan."""
        return self.work.plan_file(self.plan.digest).relative_to(self.work.root).as_posix()

    @property
    def batch_outputs(self) -> list[str]:
        """The output of each batch job."""
        return [f"batches/{batch.file_name}" for batch in self.plan.batches]

    @property
    def publish_log(self) -> str:
        """What the publishing job says."""
        return self.work.publish_log(self.plan.digest).relative_to(self.work.root).as_posix()

    def tell(self) -> None:
        """Say where the results are."""
        content = read_record(self.plan, self.work) or {}
        print(f"fitlib: {content.get('note', 'nothing was published')}", file=sys.stderr, flush=True)

    def start(self) -> None:
        """Take the run lock and hold it; end this process with a plain sentence when somebody else has it."""
        try:
            self.lock = take_lock(self.work.run_lock, ANOTHER_RUN)
        except FitlibError as error:
            stop(error)


def prepare_workflow(config: Mapping[str, Any], config_files: Sequence[Path]) -> WorkflowRun:
    """Read, check and plan the study that Snakemake was given.

    Parameters
    ----------
    config : mapping
        Snakemake's ``config``; only options of this workflow are taken from it, never settings of the study.
    config_files : sequence of Path
        The files given with ``--configfile``.

    Returns
    -------
    WorkflowRun
    """
    try:
        follow_parent()
        share_package()
        return _prepare(config, config_files)
    except FitlibError as error:
        stop(error)


def stop(error: FitlibError) -> NoReturn:
    """End Snakemake's process with the plain message of an error and its exit status, without a traceback."""
    lines = [str(problem) for problem in error.problems] if isinstance(error, InputError) else [f"fitlib: {error}"]
    print("\n".join(lines), file=sys.stderr, flush=True)
    raise SystemExit(error.exit_status)


def _prepare(config: Mapping[str, Any], config_files: Sequence[Path]) -> WorkflowRun:
    from fitlib.study import load_study

    study_file = _study_file(config, config_files)
    study = load_study(study_file)
    batches = _batches(config)
    work = work_folder(_path(config.get("results_dir") or "results"), study.name)
    plan = plan_study(study, work, batches)
    _require_checked(study, plan, config.get("checked_plan"))
    work.create()
    _remove_unfinished(plan, work, bool(config.get("fresh")))
    write_plan_file(plan, study_file, work)
    return WorkflowRun(plan, work)


def checked_mark(plan: Plan) -> str:
    """Return the text that names a plan to Snakemake; it cannot be read as a number."""
    return f"plan-{plan.digest}"


def _require_checked(study, plan: Plan, checked_plan: str | None) -> None:
    """``fitlib run`` has checked the data before, and says which plan that was."""
    if checked_plan is None:
        require_sound_data(study)
    elif checked_plan != checked_mark(plan):
        raise FitlibError(CHANGED)


def _remove_unfinished(plan: Plan, work: WorkFolder, fresh: bool) -> None:
    """While another run is active nothing is touched; ``onstart`` then tells who it is."""
    try:
        with take_lock(work.run_lock, ANOTHER_RUN):
            if fresh:
                forget_results(work)
            remove_unfinished(plan, work)
    except LockedError:
        return


def require_sound_data(study) -> tuple[Problem, ...]:
    """Read every data file of a study.

    Parameters
    ----------
    study : Study

    Returns
    -------
    tuple of Problem
        Warnings.

    Raises
    ------
    InputError
        Some data cannot be used; every problem is in it.
    """
    from fitlib.observations import check_observations

    problems, _ = check_observations(study)
    if any(problem.severity == "error" for problem in problems):
        raise InputError(problems)
    return tuple(problems)


def _study_file(config: Mapping[str, Any], config_files: Sequence[Path]) -> str:
    if len(config_files) > 1:
        raise FitlibError("one study at a time: give --configfile once, with one file")
    if config_files:
        return _shown(Path(config_files[0]))
    if not config.get("study_file"):
        raise FitlibError("which study? give --configfile STUDY, or use: fitlib run STUDY")
    return _shown(Path(_path(config["study_file"])))


def _shown(path: Path) -> str:
    """As a person would write it: relative where it lies below the present folder."""
    here = Path.cwd()
    return str(path.relative_to(here)) if path.is_relative_to(here) else str(path)


def _path(value: Any) -> str:
    """A path, or a ``file:`` URI: Snakemake reads numbers and YAML into other texts, a URI passes unchanged."""
    if not isinstance(value, str):
        raise FitlibError(f"{value!r} is not a path: write it as a file: URI, or use: fitlib run STUDY")
    return os.fsdecode(unquote_to_bytes(urlsplit(value).path)) if value.startswith("file:///") else value


def _batches(config: Mapping[str, Any]) -> int:
    value = config.get("batches", BATCHES)
    if not isinstance(value, int) or isinstance(value, bool) or value < 1:
        raise FitlibError(f"batches: {value!r} is not allowed; a whole number of 1 or more")
    return value
