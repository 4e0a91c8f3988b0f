"""The step ``fits``: every candidate fitted to all used observations and looked at from all sides."""

from __future__ import annotations

import numpy as np

from fitlib.analysis.candidates import CandidateSet, Declared, declared_candidates, supported
from fitlib.analysis.dataset import DatasetArrays
from fitlib.analysis.evaluated import in_evaluated_unit
from fitlib.analysis.jsonable import matrix, number, numbers
from fitlib.analysis.schemes import level_losses
from fitlib.analysis.spread import Spread, find_spread
from fitlib.numerics.components import (
    SIGNIFICANT,
    Components,
    LackOfFit,
    direction_difference,
    lack_of_fit,
    level_residuals,
    level_space,
    variance_components,
)
from fitlib.numerics.diagnostics import excursion, information_criteria, is_monotone, serial_correlation
from fitlib.numerics.exact import square_root
from fitlib.numerics.powers import power_form
from fitlib.numerics.validation import standard_error

#: Losses below (this * epsilon * largest |y|)^2 are rounding.
FLOOR_IN_EPSILON = 64


def fit_candidates(candidates: CandidateSet, study, dataset) -> dict:
    """Fit and examine every candidate.

    Parameters
    ----------
    candidates : CandidateSet
    study : fitlib.study.Study
    dataset : fitlib.study.DatasetSettings

    Returns
    -------
    dict
        ``{"candidates": {candidate: record}}``, JSON-able; candidates that the data cannot support included.
    """
    data = candidates.data
    records = {}
    gains = _probe_gains(candidates)
    fits = candidates.fit()
    for item in declared_candidates(study.families):
        position = candidates.position(item.candidate)
        if position is None:
            records[item.candidate] = _unsupported(item, data)
        elif fits[position].message:
            records[item.candidate] = _not_fitted(item, data, fits[position].message)
        else:
            records[item.candidate] = _record(item, candidates, position, fits[position], dataset, gains[position])
    return {"candidates": records}


def _unsupported(item: Declared, data: DatasetArrays) -> dict:
    levels = data.levels.size
    if not np.ptp(data.x) > 0:
        name = "response" if data.swapped else "stimulus"
        return _not_fitted(item, data, f"the {name} is constant: no function of it can be fitted")
    need = item.parameters + 2
    parameters = "1 parameter needs" if item.parameters == 1 else f"{item.parameters} parameters need"
    return _not_fitted(item, data, f"{parameters} at least {need} levels; there are {levels}")


def _heading(item: Declared, data: DatasetArrays) -> dict:
    return {
        "candidate": item.candidate,
        "family": item.family,
        "group": item.group,
        "degree": item.order,
        "parameters": item.parameters,
        "degrees_of_freedom": int(data.rows.size - item.parameters),
        "level_degrees_of_freedom": int(data.levels.size - item.parameters),
    }


def _not_fitted(item: Declared, data: DatasetArrays, message: str) -> dict:
    return _heading(item, data) | {"status": "not_fitted", "message": message}


def _record(item: Declared, candidates: CandidateSet, position: int, fit, dataset, gain: float) -> dict:
    data = candidates.data
    curve = candidates.curve(position, fit.coefficients)
    design = curve.jacobian(data.x)
    lack = lack_of_fit(fit.residual, data.root_weights, data.level_index, item.parameters)
    parts = variance_components(
        fit.residual, design, data.root_weights, data.level_index, data.series_index, data.direction_index
    )
    exact = is_exact(fit.residual_sum_of_squares, data)
    spread = find_spread(fit, design, parts, lack, data, exact)
    covariance = spread.covariance
    exact_fit = candidates.exact(position)
    power = power_form(curve, covariance, *data.x_interval, exact_fit, _plain_variance(exact_fit, spread, item, data))
    return (
        _heading(item, data)
        | {"status": "fitted", "message": "", "exact": exact}
        | _sizes(fit, item, data)
        | _exact_sizes(exact_fit, item, data)
        | _shape(curve, fit, data)
        | _misfit(curve, fit, design, data, dataset, lack, gain)
        | {
            "components": _components(parts, spread),
            "direction_difference": _direction(curve, fit, data, dataset, exact),
            "lack_of_fit_within_series": None if spread.lack_of_fit is lack else _lack_record(spread.lack_of_fit),
            "covariance": matrix(covariance),
            "covariance_degrees_of_freedom": number(spread.degrees_of_freedom),
            "observation_variance": number(spread.reading**2 + spread.not_divided**2),
            "reading_standard_deviation": number(spread.reading),
            "level_standard_deviation": number(spread.not_divided),
            "terms": [
                {"term": f"x^{k}", "estimate": number(estimate), "standard_uncertainty": number(uncertainty)}
                for k, (estimate, uncertainty) in enumerate(
                    zip(power.coefficients, power.standard_uncertainties, strict=True)
                )
            ],
            "power_shift": number(power.largest_shift),
            "scaled": curve.to_record(),
        }
    )


