"""Locks that the kernel releases whatever happens to their holder, and that say who holds them."""

from __future__ import annotations

import fcntl
import getpass
import json
import os
import socket
from dataclasses import dataclass
from datetime import UTC, datetime
from pathlib import Path
from typing import Any

from fitlib.engine.files import named_errors, remove_folder
from fitlib.errors import FitlibError


class LockedError(FitlibError):
    """Somebody else holds the lock."""


@dataclass
class Lock:
    """A lock that is held until :meth:`release`, or until the process ends in whatever way.

    Attributes
    ----------
    path : Path
    descriptor : int
    """

    path: Path
    descriptor: int

    def release(self) -> None:
        """Give the lock back; the file stays, so that two processes can never lock two files of one name."""
        os.close(self.descriptor)

    def __enter__(self) -> Lock:
        return self

    def __exit__(self, *ignored) -> None:
        self.release()


def take_lock(path: Path, what: str, wait: bool = False) -> Lock:
    """Take a lock.

    Parameters
    ----------
    path : Path
        The lock file; it is made when missing and stays.
    what : str
        What the holder does, for the message: ``another run of this study``.
    wait : bool, default False
        Wait until the lock is free instead of refusing.

    Returns
    -------
    Lock

    Raises
    ------
    LockedError
        Somebody else holds it: the message names user, host, process and since when.
    """
    path.parent.mkdir(parents=True, exist_ok=True)
    remove_folder(path)
    descriptor = os.open(path, os.O_RDWR | os.O_CREAT | os.O_CLOEXEC, 0o644)
    try:
        fcntl.flock(descriptor, fcntl.LOCK_EX | (0 if wait else fcntl.LOCK_NB))
        with named_errors(path):
            _write_holder(descriptor)
    except BlockingIOError:
        os.close(descriptor)
        raise LockedError(f"{what} is active ({_describe(path)}): wait for it, or stop it") from None
    except BaseException:
        os.close(descriptor)
        raise
    return Lock(path, descriptor)


def _write_holder(descriptor: int) -> None:
    holder = {
        "user": user_name(),
        "host": socket.gethostname(),
        "process": os.getpid(),
        "since": datetime.now(UTC).strftime("%Y-%m-%d %H:%M:%S UTC"),
    }
    os.ftruncate(descriptor, 0)
    os.pwrite(descriptor, (json.dumps(holder, sort_keys=True) + "\n").encode(), 0)


def user_name() -> str:
    """Return the name of the person whose process this is."""
    try:
        return getpass.getuser()
    except (OSError, KeyError):  # a user id without a name, as in some containers
        return f"user {os.getuid()}"


def _describe(path: Path) -> str:
    """The holder writes itself in after it has the lock: for a moment the file may be empty."""
    try:
        holder: dict[str, Any] = json.loads(path.read_bytes())
        return f"{holder['user']} on {holder['host']}, process {holder['process']}, since {holder['since']}"
    except (OSError, ValueError, KeyError, TypeError):
        return "it has not written its name yet"
