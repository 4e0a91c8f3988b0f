"""One job of the workflow: the datasets of one batch."""

from __future__ import annotations

import sys
import time
import traceback
from pathlib import Path
from typing import Any

from fitlib.engine.compute import Account, dataset_figures, dataset_result
from fitlib.engine.files import read_sealed, write_sealed
from fitlib.engine.planfile import Assignment, read_plan_file
from fitlib.engine.store import Store
from fitlib.errors import FitlibError
from fitlib.plan import Batch, DatasetPlan, Plan, code_identity, numeric_versions, plan_dataset

FORMAT = 1
_KEYS = {"batch", "members", "failures", "account", "seconds"}


def run_batch(plan_file: Path, name: str, output: Path) -> dict[str, Any]:
    """Compute what is missing of one batch and write its output.

    Parameters
    ----------
    plan_file : Path
        Written by the run.
    name : str
        Of the batch.
    output : Path
        Is written whole, as the last thing.

    Returns
    -------
    dict
        What was written: the members' fingerprints, the failures, and how much was computed.

    Raises
    ------
    FitlibError
        The study or its data are not, or no longer, what was planned.
    """
    from fitlib.study import load_study

    task = read_plan_file(plan_file)
    batch = task.plan.batch(name)
    study = load_study(task.study_file)
    _require_planned(study, task, batch)
    begin = time.monotonic()
    content = {**_compute_members(study, task, batch), "seconds": round(time.monotonic() - begin, 3)}
    _require_planned(study, task, batch)  # a file that changed meanwhile may have been read before or after
    write_sealed(output, content)
    return content


def _require_planned(study, task: Assignment, batch: Batch) -> None:
    settings = {each.id: each for each in study.datasets}
    if code_identity(task.work.trees).numerics != task.plan.code["numerics"]:
        raise FitlibError("the program is not the one that planned the run: run again")
    for planned in map(task.plan.dataset, batch.members):
        if planned.id not in settings or not _as_planned(study, settings[planned.id], planned, task.plan):
            raise FitlibError(f"{planned.id}: study or data changed while the run was going on: run again")


def _as_planned(study, settings, planned: DatasetPlan, plan: Plan) -> bool:
    now = plan_dataset(study, settings, 1, plan.code["numerics"], numeric_versions())
    return dict(now.steps) == dict(planned.steps)


def _compute_members(study, task: Assignment, batch: Batch) -> dict[str, Any]:
    store, account = Store(task.work.store), Account()
    settings = {each.id: each for each in study.datasets}
    members, failures = {}, []
    for planned in map(task.plan.dataset, batch.members):
        try:
            result = dataset_result(study, settings[planned.id], planned, store, account)
            dataset_figures(result, task.plan, store, account)
            members[planned.id] = planned.fingerprint
        except OSError:
            raise  # a full disk is no property of one dataset
        except Exception as error:
            traceback.print_exc(file=sys.stderr)  # into the log of the job
            failures.append({"dataset": planned.id, "message": _one_line(error)})
    return {
        "format": FORMAT,
        "batch": batch.name,
        "digest": batch.digest,
        "members": members,
        "failures": failures,
        "account": account.to_dict(),
    }


def _one_line(error: Exception) -> str:
    text = " ".join(str(error).split())
    return text if isinstance(error, FitlibError) else f"{type(error).__name__}: {text}"


def read_batch_output(path: Path, batch: Batch) -> dict[str, Any] | None:
    """Return the output of a batch job.

    Parameters
    ----------
    path : Path
    batch : Batch
        What was planned.

    Returns
    -------
    dict or None
        None when the file is missing, damaged, or the output of another plan.
    """
    content = read_sealed(path)
    if content is None or content.get("format") != FORMAT or content.get("digest") != batch.digest:
        return None
    return content if set(content) >= _KEYS else None
