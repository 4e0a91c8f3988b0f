"""Small pieces of the messages: what was found, shown short and harmless; lists; numbers."""

from __future__ import annotations

from collections.abc import Sequence

LONGEST = 60


def quoted(text: str) -> str:
    """The text in quotation marks, cut when long, control characters written as escapes."""
    plain = "".join(mark if mark.isprintable() else ascii(mark)[1:-1] for mark in text[: LONGEST + 1])
    return f'"{plain}"' if len(text) <= LONGEST else f'"{plain[:LONGEST]}…"'


def listed(words: Sequence[str], most: int = 8) -> str:
    """The words with commas; beyond `most` of them the number of the others."""
    text = ", ".join(words[:most])
    return text if len(words) <= most else f"{text} and {len(words) - most} more"


def number(value: float) -> str:
    """A number in at most six significant digits."""
    return f"{value:.6g}"


def plural(count: int, word: str) -> str:
    """The count with its word: ``1 row``, ``2 rows``."""
    return f"{count} {word}" if count == 1 else f"{count} {word}s"
