"""What a conversion returns."""

from __future__ import annotations

from dataclasses import dataclass

WITHIN = "within_interval"
BELOW = "below_range"
ABOVE = "above_range"
NOT_UNIQUE = "not_unique"
NOT_A_NUMBER = "not_a_number"
NOT_EVALUATED = "not_evaluated"
VERDICTS = (WITHIN, BELOW, ABOVE, NOT_UNIQUE, NOT_A_NUMBER, NOT_EVALUATED)

COVERAGE_PROBABILITY = 0.95


@dataclass(frozen=True)
class Conversion:
    """One reading, converted or refused.

    Attributes
    ----------
    given : float
        What was converted, in ``given_unit``; NaN when it was not a number.
    given_unit, unit : str
        Unit of what was given, and of the value.
    readings : int
        How many readings were averaged in ``given``.
    verdict : str
        ``within_interval``, ``below_range``, ``above_range`` (both speak of the stimulus), ``not_unique``,
        ``not_a_number`` or ``not_evaluated``.
    value : float or None
        None unless the verdict is ``within_interval``.
    standard_uncertainty, expanded_uncertainty : float or None
        Of the value, in its unit. From the fit only: not a complete measurement uncertainty.
    coverage_factor : float or None
        Student's t for ``coverage_probability`` at the degrees of freedom of the covariance.
    coverage_probability : float or None
    competing : tuple of float
        The values that share this response, when the verdict is ``not_unique``.
    turning_points : tuple of float
        Where the function turns inside the measuring interval, when the verdict is ``not_unique``.
    agrees_with_end : bool or None
        For a reading refused as below or above: whether it lies within the prediction interval at that end.
    note : str
        The verdict in a plain sentence; empty for a value.
    """

    given: float
    given_unit: str
    unit: str
    readings: int
    verdict: str
    value: float | None = None
    standard_uncertainty: float | None = None
    expanded_uncertainty: float | None = None
    coverage_factor: float | None = None
    coverage_probability: float | None = None
    competing: tuple[float, ...] = ()
    turning_points: tuple[float, ...] = ()
    agrees_with_end: bool | None = None
    note: str = ""
