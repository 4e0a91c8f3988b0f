"""What to tell a person when a run did not come to its end."""

from __future__ import annotations

import os
import re
from collections.abc import Iterator
from pathlib import Path

from fitlib.engine.batch import read_batch_output
from fitlib.engine.files import WorkFolder
from fitlib.engine.process import Ended, InterruptedRunError
from fitlib.engine.progress import Events
from fitlib.errors import FitlibError
from fitlib.plan import Batch, Plan

LAST_LINES = 8
NAMED = 5
_OF_NO_USE = re.compile(
    r"Traceback \(most recent call last\):|Using (workflow specific )?profile|\[?(rerun|Complete log)"
    r"|During handling of the above|The above exception was|--- Logging error ---|Call stack:|Message: |Arguments: "
)
_PLACE = re.compile(r'\s*File "[^"]*", line \d+')


def failure(plan: Plan, work: WorkFolder, ended: Ended, events: Events, log: Path) -> FitlibError:
    """Return the error that says why a run failed.

    Parameters
    ----------
    plan : Plan
    work : WorkFolder
    ended : Ended
    events : Events
        What the workflow told while it ran.
    log : Path
        Of the run.

    Returns
    -------
    FitlibError
    """
    if ended.interrupted:
        return InterruptedRunError("interrupted: what was computed is kept, and the same command goes on from there")
    if ended.status < 0:
        said = [f"the workflow was ended from outside (signal {-ended.status})"]
    else:
        said = failed_datasets(plan, work) + _failed_batches(plan, work, events)
    if not said and events.stage == "publishing":
        said = last_lines(work.publish_log(plan.digest), 1)
    said = said or last_lines(log, LAST_LINES)
    return FitlibError("\n".join([*said, f"nothing was published; details in {shown(log)}"]))


def failed_datasets(plan: Plan, work: WorkFolder) -> list[str]:
    """Return a sentence for each dataset that could not be computed."""
    outputs = (read_batch_output(work.batches / batch.file_name, batch) for batch in plan.batches)
    failures = [each for output in outputs if output for each in output["failures"]]
    return [f"{each['dataset']}: {each['message']}" for each in failures]


def _failed_batches(plan: Plan, work: WorkFolder, events: Events) -> list[str]:
    """Only jobs of this run: the log of an earlier one may still be there."""
    failed = [batch for batch in plan.batches if batch.name in events.started and not _has_output(batch, work)]
    return [line for batch in failed for line in _said_by(batch, work)]


def _has_output(batch: Batch, work: WorkFolder) -> bool:
    return read_batch_output(work.batches / batch.file_name, batch) is not None


def _said_by(batch: Batch, work: WorkFolder) -> list[str]:
    """A job that says nothing was killed, by a person or by the system when memory ran out."""
    rest = f" and {len(batch.members) - NAMED} more" if len(batch.members) > NAMED else ""
    members = f"{', '.join(batch.members[:NAMED])}{rest}"
    silent = [f"batch {batch.name} ({members}): ended from outside, or out of memory"]
    return last_lines(work.batch_log(batch.file_name), 1) or silent


def last_lines(log: Path, number: int) -> list[str]:
    """Return the last lines of a log that say something, without the name of the program before them."""
    try:
        lines = log.read_text(encoding="utf-8", errors="replace").splitlines()
    except OSError:
        return []
    told = [line.strip().removeprefix("fitlib: ") for line in _without_code(lines)]
    return told[-number:]


def _without_code(lines: list[str]) -> Iterator[str]:
    """Lines that say something to a person: what stands in the program's code at some place does not."""
    depth = None
    for line in filter(str.strip, lines):
        indent = len(line) - len(line.lstrip())
        if _PLACE.match(line):
            depth = indent
        elif depth is None or indent <= depth:
            depth = None
            if not _OF_NO_USE.match(line.strip()):
                yield line


def shown(path: Path) -> str:
    """Return a path as a person would write it here: relative where that is shorter."""
    return min(str(path), os.path.relpath(path), key=len)
