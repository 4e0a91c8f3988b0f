"""An issued function with what its conversions share: the ends of its interval, its values, its answers."""

from __future__ import annotations

import math
from dataclasses import dataclass, field
from functools import cached_property
from typing import Any

import numpy as np

from fitlib.conversion.record import ABOVE, BELOW, NOT_EVALUATED, WITHIN, Conversion
from fitlib.conversion.spread import Spread
from fitlib.numerics.families import Curve


@dataclass(frozen=True)
class End:
    """One end of the measuring interval.

    Attributes
    ----------
    stimulus, response : float
    verdict : str
        Of what lies beyond this end.
    """

    stimulus: float
    response: float
    verdict: str


@dataclass(frozen=True)
class Issued:
    """Record and curve of an issued function.

    Attributes
    ----------
    record : dict
        As read and checked.
    curve : Curve
        Stimulus to response; response to stimulus for an analysis function.
    """

    record: dict[str, Any] = field(repr=False)
    curve: Curve = field(repr=False)

    @property
    def from_response(self) -> bool:
        """Whether this is an analysis function: fitted as stimulus from response."""
        return self.record["function"] == "analysis"

    @property
    def interval(self) -> tuple[float, float]:
        """The measuring interval."""
        lower, upper = self.record["measuring_interval"]
        return float(lower), float(upper)

    @cached_property
    def spread(self) -> Spread:
        """Uncertainties."""
        return Spread(self.curve, self.record)

    @cached_property
    def turning_points(self) -> tuple[float, ...]:
        """Where the curve turns inside the interval; an analysis function gives one stimulus for each response."""
        return () if self.from_response else tuple(float(x) for x in self.curve.turning_points(*self.interval))

    def value(self, x: float) -> float:
        """The curve at one point."""
        return float(self.curve.evaluate(np.array([x], dtype=float))[0])

    def slope(self, x: float) -> float:
        """The slope of the curve at one point."""
        return float(self.curve.slope(np.array([x], dtype=float))[0])

    @cached_property
    def ends(self) -> tuple[End, End]:
        """The end with the smaller response, then the one with the larger."""
        (lower, upper), (first, last) = self.interval, map(float, self.record["response_at_ends"])
        if self.from_response and self.value(first) > self.value(last):
            first, last = last, first
        ends = End(lower, first, BELOW), End(upper, last, ABOVE)
        return ends if first <= last else ends[::-1]


@dataclass(frozen=True)
class Question:
    """What is to be converted; it makes the answer.

    Attributes
    ----------
    issued : Issued
    given_as : {"response", "stimulus"}
    given : float
    readings : int
    """

    issued: Issued
    given_as: str
    given: float
    readings: int

    @property
    def given_unit(self) -> str:
        """Unit of what is given."""
        return self.issued.record[self.given_as]["unit"]

    @property
    def unit(self) -> str:
        """Unit of what is wanted."""
        return self.issued.record["stimulus" if self.given_as == "response" else "response"]["unit"]

    def refuse(self, verdict: str, note: str, **more) -> Conversion:
        """A verdict without a number."""
        return Conversion(self.given, self.given_unit, self.unit, self.readings, verdict, note=note, **more)

    def accept(self, value: float, standard_uncertainty: float) -> Conversion:
        """A value with its uncertainty; refused where the uncertainty has no bound."""
        if not (math.isfinite(value) and math.isfinite(standard_uncertainty)):
            return self.refuse(NOT_EVALUATED, "the function is level there: the value has no finite uncertainty")
        factor = self.issued.spread.coverage_factor
        return Conversion(
            given=self.given,
            given_unit=self.given_unit,
            unit=self.unit,
            readings=self.readings,
            verdict=WITHIN,
            value=float(value),
            standard_uncertainty=float(standard_uncertainty),
            expanded_uncertainty=float(factor * standard_uncertainty),
            coverage_factor=factor,
            coverage_probability=Spread.coverage_probability,
        )