def is_exact(weighted_sum_of_squares: float, data: DatasetArrays) -> bool:
    """Whether a fit leaves nothing but rounding.

    Parameters
    ----------
    weighted_sum_of_squares : float
    data : DatasetArrays

    Returns
    -------
    bool
    """
    return bool(weighted_sum_of_squares <= loss_floor(data) * np.sum(data.root_weights**2))


def loss_floor(data: DatasetArrays) -> float:
    """Loss below which candidates cannot be told apart, in the squared unit of the fitted quantity.

    Parameters
    ----------
    data : DatasetArrays

    Returns
    -------
    float
    """
    return float((FLOOR_IN_EPSILON * np.finfo(float).eps * np.max(np.abs(data.y))) ** 2)


def _sizes(fit, item: Declared, data: DatasetArrays) -> dict:
    n = data.rows.size
    rows = information_criteria(fit.residual_sum_of_squares, data.root_weights, item.parameters)
    means, weights = level_residuals(fit.residual, data.root_weights, data.level_index)
    squares = float(np.sum(weights * means**2))
    root = np.sqrt(weights / weights.mean())
    levels = information_criteria(squares / weights.mean(), root, item.parameters)
    free = n - item.parameters
    return {
        "residual_sum_of_squares": number(fit.residual_sum_of_squares),
        "residual_standard_deviation": number(np.sqrt(fit.residual_sum_of_squares / free)) if free > 0 else None,
        "fitted_point_loss": number(fit.residual_sum_of_squares / np.sum(data.root_weights**2)),
        "level_sum_of_squares": squares,
        "aicc": number(rows.aicc),
        "bic": number(rows.bic),
        "aicc_levels": number(levels.aicc),
        "bic_levels": number(levels.bic),
        "condition_number": number(fit.condition_number),
    }


def _exact_sizes(exact_fit, item: Declared, data: DatasetArrays) -> dict:
    """Residual sum of squares and standard deviation without rounding, where the family has an exact fit."""
    free = data.rows.size - item.parameters
    if exact_fit is None or free < 1:
        return {}
    return {
        "residual_sum_of_squares": number(exact_fit.residual_sum_of_squares),
        "residual_standard_deviation": number(square_root(exact_fit.residual_sum_of_squares / free)),
    }


def _plain_variance(exact_fit, spread: Spread, item: Declared, data: DatasetArrays):
    """Residual variance as an exact number, where nothing else makes up the covariance."""
    free = data.rows.size - item.parameters
    if exact_fit is None or free < 1 or spread.level_variance > 0 or spread.series_variance > 0:
        return None
    return exact_fit.residual_sum_of_squares / free


def _shape(curve, fit, data: DatasetArrays) -> dict:
    beyond = excursion(curve, data.x, data.y, _ascending_in_x(data))
    free = data.rows.size - fit.coefficients.size
    deviation = np.sqrt(fit.residual_sum_of_squares / free) if free > 0 else np.nan
    span = float(np.ptp(data.y))
    return {
        "monotone": is_monotone(curve, *data.x_interval),
        "turning_points": numbers(curve.turning_points(*data.x_interval)),
        "excursion": {
            "stimulus": beyond.stimulus,
            "amount": beyond.amount,
            "in_residual_sd": number(beyond.amount / deviation) if deviation > 0 else None,
            "in_span": number(beyond.amount / span) if span > 0 else None,
        },
    }


