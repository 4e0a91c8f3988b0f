"""The file in which a run hands its plan to its jobs, so that they need not plan again."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path

from fitlib.engine.files import WorkFolder, read_json, read_sealed, write_atomic, write_json, write_sealed
from fitlib.errors import FitlibError
from fitlib.plan import Plan, make_plan, plan_from_dict, remember_trees


@dataclass(frozen=True)
class Assignment:
    """A plan and where its study stands.

    Attributes
    ----------
    plan : Plan
    study_file : str
        Absolute path of the study.
    work : WorkFolder
        Of the study.
    """

    plan: Plan
    study_file: str
    work: WorkFolder


def plan_study(study, work: WorkFolder, batches: int) -> Plan:
    """Plan a study, with what is known already about the program's modules.

    Parameters
    ----------
    study : Study
    work : WorkFolder
    batches : int

    Returns
    -------
    Plan
    """
    return make_plan(study, batches, work.trees)


def write_plan_file(plan: Plan, study_file: str | Path, work: WorkFolder) -> Path:
    """Write the plan for the jobs and return its file.

    Parameters
    ----------
    plan : Plan
    study_file : path
    work : WorkFolder

    Returns
    -------
    Path
    """
    path = work.plan_file(plan.digest)
    content = {"plan": plan.to_dict(), "study_file": str(Path(study_file).absolute())}
    if read_json(path) != content:
        write_json(path, content)
    if (trees := remember_trees(work.trees)) is not None:
        write_atomic(work.trees, trees)
    return path


def read_plan_file(path: Path) -> Assignment:
    """Read what :func:`write_plan_file` wrote.

    Parameters
    ----------
    path : Path

    Returns
    -------
    Assignment

    Raises
    ------
    FitlibError
        The file is missing, damaged or of another version of the program.
    """
    content = read_json(path)
    if not isinstance(content, dict) or {"plan", "study_file"} - set(content):
        raise FitlibError(f"{path}: the plan is missing or damaged: run again")
    work = WorkFolder(path.absolute().parent.parent)
    return Assignment(plan_from_dict(content["plan"]), content["study_file"], work)


def read_latest_plan(work: WorkFolder) -> Plan | None:
    """Return the plan of the last run that published; None when there is none that can be read."""
    content = read_sealed(work.latest_plan)
    try:
        return None if content is None else plan_from_dict(content)
    except FitlibError:
        return None


def write_latest_plan(plan: Plan, work: WorkFolder) -> None:
    """Remember the plan of a run that published, for :func:`read_latest_plan`."""
    write_sealed(work.latest_plan, plan.to_dict())
