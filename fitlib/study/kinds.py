"""Kinds of values in a study: each checks one value and says in words what is allowed."""

from __future__ import annotations

import math
import re
import unicodedata
from datetime import date
from typing import Annotated, Any, Literal

from pydantic import BeforeValidator, Field, WithJsonSchema
from pydantic_core import PydanticCustomError

from fitlib.study.names import id_fault
from fitlib.study.shown import nearest, shown

HIDDEN = frozenset({"Cc", "Cf", "Cs", "Co", "Cn", "Zl", "Zp"})  # Unicode general categories of what cannot be seen
_NUMBER_IN_TEXT = re.compile(r"[-+]?([0-9]+([.,][0-9]*)?|[.,][0-9]+)([eE][-+]?[0-9]+)?(?P<rest>\s*([^\W\d_]|[%°]).*)?")
OWN_SENTENCE = "fitlib"  # the pydantic error type of every message made here


def refusal(sentence: str) -> PydanticCustomError:
    """Return an error that carries a finished sentence."""
    return PydanticCustomError(OWN_SENTENCE, "{sentence}", {"sentence": sentence})


def not_allowed(value: Any, allowed: str) -> PydanticCustomError:
    """Return the error ``<value> is not allowed; <what is>``."""
    return refusal(f"{shown(value)} is not allowed; {allowed}")


def is_number(value: Any) -> bool:
    """Tell whether a value is a finite number and not a truth value."""
    return isinstance(value, int | float) and not isinstance(value, bool) and math.isfinite(value)


def without_unit(value: Any) -> str:
    """Return the hint for a text that holds a number: with a unit behind it, or in quotes; else nothing."""
    found = _NUMBER_IN_TEXT.fullmatch(value.strip()) if isinstance(value, str) else None
    if found is None:
        return ""
    return "; write the number without unit" if found["rest"] else "; write the number without quotes"


def whole(low: int, high: int | None = None) -> Any:
    """Return the kind "whole number from low to high"."""
    allowed = f"a whole number of {low} or more" if high is None else f"a whole number from {low} to {high}"

    def check(value: Any) -> int:
        if type(value) is not int or value < low or (high is not None and value > high):
            raise not_allowed(value, allowed + without_unit(value))
        return value

    return Annotated[int, Field(ge=low, le=high), BeforeValidator(check)]


def positive(below: float | None = None) -> Any:
    """Return the kind "number above 0", optionally below a bound."""
    allowed = "a number above 0" if below is None else f"a number above 0 and below {below:g}"

    def check(value: Any) -> float:
        if not is_number(value) or value <= 0 or (below is not None and value >= below):
            raise not_allowed(value, allowed + without_unit(value))
        return float(value)

    return Annotated[float, Field(gt=0, lt=below), BeforeValidator(check)]


def not_negative() -> Any:
    """Return the kind "0 or a number above 0"."""

    def check(value: Any) -> float:
        if not is_number(value) or value < 0:
            raise not_allowed(value, "0 or a number above 0" + without_unit(value))
        return float(value)

    return Annotated[float, Field(ge=0), BeforeValidator(check)]


def choice(*words: str, later: tuple[str, ...] = ()) -> Any:
    """Return the kind "one of these words"; `later` are words of the vocabulary that this version cannot do yet."""
    allowed = words[0] if len(words) == 1 else f"{', '.join(words[:-1])} or {words[-1]}"

    def check(value: Any) -> str:
        if isinstance(value, str) and value in words:
            return value
        if isinstance(value, str) and value in later:
            raise refusal(f"{shown(value)} is not in this version; {allowed}")
        close = nearest(value, words) if isinstance(value, str) else None
        raise not_allowed(value, allowed + (f"; did you mean {close}?" if close and len(words) > 1 else ""))

    return Annotated[Literal[words], BeforeValidator(check)]


def _check_flag(value: Any) -> bool:
    if not isinstance(value, bool):
        raise not_allowed(value, "true or false")
    return value


