"""Was the latest revision changed after it was published? A run says so, and what to do."""

from __future__ import annotations

from contextlib import suppress
from pathlib import Path

from fitlib.engine.failure import shown
from fitlib.engine.files import WorkFolder
from fitlib.errors import FitlibError
from fitlib.plan import Plan

WAY_OUT = "put the published files back from a copy, or move the folder away and run again"


def altered_revision(work: WorkFolder) -> str:
    """Say what is wrong with the latest revision.

    Parameters
    ----------
    work : WorkFolder

    Returns
    -------
    str
        Empty when it is as it was published, or there is none.
    """
    from fitlib.revision import latest_revision, verify_revision

    latest = latest_revision(work.results_dir, work.study_name)
    if latest is None:
        return ""
    try:
        differences = [str(difference) for difference in verify_revision(latest)]
    except (FitlibError, OSError) as error:
        differences = [f"it cannot be checked: {error}"]
    if not differences:
        return ""
    place = shown(Path(latest))
    more = f", and {len(differences) - 1} more" if len(differences) > 1 else ""
    return f"{place} is not as it was published ({differences[0]}{more}; `fitlib verify` names every file)"


def published_from(plan: Plan, work: WorkFolder) -> bool:
    """Return whether the latest revision, altered or not, says that it was published from this plan.

    Parameters
    ----------
    plan : Plan
    work : WorkFolder

    Returns
    -------
    bool
    """
    from fitlib.revision import latest_revision, read_revision

    latest = latest_revision(work.results_dir, work.study_name)
    with suppress(FitlibError, OSError):
        return latest is not None and read_revision(latest).manifest.get("plan_digest") == plan.digest
    return False
