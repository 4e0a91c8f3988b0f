"""Inverse evaluation: stimulus from response, by inverting the one fitted function, or a verdict."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy.optimize import brentq

from fitlib.numerics.families.protocol import Curve


@dataclass(frozen=True)
class Inverse:
    """Outcome of an inverse evaluation.

    Attributes
    ----------
    verdict : str
        ``within_interval``, ``below_range``, ``above_range`` (both of the stimulus), ``not_unique``,
        ``not_a_number`` or ``not_evaluated`` (a curve with turning points has no such response).
    value : float
        The stimulus; nan unless the verdict is ``within_interval``.
    competing : tuple of float
        All stimuli that give this response, where there is more than one.
    turning_points : tuple of float
        Where the curve turns inside the interval.
    """

    verdict: str
    value: float = np.nan
    competing: tuple[float, ...] = ()
    turning_points: tuple[float, ...] = ()


def inverse_evaluation(curve: Curve, response: float, lower: float, upper: float) -> Inverse:
    """Find the stimulus in the interval at which the curve takes the response.

    Parameters
    ----------
    curve : Curve
    response : float
    lower, upper : float
        Measuring interval; both ends belong to it.

    Returns
    -------
    Inverse
    """
    if not np.isfinite(response):
        return Inverse("not_a_number")
    turning = tuple(float(point) for point in curve.turning_points(lower, upper))
    knots = np.array([lower, *turning, upper])
    solutions = _solutions(curve, response, knots)
    if len(solutions) == 1:
        return Inverse("within_interval", solutions[0], (), turning)
    if solutions:
        return Inverse("not_unique", np.nan, tuple(solutions), turning)
    return Inverse("not_evaluated" if turning else _outside(curve, response, lower, upper), np.nan, (), turning)


def _solutions(curve: Curve, response: float, knots: np.ndarray) -> list[float]:
    values = curve.evaluate(knots) - response
    found: list[float] = []
    for left, right, at_left, at_right in zip(knots[:-1], knots[1:], values[:-1], values[1:], strict=True):
        if at_left == 0:
            found.append(float(left))
        elif at_left * at_right < 0:
            found.append(_solve(curve, response, left, right))
    if values[-1] == 0:
        found.append(float(knots[-1]))
    return found


def _solve(curve: Curve, response: float, left: float, right: float) -> float:
    def difference(x: float) -> float:
        return float(curve.evaluate(np.array([x]))[0]) - response

    tolerance = max(abs(right - left), np.finfo(float).tiny) * 1e-15
    return float(brentq(difference, left, right, xtol=tolerance, rtol=4 * np.finfo(float).eps, maxiter=200))


def _outside(curve: Curve, response: float, lower: float, upper: float) -> str:
    at_lower, at_upper = curve.evaluate(np.array([lower, upper]))
    rising = at_upper > at_lower
    return "below_range" if (response < at_lower) == rising else "above_range"