def _text(value: Any, longest: int, lines: bool) -> str:
    if isinstance(value, bool | int | float):
        raise refusal(f"{shown(value)} is not text; put it in quotes")
    if not isinstance(value, str):
        raise not_allowed(value, "text")
    text = value.strip()
    if not text:
        raise refusal("the text is empty; write something")
    if len(text) > longest:
        raise refusal(f"the text has {len(text)} characters; at most {longest}")
    _refuse_hidden(text, lines)
    return text


def _refuse_hidden(text: str, lines: bool) -> None:
    for char in text:
        if lines and char in "\n\t":
            continue
        if char == "\n":
            raise refusal("the text has a line break; write it on one line")
        if unicodedata.category(char) in HIDDEN:
            raise refusal(f"the text holds the hidden character U+{ord(char):04X}; remove it")


def line_text(longest: int = 300) -> Any:
    """Return the kind "one line of visible text"; spaces at its ends are dropped."""
    return Annotated[
        str, Field(min_length=1, max_length=longest), BeforeValidator(lambda value: _text(value, longest, False))
    ]


def paragraph(longest: int = 5000) -> Any:
    """Return the kind "visible text, line breaks allowed"; spaces at its ends are dropped."""
    return Annotated[
        str, Field(min_length=1, max_length=longest), BeforeValidator(lambda value: _text(value, longest, True))
    ]


def matching(pattern: str, allowed: str) -> Any:
    """Return the kind "text that matches a regular expression"."""
    form = re.compile(pattern)

    def check(value: Any) -> str:
        if not isinstance(value, str) or not form.fullmatch(value):
            raise not_allowed(value, allowed)
        return value

    return Annotated[str, Field(pattern=f"^{pattern}$"), BeforeValidator(check)]


def is_day(text: str) -> bool:
    """Tell whether a text is a real day written as YYYY-MM-DD (ISO 8601-1, calendar date, extended format)."""
    if not re.fullmatch(r"[0-9]{4}-[0-9]{2}-[0-9]{2}", text):
        return False
    try:
        date.fromisoformat(text)
    except ValueError:
        return False
    return True


def _check_day(value: Any) -> str:
    if not isinstance(value, str) or not is_day(value):
        raise not_allowed(value, "a day of the calendar as YYYY-MM-DD")
    return value


def _check_id(value: Any) -> str:
    if isinstance(value, bool | int | float):
        raise refusal(f"{shown(value)} is not text; put it in quotes")
    fault = id_fault(value) if isinstance(value, str) else "text"
    if fault:
        raise not_allowed(value, fault)
    return value


def _check_where_value(value: Any) -> str | int | float:
    if is_number(value):
        return value
    if isinstance(value, str):
        return _text(value, 300, False)
    raise not_allowed(value, "a number or text; put a word such as true in quotes")


def _check_interval(value: Any) -> list[float]:
    allowed = "two numbers [lower, upper], the lower first"
    if not isinstance(value, list) or len(value) != 2:
        raise not_allowed(value, allowed)
    for end in value:
        if not is_number(end):
            raise refusal(f"{shown(end)} is not allowed as an end; {allowed}{without_unit(end)}")
    if value[0] >= value[1]:
        raise refusal(f"[{shown(value[0])}, {shown(value[1])}] is not increasing; {allowed}")
    return [float(end) for end in value]


Flag = Annotated[bool, BeforeValidator(_check_flag)]
Day = Annotated[str, Field(pattern="^[0-9]{4}-[0-9]{2}-[0-9]{2}$"), BeforeValidator(_check_day)]
DatasetId = Annotated[str, Field(min_length=1, max_length=100), BeforeValidator(_check_id)]
WhereValue = Annotated[Any, BeforeValidator(_check_where_value), WithJsonSchema({"type": ["number", "string"]})]
Interval = Annotated[
    list[float],
    BeforeValidator(_check_interval),
    WithJsonSchema({"type": "array", "items": {"type": "number"}, "minItems": 2, "maxItems": 2}),
]
StudyName = matching(
    "[a-z0-9][a-z0-9-]{0,59}",
    "small letters, digits and hyphens, at most 60, starting with a letter or digit",
)
