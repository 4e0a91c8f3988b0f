"""Read ``functions/<dataset>.json`` strictly: a damaged file is refused, with every fault named at once."""

from __future__ import annotations

import json
import math
from collections.abc import Callable
from pathlib import Path

from fitlib.conversion.seal import KEY, seal_fault
from fitlib.errors import InputError, Problem

FORMAT = 1
#: Data are read between 1e-60 and 1e60; what is fitted to them may be smaller by their rounding; variances are squares.
SMALLEST, LARGEST = 1e-80, 1e60
LEAST_FREEDOM = 0.5  # Student's t has no use below; degrees of freedom that were evaluated are 1 or more
LARGEST_FILE = 20_000_000  # bytes; a function file has a few thousand
MISSING = object()


class _Damaged(ValueError):
    """Raised while JSON is parsed, for what JSON readers let pass."""


def _object(pairs: list[tuple[str, object]]) -> dict:
    record = dict(pairs)
    if len(record) < len(pairs):
        names = [name for name, _ in pairs]
        twice = next(name for name in names if names.count(name) > 1)
        raise _Damaged(f"the key {twice!r} stands twice")
    return record


def _constant(word: str):
    raise _Damaged(f"{word} is not a number")


def _number(value, largest: float = LARGEST) -> bool:
    """Whether this is a number of a size with which conversions compute."""
    if isinstance(value, bool) or not isinstance(value, (int, float)):
        return False
    return math.isfinite(value) and abs(value) <= largest if isinstance(value, float) else abs(value) <= largest


def _numbers(value) -> bool:
    return isinstance(value, list) and all(_number(each) for each in value)


def _a_number(value) -> str:
    return "" if _number(value) else f"a number of at most {LARGEST:g} in size"


def _positive(value) -> str:
    return "" if _number(value) and value >= SMALLEST else f"a number from {SMALLEST:g} to {LARGEST:g}"


def _not_negative(value) -> str:
    return (
        ""
        if _number(value) and (value == 0 or value >= SMALLEST)
        else f"0, or a number from {SMALLEST:g} to {LARGEST:g}"
    )


def _freedom(value) -> str:
    return "" if _number(value) and value >= LEAST_FREEDOM else f"a number from {LEAST_FREEDOM:g} to {LARGEST:g}"


def _text(value) -> str:
    return "" if isinstance(value, str) and value else "a text"


def _any_text(value) -> str:
    return "" if isinstance(value, str) else "a text"


def _texts(value) -> str:
    return "" if isinstance(value, list) and all(isinstance(each, str) for each in value) else "a list of texts"


def _pair(value) -> str:
    return "" if _numbers(value) and len(value) == 2 else "two numbers"


def _interval(value) -> str:
    return "" if _pair(value) == "" and value[0] < value[1] else "two numbers, the smaller first"


def _coefficients(value) -> str:
    return "" if _numbers(value) and value else "a list of numbers"


def _points(value) -> str:
    ok = isinstance(value, list) and all(_pair(each) == "" for each in value)
    return "" if ok else "a list of pairs of numbers"


def _matrix(value) -> str:
    ok = isinstance(value, list) and value and all(isinstance(row, list) and len(row) == len(value) for row in value)
    ok = ok and all(_number(cell, LARGEST**2) for row in value for cell in row)
    return "" if ok else f"a square table of numbers of at most {LARGEST**2:g} in size"


def _vector(value) -> bool:
    """Within the interval a test vector has two numbers; outside it may have one, or the verdict alone."""
    if not isinstance(value, dict) or not isinstance(value.get("verdict"), str):
        return False
    return value["verdict"] != "within_interval" or all(_number(value.get(key)) for key in ("stimulus", "response"))


def _vectors(value) -> str:
    ok = isinstance(value, list) and all(_vector(each) for each in value)
    return "" if ok else "a list of test vectors, each with stimulus, response and verdict"


def _one_of(*words: str) -> Callable[[object], str]:
    return lambda value: "" if value in words else " or ".join(word for word in words if word)


CHECKS: dict[str, Callable[[object], str]] = {
    "dataset": _text,
    "candidate": _text,
    "evaluation": _one_of("inverse", "direct"),
    "function": _one_of("calibration", "analysis"),
    "weighting": _one_of("none", "inverse_stimulus", "inverse_stimulus_squared"),
    "weight_scale": _positive,
    "stimulus.quantity": _text,
    "stimulus.unit": _any_text,
    "response.quantity": _text,
    "response.unit": _any_text,
    "measuring_interval": _interval,
    "response_at_ends": _pair,
    "scaled.basis": _text,
    "scaled.centre": _a_number,
    "scaled.half_span": _positive,
    "scaled.fixed_points": _points,
    "scaled.coefficients": _coefficients,
    "covariance": _matrix,
    "degrees_of_freedom": _freedom,
    "reading_standard_deviation": _not_negative,
    "level_standard_deviation": _not_negative,
    "verdict": _one_of("adequate", "inadequate", "not_evaluated"),
    "verdict_reason": _any_text,
    "choice": _one_of("decided", "tie", None),
    "uncertainty_statement": _text,
    "cautions": _texts,
    "test_vectors": _vectors,
}


