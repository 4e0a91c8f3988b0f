"""Dotted keys such as ``validation[2].folds`` and the lines on which they stand."""

from __future__ import annotations

from collections.abc import Mapping

from fitlib.study.shown import printable


def child(parent: str, part: str | int) -> str:
    """Return the dotted key of an entry: ``child("a", 2)`` is ``a[2]``, ``child("a", "b")`` is ``a.b``."""
    if isinstance(part, int):
        return f"{parent}[{part}]"
    part = (part if part.isprintable() else printable(part)) or "''"
    return f"{parent}.{part}" if parent else part


def parent_of(key: str) -> str:
    """Return the dotted key one step up; the empty text is the study itself."""
    return key[: max(key.rfind("."), key.rfind("["), 0)]


def line_of(lines: Mapping[str, int], key: str) -> int | None:
    """Return the line of a dotted key, or of its nearest parent that stands in the file."""
    while key not in lines and key:
        key = parent_of(key)
    return lines.get(key)


def within(key: str, outer: str) -> bool:
    """Tell whether a dotted key is `outer` itself or stands below it."""
    return key == outer or not outer or key.startswith((f"{outer}.", f"{outer}["))
