"""Shows what the user wrote, short and free of control characters, for use in messages."""

from __future__ import annotations

import difflib
from collections.abc import Iterable
from typing import Any

LONGEST = 60


def printable(text: str) -> str:
    """Return the text with every character that cannot be seen written as an escape."""
    return "".join(char if char.isprintable() else char.encode("unicode_escape").decode("ascii") for char in text)


def shown(value: Any) -> str:
    """Describe a value of the study in a few words, for example ``'abc'``, ``3``, ``a list``."""
    if value is None:
        return "no value"
    if isinstance(value, bool):
        return "true" if value else "false"
    if isinstance(value, str):
        text = printable(value)
        return f"'{text}'" if len(text) <= LONGEST else f"'{text[:LONGEST]}…'"
    if isinstance(value, int | float):
        return repr(value)
    if isinstance(value, list):
        return "an empty list" if len(value) == 0 else "a list"
    return "a group of keys"


def nearest(word: str, known: Iterable[str]) -> str | None:
    """Return the known word closest to the one given, or None when none is close."""
    found = difflib.get_close_matches(word.lower()[:LONGEST], sorted(known), n=1, cutoff=0.6)
    return found[0] if found else None
