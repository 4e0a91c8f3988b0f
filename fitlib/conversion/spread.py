"""Uncertainties of an issued function: of a value converted from it, and of a new reading at a point."""

from __future__ import annotations

from dataclasses import dataclass, field
from functools import cached_property
from typing import Any, ClassVar

import numpy as np
from scipy.special import stdtrit

from fitlib.conversion.record import COVERAGE_PROBABILITY
from fitlib.numerics.families import Curve
from fitlib.numerics.uncertainty import mean_standard_uncertainty, reading_uncertainty
from fitlib.numerics.weighting import spread


@dataclass(frozen=True)
class Spread:
    """Standard uncertainties from the stored covariance and standard deviations.

    Attributes
    ----------
    curve : Curve
    record : dict
        Of the issued function.
    """

    coverage_probability: ClassVar[float] = COVERAGE_PROBABILITY

    curve: Curve = field(repr=False)
    record: dict[str, Any] = field(repr=False)

    @cached_property
    def coverage_factor(self) -> float:
        """Student's t at the degrees of freedom of the covariance (JCGM 100:2008, G.3.2)."""
        return float(stdtrit(self.record["degrees_of_freedom"], (1 + COVERAGE_PROBABILITY) / 2))

    @cached_property
    def _covariance(self) -> np.ndarray:
        return np.array(self.record["covariance"], dtype=float)

    def _deviations(self, x: float) -> tuple[float, float]:
        """Standard deviations of one reading and of a level at x: relative weights make them grow with the stimulus."""
        point = np.array([x], dtype=float)
        stimulus = self.curve.evaluate(point) if self.record["function"] == "analysis" else point
        factor = float(spread(self.record["weighting"], stimulus)[0]) * self.record["weight_scale"]
        factor = 1.0 if self.record["weighting"] == "none" else factor
        return factor * self.record["reading_standard_deviation"], factor * self.record["level_standard_deviation"]

    def converted(self, x: float, readings: int) -> float:
        """Standard uncertainty of the abscissa found by inverting the curve, in the unit of the abscissa."""
        return reading_uncertainty(self.curve, self._covariance, x, *self._deviations(x), readings)

    def predicted(self, x: float, readings: int) -> float:
        """Standard uncertainty of the mean of so many new readings at x, in the unit of the fitted quantity."""
        reading_sd, level_sd = self._deviations(x)
        mean = float(mean_standard_uncertainty(self.curve, self._covariance, np.array([x], dtype=float))[0])
        return float(np.sqrt(mean**2 + reading_sd**2 / readings + level_sd**2))

    def half_prediction(self, x: float, readings: int) -> float:
        """Half the width of the prediction interval at x."""
        return self.coverage_factor * self.predicted(x, readings)
