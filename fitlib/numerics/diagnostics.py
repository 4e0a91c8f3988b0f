"""Checks of one candidate: information criteria, residuals, serial correlation, behaviour between levels."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy import integrate, stats

from fitlib.numerics.families.protocol import Curve

#: Points in each gap between neighbouring levels at which the curve is looked at.
POINTS_PER_GAP = 32
#: Up to this number of levels the distribution of the von Neumann ratio is computed for the design.
MOST_LEVELS_EXACT = 300


@dataclass(frozen=True)
class Criteria:
    """Information criteria of one fit."""

    aicc: float
    bic: float


@dataclass(frozen=True)
class Serial:
    """Serial correlation of level residuals: the von Neumann ratio and the probability of one as small."""

    ratio: float
    p: float


@dataclass(frozen=True)
class Excursion:
    """How far a curve leaves the range of the neighbouring observations between two levels.

    Attributes
    ----------
    stimulus : float
        Where it goes farthest.
    amount : float
        In the unit of the fitted quantity; 0 when it never leaves.
    """

    stimulus: float
    amount: float


def information_criteria(weighted_rss: float, root_weights: np.ndarray, parameters: int) -> Criteria:
    """Corrected Akaike and Bayesian information criterion of a Gaussian fit.

    The variance counts as a parameter: ``K = p + 1`` (Burnham & Anderson, Model Selection and Multimodel Inference,
    2nd ed. 2002, sec. 2.2 and eq. 2.15; Schwarz, Ann. Stat. 6 (1978) 461), with the full log-likelihood at its maximum.

    Parameters
    ----------
    weighted_rss : float
    root_weights : ndarray of shape (n,)
    parameters : int

    Returns
    -------
    Criteria
        AICc is inf where ``n <= K + 1``; both are -inf for an exact fit.
    """
    n, k = root_weights.size, parameters + 1
    if not weighted_rss > 0:
        return Criteria(-np.inf, -np.inf)
    deviance = n * (np.log(2 * np.pi * weighted_rss / n) + 1) - 2 * np.sum(np.log(root_weights))
    correction = 2 * k * (k + 1) / (n - k - 1) if n > k + 1 else np.inf
    return Criteria(float(deviance + 2 * k + correction), float(deviance + k * np.log(n)))


def studentized_residuals(residual: np.ndarray, root_weights: np.ndarray, leverage: np.ndarray, parameters: int):
    """Externally studentized residuals (Cook & Weisberg, Residuals and Influence in Regression, 1982, eq. 2.2.8).

    Parameters
    ----------
    residual, root_weights, leverage : ndarray of shape (n,)
    parameters : int

    Returns
    -------
    ndarray of shape (n,)
        nan where an observation determines its own fit (leverage 1) or no degree of freedom is left.
    """
    n = residual.size
    weighted = residual * root_weights
    left = n - parameters - 1
    if left < 1:
        return np.full(n, np.nan)
    free = 1 - leverage
    total = np.sum(weighted**2)
    with np.errstate(divide="ignore", invalid="ignore"):
        without = (total - weighted**2 / free) / left
        value = weighted / np.sqrt(without * free)
    return np.where((free > 1e-10) & (without > total * 1e-12), value, np.nan)


def suspects(studentized: np.ndarray, parameters: int, probability: float = 0.05) -> np.ndarray:
    """Observations whose studentized residual is larger than chance allows among n (Bonferroni).

    Cook & Weisberg 1982, sec. 2.2.2. The test flags; it never removes.

    Parameters
    ----------
    studentized : ndarray of shape (n,)
    parameters : int
    probability : float
        Of one false flag among all observations.

    Returns
    -------
    ndarray of shape (n,), bool
    """
    n = studentized.size
    left = n - parameters - 1
    if left < 1:
        return np.zeros(n, dtype=bool)
    limit = stats.t.isf(probability / (2 * n), left)
    return np.abs(np.nan_to_num(studentized)) > limit


def serial_correlation(level_residual: np.ndarray, basis: np.ndarray) -> Serial | None:
    """Von Neumann ratio of level residuals with its lower tail probability for the design.

    The ratio is that of von Neumann, Ann. Math. Stat. 12 (1941) 367, without the factor L/(L-1). As the residuals of a
    fit are not independent, its distribution under independent level deviations is computed for the candidate's own
    design (Durbin & Watson, Biometrika 58 (1971) 1), by the integral of Imhof, Biometrika 48 (1961) 419, eq. 3.2; with
    many levels by the normal limit with mean 2 and variance 4/L (von Neumann 1941).

    Parameters
    ----------
    level_residual : ndarray of shape (L,)
        Mean residual of each level times the root of its weight, in the order of the levels.
    basis : ndarray of shape (L, p)
        Orthonormal columns of what the candidate can describe.

    Returns
    -------
    Serial or None
        None when fewer than two dimensions are left.
    """
    count, parameters = basis.shape
    total = float(level_residual @ level_residual)
    if not total > 0 or count - parameters < 2:
        return None
    ratio = float(np.sum(np.diff(level_residual) ** 2) / total)
    if count > MOST_LEVELS_EXACT:
        return Serial(ratio, float(stats.norm.cdf((ratio - 2) / np.sqrt(4 / count))))
    projector = np.eye(count) - basis @ basis.T
    difference = np.diff(np.eye(count), axis=0)
    form = projector @ (difference.T @ difference - ratio * np.eye(count)) @ projector
    values = np.linalg.eigvalsh(form)
    return Serial(ratio, _negative_probability(values[np.abs(values) > 1e-9 * np.max(np.abs(values))]))


def _negative_probability(weights: np.ndarray) -> float:
    """P(sum(weights * chi-squared(1)) < 0), Imhof 1961, eq. 3.2 with x = 0."""
    if np.all(weights > 0):
        return 0.0
    if np.all(weights < 0):
        return 1.0
    scaled = weights / np.max(np.abs(weights))

    def integrand(t: float) -> float:
        # u = exp(t) spreads the slowly falling tail evenly
        u = np.exp(t)
        angle = 0.5 * np.sum(np.arctan(scaled * u))
        return np.sin(angle) * np.exp(-0.25 * np.sum(np.log1p((scaled * u) ** 2)))

    value, _ = integrate.quad(integrand, -30, 60, limit=400, epsabs=1e-10, epsrel=1e-10, points=[0.0])
    return float(np.clip(0.5 - value / np.pi, 0.0, 1.0))


def excursion(curve: Curve, x: np.ndarray, y: np.ndarray, level_index: np.ndarray) -> Excursion:
    """Largest distance by which the curve leaves the observations of the two neighbouring levels.

    Between two neighbouring levels a sound curve stays within the range of what was observed at both, but for the
    scatter; a curve that oscillates does not. (Our own measure; no source.)

    Parameters
    ----------
    curve : Curve
    x, y : ndarray of shape (n,)
    level_index : ndarray of shape (n,), int
        In ascending order of x.

    Returns
    -------
    Excursion
    """
    order = np.argsort(level_index, kind="stable")
    starts = np.searchsorted(level_index[order], np.arange(int(level_index.max()) + 1))
    left, right = np.maximum.reduceat(x[order], starts), np.minimum.reduceat(x[order], starts)
    low, high = np.minimum.reduceat(y[order], starts), np.maximum.reduceat(y[order], starts)
    share = np.linspace(0, 1, POINTS_PER_GAP + 1)
    grid = left[:-1, None] + (right[1:] - left[:-1])[:, None] * share
    values = curve.evaluate(grid.ravel()).reshape(grid.shape)
    above = values - np.maximum(high[:-1], high[1:])[:, None]
    below = np.minimum(low[:-1], low[1:])[:, None] - values
    beyond = np.maximum(np.maximum(above, below), 0)
    place = np.unravel_index(np.argmax(beyond), beyond.shape)
    return Excursion(float(grid[place]), float(beyond[place]))


def is_monotone(curve: Curve, lower: float, upper: float) -> bool:
    """Whether the curve rises or falls strictly over the whole interval.

    Parameters
    ----------
    curve : Curve
    lower, upper : float

    Returns
    -------
    bool
    """
    grid = np.linspace(lower, upper, 257)
    steps = np.diff(curve.evaluate(grid))
    return not curve.turning_points(lower, upper).size and bool(np.all(steps > 0) or np.all(steps < 0))
