"""The public face of an issued function: load it, convert readings with it."""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass, field
from operator import index
from typing import Any

from fitlib.conversion.consistency import require_consistent
from fitlib.conversion.evaluation import response_from_stimulus
from fitlib.conversion.inversion import stimulus_from_response
from fitlib.conversion.issued import Issued, Question
from fitlib.conversion.reader import read_function_record
from fitlib.conversion.record import NOT_A_NUMBER, Conversion
from fitlib.errors import DecisionError, InputError, Problem
from fitlib.numerics.families import restore


@dataclass(frozen=True)
class CalibrationFunction:
    """The function of one dataset, as a revision issued it.

    Attributes
    ----------
    path : str
        Where it was read from.
    issued : Issued
        Its record and its curve.
    """

    path: str
    issued: Issued = field(repr=False)

    @property
    def record(self) -> dict[str, Any]:
        """The file as read."""
        return self.issued.record

    @property
    def dataset(self) -> str:
        """The instrument, or the curve."""
        return self.record["dataset"]

    @property
    def measuring_interval(self) -> tuple[float, float]:
        """Stimulus interval in which the function may be used."""
        return self.issued.interval

    @property
    def cautions(self) -> tuple[str, ...]:
        """What a reader must know before using a value."""
        cautions, statement = tuple(self.record["cautions"]), self.record["uncertainty_statement"]
        return cautions if any(statement in caution for caution in cautions) else (*cautions, statement)

    @property
    def tie(self) -> bool:
        """Whether another candidate could not be told from this one; the simplest was issued."""
        return self.record["choice"] == "tie"

    def convert(self, response: float, readings: int = 1) -> Conversion:
        """Do what the function was issued for.

        Parameters
        ----------
        response : float
            A reading; the stimulus for a function whose ``evaluation`` is ``direct``.
        readings : int
            How many readings were averaged in it.

        Returns
        -------
        Conversion
            To the stimulus; to the response for ``direct``.

        Raises
        ------
        DecisionError
            The function is not ``adequate``.
        InputError
            ``readings`` is not a whole number of 1 or more.
        """
        if self.record["evaluation"] == "direct":
            return self.evaluate(response, readings)
        return self.invert(response, readings)

    def invert(self, response: float, readings: int = 1) -> Conversion:
        """Give the stimulus that belongs to a response; refused where it is not unique.

        Parameters
        ----------
        response : float
        readings : int
            How many readings were averaged in it.

        Returns
        -------
        Conversion

        Raises
        ------
        DecisionError
            The function is not ``adequate``.
        InputError
            ``readings`` is not a whole number of 1 or more.
        """
        return self._answer("response", response, readings, stimulus_from_response)

    def evaluate(self, stimulus: float, readings: int = 1) -> Conversion:
        """Give the response that belongs to a stimulus within the measuring interval.

        Parameters
        ----------
        stimulus : float
        readings : int
            The uncertainty is that of the mean of so many new readings.

        Returns
        -------
        Conversion

        Raises
        ------
        DecisionError
            The function is not ``adequate``.
        InputError
            ``readings`` is not a whole number of 1 or more.
        """
        return self._answer("stimulus", stimulus, readings, response_from_stimulus)

    def require_adequate(self) -> None:
        """Stop unless the verdict on the function is ``adequate``.

        Raises
        ------
        DecisionError
        """
        verdict, reason = self.record["verdict"], self.record["verdict_reason"]
        if verdict != "adequate":
            because = f": {reason}" if reason else ""
            raise DecisionError(f"{self.path}: converts nothing, the verdict on this function is {verdict}{because}")

    def _answer(self, given_as: str, given, readings: int, convert: Callable[[Question], Conversion]) -> Conversion:
        self.require_adequate()
        question = Question(self.issued, given_as, _to_float(given), _whole(readings, self.path))
        if not math.isfinite(question.given):
            return question.refuse(NOT_A_NUMBER, f"the {given_as} is not a number")
        return convert(question)


def _to_float(value) -> float:
    """The value as a float; NaN for what is not a number."""
    if isinstance(value, (bool, str, bytes)):
        return math.nan
    try:
        return float(value)
    except (TypeError, ValueError, OverflowError):
        return math.nan


def _whole(readings, path: str) -> int:
    try:
        count = 0 if isinstance(readings, bool) else index(readings)
    except TypeError:
        count = 0
    if count < 1:
        message = f"{readings!r} is not allowed; a whole number of 1 or more"
        raise InputError([Problem(file=path, key="readings", message=message)])
    return count


def load_function(path) -> CalibrationFunction:
    """Load the function of a dataset that a revision issued.

    Parameters
    ----------
    path : str or path-like
        ``functions/<dataset>.json``.

    Returns
    -------
    CalibrationFunction

    Raises
    ------
    InputError
        The file cannot be read, is damaged, was changed, contradicts itself, or has a format that is not known.
    """
    record = read_function_record(str(path))
    try:
        curve = restore(record["scaled"])
    except KeyError:
        message = f"{record['scaled']['basis']!r} is not known to this version of fitlib"
        raise InputError([Problem(file=str(path), key="scaled.basis", message=message)]) from None
    require_consistent(record, curve, str(path))
    return CalibrationFunction(str(path), Issued(record, curve))
