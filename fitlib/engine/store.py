"""Results of single steps by content: what is in the store need not be computed again.

An entry holds its key, its value and the SHA-256 of both; a damaged entry counts as missing. Entries are never changed,
so that several processes may use one store at the same time.
"""

from __future__ import annotations

import hashlib
import json
from pathlib import Path
from typing import Any

from fitlib.engine.files import write_atomic
from fitlib.plan import canonical, digest


class Store:
    """A folder of content-addressed entries.

    Parameters
    ----------
    folder : Path
    """

    def __init__(self, folder: Path):
        self.folder = folder

    @staticmethod
    def key(step: str, fingerprint: str) -> str:
        """Return the key of a step's result."""
        return digest({"step": step, "fingerprint": fingerprint})

    def path(self, key: str) -> Path:
        """Return the file of an entry."""
        return self.folder / key[:2] / f"{key}.json"

    def get(self, key: str) -> Any | None:
        """Return the value of an entry; None when it is missing or damaged."""
        try:
            entry = json.loads(self.path(key).read_bytes())
            sound = entry["key"] == key and entry["sha256"] == _sum(key, entry["value"])
        except (OSError, ValueError, KeyError, TypeError, RecursionError):
            return None
        return entry["value"] if sound else None

    def put(self, key: str, value: Any) -> Any:
        """Write an entry and return its value as a reader will find it.

        Parameters
        ----------
        key : str
        value : JSON-able

        Returns
        -------
        Any
            The value after one trip through JSON, so that a result does not depend on whether it was computed now or
            read from the store.

        Raises
        ------
        TypeError, ValueError
            The value cannot be written as JSON without loss.
        OSError
            The entry cannot be written.
        """
        stored = json.loads(canonical(value))
        write_atomic(self.path(key), _text({"key": key, "sha256": _sum(key, stored), "value": stored}) + "\n")
        return stored

    def has(self, key: str) -> bool:
        """Return whether a sound entry is there."""
        return self.get(key) is not None


def _sum(key: str, value: Any) -> str:
    return hashlib.sha256(f"{key}\n{_text(value)}".encode("ascii")).hexdigest()


def _text(value: Any) -> str:
    """As ``canonical``, for what came out of JSON and needs no more checks."""
    return json.dumps(value, sort_keys=True, separators=(",", ":"), allow_nan=False)
