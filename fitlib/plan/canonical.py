"""One text and one SHA-256 for settings that mean the same, whatever order they were written in."""

from __future__ import annotations

import hashlib
import json
from collections.abc import Mapping
from dataclasses import fields, is_dataclass
from typing import Any


def plain(value: Any) -> Any:
    """Return settings as JSON has them: records and mappings become objects, tuples become arrays.

    Parameters
    ----------
    value : Any
        Dataclasses, mappings, sequences, text, numbers, None; nested at will.

    Returns
    -------
    Any

    Raises
    ------
    TypeError
        A value that has no one canonical text, for example a set; leaving it out in silence would hide a change.
    """
    if value is None or isinstance(value, str | bool | int | float):
        return value
    if is_dataclass(value) and not isinstance(value, type):
        return {field.name: plain(getattr(value, field.name)) for field in fields(value)}
    if isinstance(value, Mapping):
        return {_key(key): plain(item) for key, item in value.items()}
    if isinstance(value, list | tuple):
        return [plain(item) for item in value]
    raise TypeError(f"{type(value).__name__} has no canonical text")


def _key(key: Any) -> str:
    if not isinstance(key, str):
        raise TypeError(f"{key!r} is not text, so that it cannot be a key")
    return key


def canonical(value: Any) -> str:
    """Return the one JSON text of a value: sorted keys, no spaces, numbers as ``repr`` writes them.

    Parameters
    ----------
    value : Any
        As :func:`plain` takes it; not a number and infinities are refused.

    Returns
    -------
    str
    """
    return json.dumps(plain(value), sort_keys=True, separators=(",", ":"), ensure_ascii=True, allow_nan=False)


def digest(value: Any) -> str:
    """Return the SHA-256 of the canonical text of a value.

    Parameters
    ----------
    value : Any
        As :func:`canonical` takes it.

    Returns
    -------
    str
        64 hexadecimal digits.
    """
    return hashlib.sha256(canonical(value).encode("ascii")).hexdigest()