def _find(record: dict, key: str):
    value = record
    for part in key.split("."):
        value = value.get(part, MISSING) if isinstance(value, dict) else MISSING
    return value


def _shown(value) -> str:
    text = json.dumps(value, ensure_ascii=False)
    return text if len(text) <= 60 else text[:59] + "…"


def _problems(record: dict, path: str) -> list[Problem]:
    sealed = seal_fault(record)
    problems = [Problem(file=path, key=KEY, message=sealed)] if sealed else []
    for key, check in CHECKS.items():
        value = _find(record, key)
        if value is MISSING:
            problems.append(Problem(file=path, key=key, message="is missing"))
        elif allowed := check(value):
            problems.append(Problem(file=path, key=key, message=f"{_shown(value)} is not allowed; {allowed}"))
    return problems or _contradictions(record, path)


def _contradictions(record: dict, path: str) -> list[Problem]:
    """Faults that only show between two keys that are each allowed."""
    coefficients, covariance = record["scaled"]["coefficients"], record["covariance"]
    problems = []
    if len(covariance) != len(coefficients):
        message = f"has {len(covariance)} rows; one for each of the {len(coefficients)} coefficients"
        problems.append(Problem(file=path, key="covariance", message=message))
    if any(covariance[i][i] < 0 for i in range(len(covariance))):
        problems.append(Problem(file=path, key="covariance", message="has a negative variance"))
    scale = max((abs(value) for row in covariance for value in row), default=0.0)
    size = range(len(covariance))
    if any(abs(covariance[i][j] - covariance[j][i]) > 1e-9 * scale for i in size for j in size):
        problems.append(Problem(file=path, key="covariance", message="is not symmetric"))
    return problems


def _decode(raw: bytes, path: str) -> dict:
    try:
        record = json.loads(raw.decode("utf-8"), object_pairs_hook=_object, parse_constant=_constant)
    except UnicodeDecodeError as error:
        raise _refusal(path, f"damaged: byte {error.start + 1} is not UTF-8 text") from None
    except json.JSONDecodeError as error:
        raise InputError([Problem(path, f"damaged: not JSON: {error.msg}", error.lineno, error.colno)]) from None
    except _Damaged as error:
        raise _refusal(path, f"damaged: {error}") from None
    except (RecursionError, ValueError):  # ValueError: a whole number of thousands of digits
        raise _refusal(path, "damaged: nested too deeply, or a number too long") from None
    if not isinstance(record, dict) or "format" not in record:
        raise _refusal(path, "is not a function that fitlib issued: the key format is missing")
    return record


def _refusal(path: str, message: str) -> InputError:
    return InputError([Problem(file=path, message=message)])


def _load(path: str) -> bytes:
    try:
        with Path(path).open("rb") as file:
            raw = file.read(LARGEST_FILE + 1)
    except FileNotFoundError:
        raise _refusal(path, "does not exist; expected the function of a dataset, functions/<dataset>.json") from None
    except IsADirectoryError:
        raise _refusal(path, "is a folder; expected the function of a dataset, functions/<dataset>.json") from None
    except OSError as error:
        raise _refusal(path, f"cannot be read: {error.strerror or error}") from None
    if len(raw) > LARGEST_FILE:
        raise _refusal(path, f"is larger than {LARGEST_FILE} bytes; a function file has a few thousand")
    return raw


def read_function_record(path: str) -> dict:
    """Read the record of an issued function and check it.

    Parameters
    ----------
    path : str
        ``functions/<dataset>.json`` of a revision, or a copy of it.

    Returns
    -------
    dict
        With every key that a conversion needs, of the kind that is allowed.

    Raises
    ------
    InputError
        The file cannot be read, is damaged, was changed after it was issued, or has a format that this version does not
        know.
    """
    record = _decode(_load(path), path)
    if record["format"] != FORMAT or isinstance(record["format"], bool):
        known = f"this version of fitlib reads format {FORMAT}"
        message = f"{_shown(record['format'])} is not known; {known}; a later version may know it"
        raise InputError([Problem(file=path, key="format", message=message)])
    if problems := _problems(record, path):
        raise InputError(problems)
    return record
