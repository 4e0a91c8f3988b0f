"""What the jobs of the workflow call: ``python -m fitlib _batch`` and ``_publish``. Not for people."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path

from fitlib.engine.process import pin_threads
from fitlib.errors import FitlibError


def batch_main(argv: Sequence[str]) -> int:
    """Run one batch: ``PLAN_FILE BATCH OUTPUT``.

    Parameters
    ----------
    argv : sequence of str

    Returns
    -------
    int
        0; also when a dataset failed, since the publishing job tells of all failures at once.

    Raises
    ------
    FitlibError
        The study or its data are not what was planned, or a file cannot be read or written.
    """
    from fitlib.engine.batch import run_batch
    from fitlib.engine.files import plain_os_errors

    plan_file, name, output = _three(argv)
    pin_threads()
    with plain_os_errors(f"batch {name}"):
        run_batch(Path(plan_file), name, Path(output))
    return 0


def publish_main(argv: Sequence[str]) -> int:
    """Publish a plan: ``PLAN_FILE MARKER``.

    Parameters
    ----------
    argv : sequence of str

    Returns
    -------
    int
        0.

    Raises
    ------
    FitlibError
        A dataset failed, a batch is not what was planned, or the revision cannot be written.
    """
    from fitlib.engine.files import plain_os_errors
    from fitlib.engine.publish import run_publish

    plan_file, marker = _two(argv)
    pin_threads()
    with plain_os_errors("publishing"):
        run_publish(Path(plan_file), Path(marker))
    return 0


def _three(argv: Sequence[str]) -> tuple[str, str, str]:
    if len(argv) != 3:
        raise FitlibError("_batch is called by the workflow with: PLAN_FILE BATCH OUTPUT")
    return argv[0], argv[1], argv[2]


def _two(argv: Sequence[str]) -> tuple[str, str]:
    if len(argv) != 2:
        raise FitlibError("_publish is called by the workflow with: PLAN_FILE MARKER")
    return argv[0], argv[1]
