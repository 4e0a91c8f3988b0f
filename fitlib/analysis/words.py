"""Numbers and lists in plain sentences."""

from __future__ import annotations

from collections.abc import Sequence


def figure(value: float, digits: int = 4) -> str:
    """A number with a few significant digits, without a needless exponent."""
    return f"{value:.{digits}g}"


def amount(value: float, unit: str, digits: int = 4) -> str:
    """A number with its unit; the unit one is not written."""
    return figure(value, digits) if unit in ("", "1") else f"{figure(value, digits)} {unit}"


def listed(items: Sequence[str]) -> str:
    """Words joined by commas and ``and``."""
    items = list(items)
    return items[0] if len(items) == 1 else ", ".join(items[:-1]) + " and " + items[-1] if items else ""


def probability(value: float) -> str:
    """A probability, small ones by their limit."""
    return "p < 0.0001" if value < 0.0001 else f"p = {value:.2g}"


def counted(number: int, singular: str, plural: str | None = None) -> str:
    """A count with its noun."""
    return f"{number} {singular if number == 1 else plural or singular + 's'}"
