"""What a plain YAML scalar means in a study: YAML 1.2 core schema, less its spelling variants of true and false.

Source: YAML 1.2.2, section 10.3 (core schema). ``no``, ``on``, ``yes``, dates and ``1:30`` stay text.
"""

from __future__ import annotations

import re

WHOLE = re.compile(r"[-+]?[0-9]+")
OCTAL = re.compile(r"0o[0-7]+")
HEXADECIMAL = re.compile(r"0x[0-9a-fA-F]+")
REAL = re.compile(r"[-+]?(\.[0-9]+|[0-9]+(\.[0-9]*)?)([eE][-+]?[0-9]+)?")
INFINITE = re.compile(r"([-+]?)\.(inf|Inf|INF)")
NOT_A_NUMBER = frozenset({".nan", ".NaN", ".NAN"})
NOTHING = frozenset({"", "~", "null", "Null", "NULL"})
MOST_DIGITS = 30


class ScalarFault(ValueError):
    """A scalar that no study needs."""


def plain_scalar(text: str) -> str | int | float | bool | None:
    """Return the value of an unquoted scalar.

    Raises
    ------
    ScalarFault
        For a number of more than `MOST_DIGITS` characters.
    """
    if text in NOTHING:
        return None
    if text in ("true", "false"):
        return text == "true"
    if text[0] not in "+-.0123456789":
        return text
    return _number(text)


def _number(text: str) -> str | int | float:
    if not _looks_like_a_number(text):
        return text
    if len(text) > MOST_DIGITS:
        raise ScalarFault(
            f"a number of {len(text)} characters is too long; at most {MOST_DIGITS}, or quotes around text"
        )
    if WHOLE.fullmatch(text):
        return int(text)
    if OCTAL.fullmatch(text) or HEXADECIMAL.fullmatch(text):
        return int(text, 0)
    if text in NOT_A_NUMBER:
        return float("nan")
    infinite = INFINITE.fullmatch(text)
    return float(f"{infinite[1]}inf") if infinite else float(text)


def _looks_like_a_number(text: str) -> bool:
    return text in NOT_A_NUMBER or any(form.fullmatch(text) for form in (WHOLE, REAL, OCTAL, HEXADECIMAL, INFINITE))
