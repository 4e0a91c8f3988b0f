"""What the scatter is made of: repeatability, scatter between series, deviation of a level."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy import stats

#: Probability below which a component is called found (common practice, no source).
SIGNIFICANT = 0.05
#: The same for differences between whole series: with two or three series the variance is so poorly known that it
#: widens everything, so that more than a hint is asked for (our choice, no source).
SERIES_SIGNIFICANT = 0.01


@dataclass(frozen=True)
class LackOfFit:
    """Analysis of variance of the residuals of one candidate.

    Attributes
    ----------
    f, p : float
        Ratio of the lack-of-fit to the pure-error mean square, and its upper tail probability.
    numerator_df, denominator_df : int
    sum_of_squares, pure_error_sum_of_squares : float
    """

    f: float
    p: float
    numerator_df: int
    denominator_df: int
    sum_of_squares: float
    pure_error_sum_of_squares: float


@dataclass(frozen=True)
class Components:
    """Standard deviations in the fitted quantity's unit (at weight 1); nan where the design does not show them.

    Attributes
    ----------
    repeatability : float
        Within a level and series.
    series_deviation : float
        What a series carries on its own, shared by all its levels.
    pure_error : float
        Within a level over all series.
    level_deviation : float
        What a level carries on its own, shared by its observations.
    """

    repeatability: float
    series_deviation: float
    pure_error: float
    level_deviation: float


@dataclass(frozen=True)
class SeriesEffect:
    """Whether whole series differ, from the scatter within levels.

    Attributes
    ----------
    f, p : float
        Ratio of the mean square of series to the rest, and its upper tail probability.
    numerator_df, denominator_df : int
    deviation : float
        Standard deviation of a series; 0 when its mean square is below the rest.
    rest_variance : float
        Variance within levels when the means of the series are taken out.
    """

    f: float
    p: float
    numerator_df: int
    denominator_df: int
    deviation: float
    rest_variance: float


def series_effect(residual: np.ndarray, root_weights: np.ndarray, level_index: np.ndarray, series_index: np.ndarray):
    """Main effect of series over levels (two-way analysis of variance, Scheffé, The Analysis of Variance, 1959, ch. 4).

    Exact where every series visits every level equally often; otherwise an approximation.

    Parameters
    ----------
    residual : ndarray of shape (n,)
    root_weights : ndarray of shape (n,)
    level_index, series_index : ndarray of shape (n,), int

    Returns
    -------
    SeriesEffect or None
        None with one series or no degree of freedom left.
    """
    means, _ = level_residuals(residual, root_weights, level_index)
    within = residual - means[level_index]
    series_means, weights = level_residuals(within, root_weights, series_index)
    count, n = series_means.size, residual.size
    left = n - means.size - (count - 1)
    if count < 2 or left < 1:
        return None
    rest = float(np.sum((root_weights * (within - series_means[series_index])) ** 2)) / left
    between = float(np.sum(weights * series_means**2)) / (count - 1)
    sizes = np.bincount(series_index)
    number = (n - np.sum(sizes**2) / n) / (count - 1)
    f = between / rest if rest > 0 else (np.inf if between > 0 else 0.0)
    p = float(stats.f.sf(f, count - 1, left))
    return SeriesEffect(f, p, count - 1, left, float(np.sqrt(max(0.0, (between - rest) / number))), rest)


def lack_of_fit(residual: np.ndarray, root_weights: np.ndarray, level_index: np.ndarray, parameters: int):
    """Lack of fit against pure error (Draper & Smith, Applied Regression Analysis, 3rd ed. 1998, sec. 2.1).

    The sums of squares are formed from residuals, so that levels whose stimulus scatters within the tolerance are
    judged about the curve and not about their mean response; for exact repeats the two are the same.

    Parameters
    ----------
    residual : ndarray of shape (n,)
    root_weights : ndarray of shape (n,)
    level_index : ndarray of shape (n,), int
    parameters : int

    Returns
    -------
    LackOfFit or None
        None without replicates, or without levels to spare.
    """
    means, weights = level_residuals(residual, root_weights, level_index)
    levels, n = means.size, residual.size
    if n <= levels or levels <= parameters:
        return None
    lack = float(np.sum(weights * means**2))
    pure = float(np.sum((root_weights * (residual - means[level_index])) ** 2))
    mean_square = lack / (levels - parameters)
    # Replicates that agree exactly (coarse resolution) leave no pure error: any lack of fit is then infinite against it
    f = mean_square / (pure / (n - levels)) if pure > 0 else (np.inf if lack > 0 else 0.0)
    p = float(stats.f.sf(f, levels - parameters, n - levels))
    return LackOfFit(f, p, levels - parameters, n - levels, lack, pure)


def level_residuals(residual: np.ndarray, root_weights: np.ndarray, level_index: np.ndarray):
    """Weighted mean residual and total weight of each level, two arrays of shape (L,)."""
    weights = np.bincount(level_index, root_weights**2)
    return np.bincount(level_index, root_weights**2 * residual) / weights, weights


def level_space(design: np.ndarray, root_weights: np.ndarray, level_index: np.ndarray):
    """What a candidate can describe at the levels, in the scale ``sqrt(W) * level mean``.

    Parameters
    ----------
    design : ndarray of shape (n, p)
        Jacobian at the observations.
    root_weights : ndarray of shape (n,)
    level_index : ndarray of shape (n,), int

    Returns
    -------
    basis : ndarray of shape (L, p)
        Orthonormal columns.
    weights : ndarray of shape (L,)
        Total weight of each level.
    """
    weights = np.bincount(level_index, root_weights**2)
    sums = np.stack([np.bincount(level_index, root_weights**2 * column) for column in design.T], axis=1)
    basis, _ = np.linalg.qr(sums / np.sqrt(weights)[:, None])
    return basis, weights


def variance_components(
    residual: np.ndarray,
    design: np.ndarray,
    root_weights: np.ndarray,
    level_index: np.ndarray,
    series_index: np.ndarray,
    direction_index: np.ndarray | None = None,
) -> Components:
    """Variance components by the method of moments (Searle, Casella & McCulloch, Variance Components, 1992, ch. 5).

    Parameters
    ----------
    residual : ndarray of shape (n,)
    design : ndarray of shape (n, p)
    root_weights : ndarray of shape (n,)
    level_index, series_index : ndarray of shape (n,), int
    direction_index : ndarray of shape (n,), int, or None
        Where given, repeatability is the scatter within level, series and direction.

    Returns
    -------
    Components
    """
    pure, pure_df = _within(residual, root_weights, level_index)
    direction = np.zeros_like(level_index) if direction_index is None else direction_index
    cells = np.unique(np.stack([level_index, series_index, direction]), axis=1, return_inverse=True)[1].ravel()
    repeat, repeat_df = _within(residual, root_weights, cells)
    pure_variance = pure / pure_df if pure_df else np.nan
    repeat_variance = repeat / repeat_df if repeat_df else np.nan
    effect = series_effect(residual, root_weights, level_index, series_index)
    within = pure_variance if effect is None or not effect.p < SERIES_SIGNIFICANT else effect.rest_variance
    level_variance = level_variance_component(residual, design, root_weights, level_index, within)
    series_deviation = np.nan if effect is None else effect.deviation
    repeatability, pure_error, level_deviation = np.sqrt([repeat_variance, pure_variance, level_variance]).tolist()
    return Components(repeatability, float(series_deviation), pure_error, level_deviation)


@dataclass(frozen=True)
class DirectionDifference:
    """Rising less falling at the levels that were met both ways.

    Attributes
    ----------
    difference : ndarray of shape (L,)
        In the unit of the residuals; nan at a level that was met one way only.
    f, p : float
        Ratio of the mean square of the differences to the scatter within level and direction, and its probability.
    """

    difference: np.ndarray
    f: float
    p: float


def direction_difference(
    residual: np.ndarray, root_weights: np.ndarray, level_index: np.ndarray, falling: np.ndarray
) -> DirectionDifference | None:
    """Difference of the two directions at each level (one-way analysis of variance within levels).

    Parameters
    ----------
    residual : ndarray of shape (n,)
    root_weights : ndarray of shape (n,)
    level_index : ndarray of shape (n,), int
    falling : ndarray of shape (n,), int
        1 for falling, 0 for rising.

    Returns
    -------
    DirectionDifference or None
        None where no level was met both ways or no scatter is left to compare with.
    """
    count = int(level_index.max()) + 1
    sums = [np.bincount(level_index, root_weights**2 * residual * (falling == way), minlength=count) for way in (0, 1)]
    weights = [np.bincount(level_index, root_weights**2 * (falling == way), minlength=count) for way in (0, 1)]
    with np.errstate(divide="ignore", invalid="ignore"):
        difference = sums[0] / weights[0] - sums[1] / weights[1]
        between = weights[0] * weights[1] / (weights[0] + weights[1]) * difference**2
    both = np.isfinite(difference)
    scatter, left = _within(residual, root_weights, np.unique(2 * level_index + falling, return_inverse=True)[1])
    if not both.any() or left < 1:
        return None
    mean_square = float(between[both].sum()) / int(both.sum())
    f = mean_square / (scatter / left) if scatter > 0 else (np.inf if mean_square > 0 else 0.0)
    return DirectionDifference(difference, float(f), float(stats.f.sf(f, int(both.sum()), left)))


def level_variance_component(
    residual: np.ndarray, design: np.ndarray, root_weights: np.ndarray, level_index: np.ndarray, within_variance: float
) -> float:
    """Variance of what a level carries on its own, from the excess of level residuals over the scatter within.

    ``E[sum W m^2] = level_variance * tr(M N) + within_variance * (L - p)``, with ``M`` the projector on what the
    candidate cannot describe and ``N`` the numbers of observations (at weight 1 a level's deviation is common to them).

    Parameters
    ----------
    residual : ndarray of shape (n,)
    design : ndarray of shape (n, p)
    root_weights : ndarray of shape (n,)
    level_index : ndarray of shape (n,), int
    within_variance : float
        nan without replicates.

    Returns
    -------
    float
        nan where the design does not show it.
    """
    basis, weights = level_space(design, root_weights, level_index)
    spare = weights.size - design.shape[1]
    if spare < 1 or not np.isfinite(within_variance):
        return np.nan
    means, _ = level_residuals(residual, root_weights, level_index)
    excess = float(np.sum(weights * means**2) - within_variance * spare)
    return max(0.0, excess / float(np.sum((1 - np.sum(basis**2, axis=1)) * np.bincount(level_index))))


def _within(residual: np.ndarray, root_weights: np.ndarray, groups: np.ndarray) -> tuple[float, int]:
    means, _ = level_residuals(residual, root_weights, groups)
    return float(np.sum((root_weights * (residual - means[groups])) ** 2)), residual.size - means.size
