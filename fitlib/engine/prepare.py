"""Before the workflow starts: is there anything to do, and is nothing taken for done that is not?"""

from __future__ import annotations

import shutil
from contextlib import suppress
from pathlib import Path
from typing import Any

from fitlib.engine.batch import read_batch_output
from fitlib.engine.files import WorkFolder, read_sealed, remove, remove_folder
from fitlib.engine.summary import SummaryRow
from fitlib.errors import FitlibError
from fitlib.plan import Plan


def read_marker(plan: Plan, work: WorkFolder) -> dict[str, Any] | None:
    """Return what was recorded when this plan was published; None when it was not, or when that no longer holds.

    Parameters
    ----------
    plan : Plan
    work : WorkFolder

    Returns
    -------
    dict or None
        None too when the latest revision is another one, or is not what its manifest says.
    """
    content = read_record(plan, work)
    return content if content and content["revision"] == intact_revision(work) else None


def read_record(plan: Plan, work: WorkFolder) -> dict[str, Any] | None:
    """Return what the publishing job recorded, whatever became of the revision since.

    Parameters
    ----------
    plan : Plan
    work : WorkFolder

    Returns
    -------
    dict or None
        Its rows are made :class:`SummaryRow`. None when the record is missing, damaged, or that of another plan.
    """
    content = read_sealed(work.marker(plan.digest))
    if content is None or content.get("plan") != plan.digest or not content.keys() >= {"revision", "new", "note"}:
        return None
    try:
        rows = tuple(SummaryRow(**row) for row in content["rows"])
    except (KeyError, TypeError):
        return None
    return {**content, "rows": rows} if [row.dataset for row in rows] == [each.id for each in plan.datasets] else None


def intact_revision(work: WorkFolder) -> str | None:
    """Return the name of the latest revision if nobody has altered it, else None."""
    from fitlib.revision import latest_revision, verify_revision

    latest = latest_revision(work.results_dir, work.study_name)
    with suppress(FitlibError, OSError):
        if latest is not None and not verify_revision(latest):
            return Path(latest).name
    return None


def remove_unfinished(plan: Plan, work: WorkFolder) -> None:
    """Remove what the workflow would take for done though it is not. To be called under the run lock.

    Snakemake sees whether a file exists and nothing else. So a marker that no longer holds, and a batch output that is
    damaged or tells of failures, must not exist; nor need what killed processes left behind.

    Parameters
    ----------
    plan : Plan
    work : WorkFolder
    """
    if read_marker(plan, work) is None:
        remove(work.marker(plan.digest))
    for batch in plan.batches:
        path = work.batches / batch.file_name
        output = read_batch_output(path, batch)
        if output is None or output["failures"]:
            remove(path)
        remove_folder(work.batch_log(batch.file_name))
    remove_folder(work.publish_log(plan.digest))
    for path in list(work.leftovers()):
        remove(path)


def forget_results(work: WorkFolder) -> None:
    """Remove every stored result, so that all is computed again. To be called under the run lock."""
    for folder in (work.store, work.batches, work.published):
        shutil.rmtree(folder, ignore_errors=True)
