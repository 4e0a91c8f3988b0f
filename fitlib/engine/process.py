"""Snakemake as a child process: its output goes to a log and to the progress; signals reach it and all its jobs."""

from __future__ import annotations

import ctypes
import os
import signal
import site
import subprocess
import sys
import threading
from collections.abc import Callable, Iterator, Mapping, Sequence
from contextlib import contextmanager, suppress
from dataclasses import dataclass
from pathlib import Path

from fitlib.engine.files import named_errors
from fitlib.errors import FitlibError
from fitlib.plan import PACKAGE

PARENT = "FITLIB_PARENT_PROCESS"
ONE_THREAD = {
    name: "1"
    for name in (
        "OMP_NUM_THREADS",
        "OPENBLAS_NUM_THREADS",
        "MKL_NUM_THREADS",
        "BLIS_NUM_THREADS",
        "NUMEXPR_NUM_THREADS",
        "VECLIB_MAXIMUM_THREADS",
    )
}
"""Numeric libraries use one thread: cores belong to the workflow, and sums keep their order."""


class InterruptedRunError(FitlibError):
    """The run was stopped on purpose."""

    exit_status = 130  # 128 + SIGINT, as shells have it


@dataclass(frozen=True)
class Ended:
    """How a child process ended.

    Attributes
    ----------
    status : int
        Its exit status; negative for a signal.
    interrupted : bool
        Whether this process was asked to stop meanwhile.
    """

    status: int
    interrupted: bool


def pin_threads() -> None:
    """Let numeric libraries that are imported from now on use one thread."""
    os.environ.update(ONE_THREAD)


def share_package() -> None:
    """Let child processes import the same copy of fitlib as this one, be it a checkout or an installed package.

    Jobs do not look into the folder that they run in for modules. A folder of installed packages is found anyway, and
    must not come before the standard library.
    """
    folder = str(PACKAGE.parent)
    listed = os.environ.get("PYTHONPATH", "").split(os.pathsep)
    if folder not in [*listed, *site.getsitepackages(), site.getusersitepackages()]:
        os.environ["PYTHONPATH"] = os.pathsep.join([folder, *filter(None, listed)])


def run_child(command: Sequence[str], folder: Path, log: Path, on_line: Callable[[str], None]) -> Ended:
    """Run a command to its end.

    Parameters
    ----------
    command : sequence of str
    folder : Path
        The child's working directory.
    log : Path
        Takes everything that the child says.
    on_line : callable
        Is told every line.

    Returns
    -------
    Ended
    """
    share_package()
    log.parent.mkdir(parents=True, exist_ok=True)
    with _kept(log) as keep:
        child = _start(command, folder, {**os.environ, **ONE_THREAD, PARENT: str(os.getpid())})
        with _forwarded_signals(child) as received:
            threading.Thread(target=_end_orphans, args=(child,), daemon=True).start()
            for line in child.stdout:
                keep(line)
                on_line(line)
            status = child.wait()
    return Ended(status, bool(received))


@contextmanager
def _kept(log: Path) -> Iterator[Callable[[str], None]]:
    """A function that adds a line to the log; its errors name the log, other errors do not."""
    record = open(log, "a", encoding="utf-8", errors="backslashreplace")  # noqa: SIM115 (closed below)

    def keep(line: str) -> None:
        with named_errors(log):
            record.write(line)

    try:
        yield keep
    finally:
        with named_errors(log):
            record.close()


def _start(command: Sequence[str], folder: Path, environment: Mapping[str, str]) -> subprocess.Popen:
    """The child leads a session of its own, so that one signal reaches it and its jobs, once."""
    return subprocess.Popen(
        command,
        cwd=folder,
        env=environment,
        stdin=subprocess.DEVNULL,
        stdout=subprocess.PIPE,
        stderr=subprocess.STDOUT,
        text=True,
        encoding="utf-8",
        errors="backslashreplace",
        start_new_session=True,
    )


def _end_orphans(child: subprocess.Popen) -> None:
    """When the child is killed hard, its jobs would go on without it, and nobody would wait for them."""
    child.wait()
    with suppress(ProcessLookupError, PermissionError):
        os.killpg(child.pid, signal.SIGKILL)


@contextmanager
def _forwarded_signals(child: subprocess.Popen) -> Iterator[list[int]]:
    """Pass Ctrl-C and termination on to the child and its jobs; the second time they are killed."""
    received: list[int] = []

    def forward(number, frame):
        received.append(number)
        with suppress(ProcessLookupError):
            os.killpg(child.pid, number if len(received) == 1 else signal.SIGKILL)

    if threading.current_thread() is not threading.main_thread():
        yield received
        return
    before = {number: signal.signal(number, forward) for number in (signal.SIGINT, signal.SIGTERM)}
    try:
        yield received
    finally:
        for number, handler in before.items():
            signal.signal(number, handler)


def follow_parent() -> None:
    """Let this process and its jobs end when the process that started it is killed (called in Snakemake's process).

    Without it, a run that is killed hard would leave Snakemake at work, and the next run would have to wait. Where the
    kernel offers no such notice (outside Linux), nothing happens.
    """
    parent = os.environ.pop(PARENT, "")
    if not parent or not sys.platform.startswith("linux") or os.getpgrp() != os.getpid():
        return
    signal.signal(signal.SIGUSR1, lambda number, frame: os.killpg(os.getpgrp(), signal.SIGKILL))
    set_parent_death_signal = 1  # PR_SET_PDEATHSIG of <linux/prctl.h>
    with suppress(OSError, AttributeError):
        ctypes.CDLL(None, use_errno=True).prctl(set_parent_death_signal, signal.SIGUSR1, 0, 0, 0)
    if str(os.getppid()) != parent:
        os.killpg(os.getpgrp(), signal.SIGKILL)
