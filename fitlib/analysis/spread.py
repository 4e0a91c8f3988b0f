"""The variances that covariance, bands and conversion are made of, each entered once."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy import stats

from fitlib.analysis.dataset import DatasetArrays
from fitlib.numerics.components import (
    SERIES_SIGNIFICANT,
    SIGNIFICANT,
    Components,
    LackOfFit,
    SeriesEffect,
    series_effect,
)
from fitlib.numerics.uncertainty import coefficient_covariance, effective_degrees_of_freedom


@dataclass(frozen=True)
class Spread:
    """What one observation and the fitted coefficients scatter by, at weight 1.

    Attributes
    ----------
    reading : float
        Repeatability, which averaging readings divides; 0 where the design does not show it.
    not_divided : float
        Standard deviation of one new observation that averaging does not divide.
    level_variance, series_variance : float
        0 where no such deviation was found.
    covariance : ndarray of shape (p, p)
        Of the scaled coefficients.
    degrees_of_freedom : float
        Of the covariance, effective where several variances enter.
    lack_of_fit : LackOfFit or None
        Against what remains within levels and series, where whole series differ; else against pure error.
    """

    reading: float
    not_divided: float
    level_variance: float
    series_variance: float
    covariance: np.ndarray
    degrees_of_freedom: float
    lack_of_fit: LackOfFit | None


def find_spread(
    fit, design: np.ndarray, parts: Components, lack: LackOfFit | None, data: DatasetArrays, exact: bool
) -> Spread:
    """Decide which deviations are there, and combine what is there.

    A deviation of levels or of whole series enters where its F test is significant; the scatter of single observations
    is then what remains within levels and series, else the residual variance.

    Parameters
    ----------
    fit : LinearFit
    design : ndarray of shape (n, p)
    parts : Components
    lack : LackOfFit or None
    data : DatasetArrays
    exact : bool
        The fit leaves nothing but rounding: no deviation is sought.

    Returns
    -------
    Spread
    """
    free = data.rows.size - fit.coefficients.size
    single = fit.residual_sum_of_squares / free if free > 0 else np.nan
    effect = None if exact else series_effect(fit.residual, data.root_weights, data.level_index, data.series_index)
    series_found = effect is not None and effect.p < SERIES_SIGNIFICANT
    lack = _against_rest(lack, effect) if series_found and lack is not None else lack
    level_found = not exact and lack is not None and lack.p < SIGNIFICANT
    level_variance = parts.level_deviation**2 if level_found and parts.level_deviation > 0 else 0.0
    series_variance = effect.deviation**2 if series_found else 0.0
    if series_found:
        single = effect.rest_variance
    elif level_variance > 0:
        single = parts.pure_error**2
    # Averaging divides the repeatability only; where that was not observed, it divides nothing
    repeat = min(single, parts.repeatability**2) if np.isfinite(parts.repeatability) else 0.0
    covariance, degrees = _covariance(fit, design, data, single, level_variance, series_variance)
    return Spread(
        reading=float(np.sqrt(repeat)),
        not_divided=float(np.sqrt(level_variance + series_variance + (single - repeat))),
        level_variance=float(level_variance),
        series_variance=float(series_variance),
        covariance=covariance,
        degrees_of_freedom=degrees,
        lack_of_fit=lack,
    )


def _against_rest(lack: LackOfFit, effect: SeriesEffect) -> LackOfFit:
    """Lack of fit against the scatter that is left when the means of the series are taken out.

    Differences between whole series are common to all levels: they blow up pure error and would hide a misfit.
    """
    mean_square = lack.sum_of_squares / lack.numerator_df
    rest, free = effect.rest_variance, effect.denominator_df
    f = mean_square / rest if rest > 0 else (np.inf if mean_square > 0 else 0.0)
    p = float(stats.f.sf(f, lack.numerator_df, free))
    return LackOfFit(float(f), p, lack.numerator_df, free, lack.sum_of_squares, rest * free)


def _covariance(fit, design: np.ndarray, data: DatasetArrays, single, level_variance, series_variance):
    """Covariance of the coefficients and its degrees of freedom (JCGM 100:2008, G.4; mean variance at the data)."""
    common = (design, data.root_weights, fit.inverse_normal, data.level_index)
    parameters = fit.coefficients.size
    without = coefficient_covariance(*common, single, level_variance)
    degrees = data.levels.size - parameters if level_variance > 0 else data.rows.size - parameters
    if not series_variance > 0:
        return without, float(degrees)
    whole = coefficient_covariance(*common, single, level_variance, data.series_index, series_variance)
    variances = [float(np.einsum("ij,jk,ik->", design, part, design)) for part in (without, whole - without)]
    return whole, effective_degrees_of_freedom(variances, [degrees, len(data.series) - 1])
