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
            text = _value_text(self.path(key).read_text(encoding="ascii"), key)
            return None if text is None else json.loads(text)
        except (OSError, ValueError, RecursionError):
            return None

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
        text = canonical(value)
        write_atomic(self.path(key), _head(key, text) + text + _TAIL)
        return json.loads(text)

    def has(self, key: str) -> bool:
        """Return whether a sound entry is there."""
        return self.get(key) is not None


def content_digest(stored: Any) -> str:
    """Return the SHA-256 of a value that came out of the store, and so needs no check before it is written.

    Parameters
    ----------
    stored : JSON-able

    Returns
    -------
    str
    """
    # Its keys are sorted already: entries are written in canonical form and read in that order
    text = json.dumps(stored, separators=(",", ":"), allow_nan=False)
    return hashlib.sha256(text.encode("ascii")).hexdigest()


_TAIL = "}\n"


def _head(key: str, text: str) -> str:
    """What stands before the value; the sum is taken of its text, so that reading need not write it again."""
    total = hashlib.sha256(f"{key}\n{text}".encode("ascii")).hexdigest()
    return f'{{"key":"{key}","sha256":"{total}","value":'


def _value_text(entry: str, key: str) -> str | None:
    """The text of the value; None when the entry is not as it was written."""
    length = len(_head(key, ""))
    text = entry[length : -len(_TAIL)]
    return text if entry == _head(key, text) + text + _TAIL else None
