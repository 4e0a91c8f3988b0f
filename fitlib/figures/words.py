"""Words on figures: user's text made safe and short, numbers and axis labels."""

from __future__ import annotations

import math
import re
import textwrap

_NOT_IN_XML = re.compile("[^\t\n\r\x20-\ud7ff\ue000-\ufffd\U00010000-\U0010ffff]")
_BRACKETED = re.compile(r"\([^()]*\)")  # one pair of brackets around the whole, as in "(unit not stated)"
_TIE = "\N{NO-BREAK SPACE}"  # a label that is broken keeps its unit whole
_SUPERSCRIPT = str.maketrans("-0123456789", "⁻⁰¹²³⁴⁵⁶⁷⁸⁹")


def clean(text: object, limit: int = 60) -> str:
    """One line of text that XML can hold, at most `limit` characters long."""
    line = " ".join(_NOT_IN_XML.sub("\N{REPLACEMENT CHARACTER}", str(text)).split())
    return line if len(line) <= limit else line[: limit - 1] + "…"


def power_of_ten(exponent: int) -> str:
    """For example ``10⁻⁶``."""
    return "10" + str(exponent).translate(_SUPERSCRIPT)


def unit_text(unit: str, power: int = 0, exponent: int = 1) -> str:
    """The unit below the fraction line of an axis label, with a power of ten where numbers are scaled."""
    unit = clean(unit, 24)
    bracketed = _BRACKETED.fullmatch(unit) is not None
    if unit and exponent != 1:
        simple = bracketed or re.fullmatch(r"[^\W\d_]+|[%°]\w*", unit)
        unit = (unit if simple else f"({unit})") + str(exponent).translate(_SUPERSCRIPT)
    if power:
        inside = unit[1:-1] if bracketed and exponent == 1 else unit
        return f"({power_of_ten(power)}{_TIE}{inside})" if unit else power_of_ten(power)
    if bracketed:
        return unit
    compound = any(mark in unit for mark in " /·*") and not (unit.startswith("(") and exponent != 1)
    return f"({unit})" if compound else unit


def axis_label(quantity: str, unit: str, power: int = 0, offset: float = 0.0, exponent: int = 1) -> str:
    """A label as ``quantity / unit``; scaled and shifted numbers say so."""
    quantity = clean(quantity, 48)
    if offset:
        quantity = f"({quantity} − {number(offset, 15)})"
    below = unit_text(unit, power, exponent).replace(" ", _TIE)
    return f"{quantity} /{_TIE}{below}" if below else quantity


def number(value: float | None, digits: int = 3) -> str:
    """A number of `digits` significant digits for a note on a figure."""
    if value is None or not math.isfinite(value):
        return "not available"
    if value == 0:
        return "0"
    text = f"{value:.{digits}g}"
    if "e" in text:
        mantissa, exponent = text.split("e")
        text = f"{mantissa} × {power_of_ten(int(exponent))}"
    return text.replace("-", "−")


def with_unit(value: float | None, unit: str, digits: int = 3) -> str:
    """A number and its unit."""
    return f"{number(value, digits)} {clean(unit, 24)}".rstrip()


def percent(share: float) -> str:
    """A share in percent, never rounded to all or nothing."""
    if 0 < share < 0.01:
        return "under 1 %"
    if 0.99 < share < 1:
        return "over 99 %"
    return f"{100 * share:.0f} %"


def broken(label: str, width: int) -> str:
    """A label in at most two lines of `width` letters; what does not fit is cut off visibly."""
    lines = textwrap.wrap(label, max(width, 8), break_on_hyphens=False)
    if len(lines) > 2:
        lines = [lines[0], lines[1][: max(width, 8) - 1] + "…"]
    return "\n".join(lines)


def counted(count: int, singular: str, plural: str) -> str:
    """For example ``1 row is`` or ``3 rows are``."""
    return f"{count} {singular if count == 1 else plural}"


def wrapped(notes: list[str], width: int = 118) -> list[str]:
    """Notes broken into lines that fit the width of a figure."""
    return [line for note in notes for line in textwrap.wrap(note, width, break_on_hyphens=False)]


def listed(names: list[str], limit: int = 6) -> str:
    """Names in a row; beyond `limit` the rest is counted."""
    shown = ", ".join(clean(name, 40) for name in names[:limit])
    rest = len(names) - limit
    return f"{shown} and {rest} more" if rest > 0 else shown
