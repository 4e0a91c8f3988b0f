"""Who ran a study, when and where: kept apart from the results, which do not depend on it."""

from __future__ import annotations

import os
import platform
import socket
import subprocess
from datetime import UTC, datetime
from pathlib import Path
from typing import Any

from fitlib.engine.locks import user_name


def run_facts(study_folder: Path, durations: dict[str, float]) -> dict[str, Any]:
    """Return the facts of this run.

    Parameters
    ----------
    study_folder : Path
        Its state in version control is recorded where it has one.
    durations : dict of str to float
        In seconds.

    Returns
    -------
    dict
    """
    return {
        "user": user_name(),
        "host": socket.gethostname(),
        "platform": platform.platform(),
        "processors": os.cpu_count(),
        "published_at": datetime.now(UTC).strftime("%Y-%m-%dT%H:%M:%SZ"),
        "durations": durations,
        "git_commit": git_commit(study_folder),
    }


def git_commit(folder: Path) -> str | None:
    """Return the commit that a folder is at; None when it is not under version control."""
    command = ["git", "-C", str(folder), "rev-parse", "--verify", "HEAD"]
    try:
        done = subprocess.run(command, capture_output=True, text=True, timeout=10, check=False)
    except (OSError, subprocess.TimeoutExpired):
        return None
    return done.stdout.strip() if done.returncode == 0 else None