def _ascending_in_x(data: DatasetArrays) -> np.ndarray:
    """Level numbers in the order of the independent variable (for an analysis function it may fall)."""
    means = np.bincount(data.level_index, data.x) / np.bincount(data.level_index)
    rank = np.empty(means.size, dtype=int)
    rank[np.argsort(means, kind="stable")] = np.arange(means.size)
    return rank[data.level_index]


def _misfit(curve, fit, design, data: DatasetArrays, dataset, lack: LackOfFit | None, gain: float) -> dict:
    means, weights = level_residuals(fit.residual, data.root_weights, data.level_index)
    at = np.bincount(data.level_index, data.x) / np.bincount(data.level_index)
    sizes = np.abs(in_evaluated_unit(curve, dataset, at, means))
    basis, _ = level_space(design, data.root_weights, data.level_index)
    serial = serial_correlation(np.sqrt(weights) * means, basis)
    return {
        "lack_of_fit": _lack_record(lack),
        "misfit": number(np.max(sizes)),
        "misfit_level": number(data.levels[int(np.argmax(np.where(np.isfinite(sizes), sizes, -1)))]),
        "serial": None if serial is None else {"ratio": number(serial.ratio), "p": number(serial.p)},
        "probe_gain": number(gain),
    }


def _direction(curve, fit, data: DatasetArrays, dataset, exact: bool) -> dict | None:
    """Rising less falling, in the evaluated unit, where the observations say which way they were met."""
    if data.direction_index is None or exact:
        return None
    found = direction_difference(fit.residual, data.root_weights, data.level_index, data.direction_index)
    if found is None:
        return None
    at = np.bincount(data.level_index, data.x) / np.bincount(data.level_index)
    sizes = np.abs(in_evaluated_unit(curve, dataset, at, np.nan_to_num(found.difference)))
    place = int(np.argmax(sizes))
    return {
        "largest": number(sizes[place]),
        "at": number(data.levels[place]),
        "f": number(found.f),
        "p": number(found.p),
        "found": bool(found.p < SIGNIFICANT),
    }


def _lack_record(lack: LackOfFit | None) -> dict | None:
    if lack is None:
        return None
    return {
        "f": number(lack.f),
        "p": number(lack.p),
        "numerator_df": lack.numerator_df,
        "denominator_df": lack.denominator_df,
        "sum_of_squares": number(lack.sum_of_squares),
        "pure_error_sum_of_squares": number(lack.pure_error_sum_of_squares),
    }


def _components(parts: Components, spread: Spread) -> dict:
    return {
        "repeatability": number(parts.repeatability),
        "series_deviation": number(parts.series_deviation),
        "pure_error": number(parts.pure_error),
        "level_deviation": number(parts.level_deviation),
        "level_deviation_found": spread.level_variance > 0,
        "series_deviation_found": spread.series_variance > 0,
    }


def _probe_gains(candidates: CandidateSet) -> list[float]:
    """By how many paired standard errors the member two orders higher lowers the level loss of each entry."""
    data = candidates.data
    if not candidates.entries or data.levels.size < 3:
        return [np.nan] * len(candidates.entries)
    levels = level_losses(candidates)
    share = data.level_weights / data.level_weights.sum()
    return [_gain(levels, share, data.level_weights, k, candidates.probe_of(k)) for k in range(len(candidates.entries))]


def _gain(levels: np.ndarray, share: np.ndarray, weights: np.ndarray, position: int, probe: int | None) -> float:
    if probe is None or not np.all(np.isfinite(levels[[position, probe]])):
        return np.nan
    difference = levels[position] - levels[probe]
    error = standard_error(difference[None, :], weights)[0]
    return float(difference @ share / error) if error > 0 else np.nan


def make_candidates(data: DatasetArrays, study) -> CandidateSet:
    """The candidates of a study that a dataset can support.

    Parameters
    ----------
    data : DatasetArrays
    study : fitlib.study.Study

    Returns
    -------
    CandidateSet
    """
    return CandidateSet(data, supported(declared_candidates(study.families), data), study.families)
