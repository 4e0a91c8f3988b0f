"""Numbers as people write them into CSV files, and plain words for what is none."""

from __future__ import annotations

import math
import re

from fitlib.observations.wording import quoted

_FORM = r"[+-]?(?:\d+{mark}?\d*|{mark}\d+)(?:[eE][+-]?\d+)?"
_PLAIN = {
    "point": re.compile(_FORM.format(mark=r"\."), re.ASCII),
    "comma": re.compile(_FORM.format(mark=","), re.ASCII),
}
_THOUSANDS = re.compile(r"[+-]?\d{1,3}(?:([\s.,'’_])\d{3})(?:\1\d{3})*(?:[.,]\d+)?")
_LEADING_NUMBER = re.compile(r"[+-]?(?:\d+[.,]?\d*|[.,]\d+)(?:[eE][+-]?\d+)?\s*(?=\D)")
_MISSING = {"", "na", "n/a", "#n/a", "n.a.", "nan", "null", "none", "missing", "-", "--", "?"}
#: Sizes with which every statistic stays within double precision; another unit brings any quantity into them.
SMALLEST, LARGEST = 1e-60, 1e60
_INFINITE = {"inf", "infinity", "∞"}


def read_number(text: str, decimal: str) -> float | None:
    """The number that a field holds, or None when it is not a plain finite number.

    Parameters
    ----------
    text : str
        The field, stripped.
    decimal : {"point", "comma"}
        The declared decimal mark; the other one is not accepted.
    """
    if _PLAIN[decimal].fullmatch(text) is None:
        return None
    value = float(text.replace(",", ".")) if decimal == "comma" else float(text)
    if not math.isfinite(value) or (value == 0.0 and _has_nonzero_digit(text)):
        return None  # written beyond the range of double precision
    if value != 0.0 and not SMALLEST <= abs(value) <= LARGEST:
        return None  # squares of squares would leave the range
    return value


def _has_nonzero_digit(text: str) -> bool:
    return re.search("[1-9]", re.split("[eE]", text)[0]) is not None


def explain(text: str, decimal: str) -> tuple[str, str]:
    """Why a field is not a number, as (kind of fault, plain message without the column's name)."""
    shown = quoted(text)
    if text.lower() in _MISSING:
        found = shown if text else "the field is empty"
        return "missing value", f"missing value ({found}); exclude the row with a reason, or supply the value"
    if text.lstrip("+-").lower() in _INFINITE:
        return "infinite value", f"{shown} is infinite; a finite number is expected"
    if _PLAIN[decimal].fullmatch(text):
        allowed = f"0, or {SMALLEST:g} to {LARGEST:g} in size"
        return "range of numbers", f"{shown} is beyond the sizes fitlib computes with ({allowed}); choose another unit"
    return _explain_writing(shown, text, decimal)


def _explain_writing(shown: str, text: str, decimal: str) -> tuple[str, str]:
    other = "comma" if decimal == "point" else "point"
    if _PLAIN[other].fullmatch(text):
        hint = f"if it is the decimal mark, declare `decimal: {other}`; if it marks thousands, remove it"
        return f"decimal {other}", f"{shown} has a {other} where `decimal: {decimal}` holds; {hint}"
    if _THOUSANDS.fullmatch(text):
        return "thousands sign", f"{shown} has a thousands sign; write the digits without it"
    if text[:1] in "−–" and _PLAIN[decimal].fullmatch("-" + text[1:]):
        return "minus sign", f'{shown} starts with a typographic minus sign; write a plain hyphen ("-")'
    if _LEADING_NUMBER.match(text):
        return "text behind a number", f"{shown} is a number with text behind it; units belong into the study"
    return "text", f"{shown} is not a number"
