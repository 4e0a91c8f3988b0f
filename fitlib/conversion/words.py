"""Numbers and verdicts in plain words.

A note begins with a word: a cell that began with the sign of a number would be guarded as a formula.
"""

from __future__ import annotations

import math
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from fitlib.conversion.issued import Question


def quoted(value: float, unit: str, digits: int = 6) -> str:
    """Return a number with its unit, to so many significant digits."""
    return with_unit(f"{value:.{digits}g}", unit)


def with_unit(number: str, unit: str) -> str:
    """Return a number with its unit; nothing is added for a quantity of dimension one.

    Parameters
    ----------
    number, unit : str

    Returns
    -------
    str
    """
    return f"{number} {unit}" if unit and unit != "1" else number


def rounded(value: float, uncertainty: float) -> tuple[str, str]:
    """Round a value and its uncertainty to two significant digits of the uncertainty (JCGM 100:2008, 7.2.6).

    Parameters
    ----------
    value : float
    uncertainty : float
        0 or more; with 0 nothing is rounded.

    Returns
    -------
    (str, str)
    """
    if not uncertainty > 0 or not math.isfinite(uncertainty):
        return repr(value), repr(uncertainty)
    places = 1 - math.floor(math.log10(float(f"{uncertainty:.1e}")))
    if places > 15:
        return repr(value), f"{uncertainty:.1e}"
    if places < 0:
        return f"{round(value, places):.0f}", f"{round(uncertainty, places):.0f}"
    return f"{value:.{places}f}", f"{uncertainty:.{places}f}"


def _apart(value: float, other: float) -> int:
    """Significant digits that show two different numbers as different."""
    return next((d for d in range(6, 17) if f"{value:.{d}g}" != f"{other:.{d}g}"), 17)


def _of(question: Question, value: float, digits: int = 6) -> str:
    return quoted(value, question.given_unit, digits)


def end_note(question: Question, response: float, stimulus: float, agrees: bool) -> str:
    """Say that a response lies beyond an end, and whether it agrees with it."""
    digits = _apart(question.given, response)
    given, end = (_of(question, number, digits) for number in (question.given, response))
    agreement = "agrees" if agrees else "does not agree"
    return (
        f"response {given} lies beyond {end}, the response at {quoted(stimulus, question.unit)}; "
        f"it {agreement} with that end within its prediction interval"
    )


def interval_note(question: Question, end: float) -> str:
    """Say that a stimulus lies outside the measuring interval."""
    digits = _apart(question.given, end)
    side = "below the lower" if question.given < end else "above the upper"
    given, bound = (_of(question, number, digits) for number in (question.given, end))
    return f"stimulus {given} lies {side} end of the measuring interval, {bound}"


def not_unique_note(question: Question, competing, turning_points) -> str:
    """Name the values that share a response, and where the function turns."""
    values = " and ".join(quoted(value, question.unit) for value in competing)
    turns = " and ".join(quoted(point, question.unit) for point in turning_points)
    return f"response {_of(question, question.given)} belongs to {values}; the function turns at {turns}"
