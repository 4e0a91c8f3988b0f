"""Uncertainty of a fitted function: covariance, confidence band, prediction interval, converted reading."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy import stats

from fitlib.numerics.families.protocol import Curve


@dataclass(frozen=True)
class Band:
    """Lower and upper limit at each abscissa, in the unit of the fitted quantity."""

    lower: np.ndarray
    upper: np.ndarray
    coverage_probability: float


def coefficient_covariance(
    design: np.ndarray,
    root_weights: np.ndarray,
    inverse_normal: np.ndarray,
    level_index: np.ndarray,
    reading_variance: float,
    level_variance: float,
    series_index: np.ndarray | None = None,
    series_variance: float = 0.0,
) -> np.ndarray:
    """Covariance of least-squares coefficients when levels or series carry their own deviation.

    ``(A^T A)^-1 A^T V A (A^T A)^-1`` with ``V = reading_variance I + level_variance Z Z^T + series_variance S S^T`` in
    the weighted scale, ``Z`` and ``S`` telling which observations share a level and a series (Searle, Casella &
    McCulloch, Variance Components, 1992, sec. 3.2; for balanced data the same as the covariance from level means).
    With no other variance it is ``reading_variance * (A^T A)^-1``.

    Parameters
    ----------
    design : ndarray of shape (n, p)
    root_weights : ndarray of shape (n,)
    inverse_normal : ndarray of shape (p, p)
        ``(A^T A)^-1``.
    level_index : ndarray of shape (n,), int
    reading_variance, level_variance : float
        At weight 1; all grow with the spread that the weighting declares.
    series_index : ndarray of shape (n,), int, or None
        Needed with a series variance.
    series_variance : float

    Returns
    -------
    ndarray of shape (p, p)
    """
    covariance = reading_variance * inverse_normal
    weighted = design * root_weights[:, None]
    for index, variance in ((level_index, level_variance), (series_index, series_variance)):
        if variance > 0:
            sums = np.stack([np.bincount(index, column) for column in weighted.T], axis=1)
            part = inverse_normal @ sums.T
            covariance = covariance + variance * part @ part.T
    return covariance


def effective_degrees_of_freedom(variances: np.ndarray, degrees_of_freedom: np.ndarray) -> float:
    """Welch–Satterthwaite formula (JCGM 100:2008, eq. G.2b).

    Parameters
    ----------
    variances : ndarray of shape (k,)
        Contributions to one variance.
    degrees_of_freedom : ndarray of shape (k,)

    Returns
    -------
    float
    """
    variances = np.asarray(variances, dtype=float)
    return float(variances.sum() ** 2 / np.sum(variances**2 / np.asarray(degrees_of_freedom, dtype=float)))


def mean_standard_uncertainty(curve: Curve, covariance: np.ndarray, x: np.ndarray) -> np.ndarray:
    """Standard uncertainty of the mean response at each x (JCGM 100:2008, eq. 13), shape (n,)."""
    jacobian = curve.jacobian(x)
    variance = np.einsum("ij,jk,ik->i", jacobian, covariance, jacobian)
    return np.sqrt(np.maximum(variance, 0.0))  # rounding may leave a zero slightly negative


def confidence_band(
    curve: Curve, covariance: np.ndarray, degrees_of_freedom: float, x: np.ndarray, probability: float = 0.95
) -> Band:
    """Pointwise confidence band of the mean response (Draper & Smith 1998, sec. 3.1).

    Parameters
    ----------
    curve : Curve
    covariance : ndarray of shape (p, p)
    degrees_of_freedom : float
    x : ndarray of shape (n,)
    probability : float

    Returns
    -------
    Band
    """
    half = stats.t.isf((1 - probability) / 2, degrees_of_freedom) * mean_standard_uncertainty(curve, covariance, x)
    middle = curve.evaluate(x)
    return Band(middle - half, middle + half, probability)


def prediction_interval(
    curve: Curve,
    covariance: np.ndarray,
    degrees_of_freedom: float,
    x: np.ndarray,
    observation_variance: np.ndarray,
    probability: float = 0.95,
) -> Band:
    """Pointwise prediction interval of one new observation (Draper & Smith 1998, sec. 3.1).

    Parameters
    ----------
    curve : Curve
    covariance : ndarray of shape (p, p)
    degrees_of_freedom : float
    x : ndarray of shape (n,)
    observation_variance : ndarray of shape (n,)
        Of one observation about the mean response at each x.
    probability : float

    Returns
    -------
    Band
    """
    spread = np.sqrt(mean_standard_uncertainty(curve, covariance, x) ** 2 + observation_variance)
    half = stats.t.isf((1 - probability) / 2, degrees_of_freedom) * spread
    middle = curve.evaluate(x)
    return Band(middle - half, middle + half, probability)


def reading_uncertainty(
    curve: Curve, covariance: np.ndarray, stimulus: float, reading_sd: float, level_sd: float, readings: int = 1
) -> float:
    """Standard uncertainty of a value converted from the mean of some readings.

    ``u(x)^2 = (u(f)^2 + reading_sd^2 / readings + level_sd^2) / f'(x)^2`` (JCGM 100:2008, eq. 13, applied to the
    inverse function): averaging divides the repeatability only.

    Parameters
    ----------
    curve : Curve
    covariance : ndarray of shape (p, p)
    stimulus : float
        The converted value.
    reading_sd : float
        Repeatability standard deviation of one reading, in the unit of the fitted quantity.
    level_sd : float
        Standard deviation that averaging does not divide.
    readings : int

    Returns
    -------
    float
        In the unit of the stimulus; inf where the curve is level.
    """
    x = np.array([stimulus], dtype=float)
    slope = abs(float(curve.slope(x)[0]))
    variance = float(mean_standard_uncertainty(curve, covariance, x)[0]) ** 2 + reading_sd**2 / readings + level_sd**2
    return float(np.sqrt(variance)) / slope if slope > 0 else np.inf
