"""Numbers for text, rounded to their uncertainty; numbers for tables, with more digits."""

from __future__ import annotations

import math
import re
from decimal import ROUND_HALF_EVEN, Context, Decimal

NOTHING = "–"  # stands where there is no number
_CONTEXT = Context(prec=60, rounding=ROUND_HALF_EVEN)
_BRACKETED = re.compile(r"\([^()]*\)")  # one pair of brackets around the whole, as in "(unit not stated)"
_SUPERSCRIPT = str.maketrans("-0123456789", "⁻⁰¹²³⁴⁵⁶⁷⁸⁹")


def is_number(value: object) -> bool:
    """True for a finite number (a truth value is none)."""
    return isinstance(value, int | float) and not isinstance(value, bool) and math.isfinite(value)


def exact(value: float | None) -> str:
    """All digits of a number: read back, it is the same number."""
    return repr(float(value)) if is_number(value) else NOTHING


def table_number(value: float | None, digits: int = 6) -> str:
    """A number for a table: six significant digits unless told otherwise, whole numbers whole."""
    if not is_number(value):
        return NOTHING
    return str(value) if isinstance(value, int) else f"{value:.{digits}g}"


def place_number(value: float | None) -> str:
    """A place on an axis for a sentence: four significant digits, without an exponent up to thousands of millions."""
    text = table_number(value, 4)
    return f"{float(text):.0f}" if "e+" in text and abs(value) < 1e10 else text


def text_number(value: float | None, digits: int = 2) -> str:
    """A number for a sentence, of `digits` significant digits, for what carries no stated uncertainty."""
    if not is_number(value):
        return "not available"
    if value == 0:
        return "0"
    short = _significant(value, digits)
    top = short.adjusted()
    if -5 <= top < 5:
        return f"{short:f}"
    return f"{short.scaleb(-top):f} × {power_of_ten(top)}"


def rounded(value: float | None, uncertainty: float | None, digits: int = 2) -> tuple[str, str]:
    """Round an uncertainty to significant digits and the value to the same decimal place.

    Parameters
    ----------
    value : float or None
        An estimate.
    uncertainty : float or None
        Its standard uncertainty or standard error, in the unit of the value.
    digits : int
        Significant digits of the uncertainty; GUM 7.2.6 finds two sufficient in most cases.

    Returns
    -------
    value, uncertainty : str
        Without a usable uncertainty the value has six significant digits and the uncertainty reads "not available".

    References
    ----------
    JCGM 100:2008 (GUM), 7.2.6.
    """
    if not is_number(value):
        return "not available", text_number(uncertainty, digits)
    if not is_number(uncertainty) or uncertainty <= 0 or abs(value) / uncertainty > 1e16:
        return table_number(float(value)), text_number(uncertainty, digits)
    width = _significant(uncertainty, digits)
    quantum = width.adjusted() - digits + 1
    estimate = _to_quantum(_decimal(value), quantum)
    top = max(estimate.adjusted() if estimate else quantum, width.adjusted())
    if quantum <= 0 and top >= -5:
        return f"{estimate:f}", f"{width:f}"
    return f"{estimate.scaleb(-top):f} × {power_of_ten(top)}", f"{width.scaleb(-top):f} × {power_of_ten(top)}"


def power_of_ten(exponent: int) -> str:
    """For example ``10⁻⁶``."""
    return "10" + str(exponent).translate(_SUPERSCRIPT)


def percent(share: float | None) -> str:
    """A share in percent, two significant digits; never rounded to nothing or to all."""
    if not is_number(share):
        return NOTHING
    if 0.995 <= share < 1:
        return "over 99 %"
    if 0 < share < 0.0005:
        return "under 0.1 %"
    return f"{text_number(100 * share, 2)} %"


def probability(value: float | None) -> str:
    """A probability of a test; small ones by their limit."""
    if not is_number(value):
        return NOTHING
    return "< 0.0001" if value < 0.0001 else text_number(value, 2)


def equals(text: str) -> str:
    """A probability behind its sign: ``= 0.31``, ``< 0.0001``."""
    return text if text.startswith("<") or text == NOTHING else f"= {text}"


def statistic(value: float | None) -> str:
    """A test statistic: four significant digits everywhere."""
    return text_number(value, 4) if is_number(value) else NOTHING


def with_unit(number: str, unit: str) -> str:
    """A number and its unit; quantities of unit one have none."""
    return number if unit in ("", "1") or number in (NOTHING, "not available") else f"{number} {unit}"


def squared(unit: str) -> str:
    """The unit of a loss."""
    return powered(unit, 2)


def powered(unit: str, power: int) -> str:
    """A unit to a power, in brackets where it is more than one word."""
    if unit in ("", "1") or power == 0:
        return ""
    if power == 1:
        return unit
    return (unit if unit.isalnum() or _BRACKETED.fullmatch(unit) else f"({unit})") + str(power).translate(_SUPERSCRIPT)


def root(loss: float | None, standard_error: float | None = None) -> tuple[float | None, float | None]:
    """Root of a loss and the standard error of that root (first order)."""
    if not is_number(loss) or loss < 0:
        return None, None
    value = math.sqrt(loss)
    return value, (standard_error / (2 * value) if is_number(standard_error) and value > 0 else None)


def _decimal(value: float) -> Decimal:
    return Decimal(repr(float(value)))


def _to_quantum(value: Decimal, exponent: int) -> Decimal:
    return value.quantize(Decimal(1).scaleb(exponent), context=_CONTEXT)


def _significant(value: float, digits: int) -> Decimal:
    """A number of significant digits, also where rounding up gains one (9.96 becomes 10)."""
    decimal = _decimal(value)
    top = _to_quantum(decimal, decimal.adjusted() - digits + 1).adjusted()
    return _to_quantum(decimal, top - digits + 1)
