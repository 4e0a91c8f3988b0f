"""The chosen function as it will be used: curves and bands, verification points, whether the need is met."""

from __future__ import annotations

import numpy as np
from scipy import stats

from fitlib.analysis.dataset import DatasetArrays
from fitlib.analysis.evaluated import in_evaluated_unit
from fitlib.analysis.function_record import observation_variance
from fitlib.analysis.jsonable import number, numbers
from fitlib.numerics.families import restore
from fitlib.numerics.uncertainty import Band, confidence_band, mean_standard_uncertainty, prediction_interval

#: Points of each curve for figures.
CURVE_POINTS = 201
COVERAGE_PROBABILITY = 0.95


def make_curves(records: dict, chosen: dict | None, data: DatasetArrays, study, dataset) -> dict:
    """Curves of all fitted candidates over the interval, with band and interval of the chosen one.

    Parameters
    ----------
    records : dict
        Of the step ``fits``.
    chosen : dict or None
    data : DatasetArrays
    study : fitlib.study.Study
    dataset : fitlib.study.DatasetSettings

    Returns
    -------
    dict
    """
    grid = np.linspace(*data.x_interval, CURVE_POINTS)
    quantity = study.response if data.swapped else study.stimulus
    fitted = {name: record for name, record in records.items() if record["status"] == "fitted"}
    result = {
        "stimulus": numbers(grid),
        "abscissa": {"quantity": quantity.quantity, "unit": quantity.unit},
        "candidates": {name: numbers(restore(record["scaled"]).evaluate(grid)) for name, record in fitted.items()},
        "confidence_band": None,
        "prediction_interval": None,
    }
    if chosen is None or chosen["observation_variance"] is None:
        return result
    curve, covariance, free = _fitted(chosen)
    band = confidence_band(curve, covariance, free, grid, COVERAGE_PROBABILITY)
    interval = _interval(chosen, data, study, dataset, grid)
    for name, limits in (("confidence_band", band), ("prediction_interval", interval)):
        result[name] = {
            "coverage_probability": limits.coverage_probability,
            "lower": numbers(limits.lower),
            "upper": numbers(limits.upper),
        }
    return result


def _fitted(chosen: dict):
    covariance = np.array(chosen["covariance"], dtype=float)
    return restore(chosen["scaled"]), covariance, chosen["covariance_degrees_of_freedom"]


def _observation_variance(chosen: dict, data: DatasetArrays, study, dataset, x: np.ndarray) -> np.ndarray:
    return observation_variance(study, dataset, restore(chosen["scaled"]), x, data, chosen)


def _interval(chosen: dict, data: DatasetArrays, study, dataset, x: np.ndarray) -> Band:
    variance = _observation_variance(chosen, data, study, dataset, x)
    return prediction_interval(*_fitted(chosen), x, variance, COVERAGE_PROBABILITY)


def verification_table(rows: dict, chosen: dict | None, data: DatasetArrays, study, dataset) -> list[dict]:
    """Verification points with their deviation and whether the prediction interval holds them.

    Parameters
    ----------
    rows : dict
        Table of observations.
    chosen : dict or None
    data : DatasetArrays
    study : fitlib.study.Study
    dataset : fitlib.study.DatasetSettings

    Returns
    -------
    list of dict
    """
    which = [k for k, state in enumerate(rows["state"]) if state == "verification"]
    if chosen is None or not which:
        return []
    verdicts = [verdict_of(rows["stimulus"][k], data) for k in which]
    x = np.array([rows["response" if data.swapped else "stimulus"][k] for k in which], dtype=float)
    y = np.array([rows["stimulus" if data.swapped else "response"][k] for k in which], dtype=float)
    residual = np.array([rows["residual"][k] for k in which], dtype=float)
    converted = in_evaluated_unit(restore(chosen["scaled"]), dataset, x, residual)
    columns = ("file", "row", "series", "stimulus", "response", "fitted", "residual")
    table = [
        {name: rows[name][k] for name in columns} | {"evaluated_deviation": number(value), "verdict": verdict}
        for k, value, verdict in zip(which, converted, verdicts, strict=True)
    ]
    known = chosen["observation_variance"] is not None
    limits = _interval(chosen, data, study, dataset, x) if known else Band(x * np.nan, x * np.nan, COVERAGE_PROBABILITY)
    for row, value, lower, upper in zip(table, y, limits.lower, limits.upper, strict=True):
        usable = known and row["verdict"] == "within_interval"
        row["prediction_lower"], row["prediction_upper"] = (number(lower), number(upper)) if usable else (None, None)
        row["within_prediction_interval"] = bool(lower <= value <= upper) if usable else None
    return table


def verdict_of(stimulus: float, data: DatasetArrays) -> str:
    """Whether a stimulus lies in the measuring interval, in the words of a conversion.

    Parameters
    ----------
    stimulus : float
    data : DatasetArrays

    Returns
    -------
    str
    """
    lower, upper = data.interval
    return "below_range" if stimulus < lower else "above_range" if stimulus > upper else "within_interval"


def need_met(chosen: dict | None, data: DatasetArrays, study, dataset) -> dict:
    """Largest expanded uncertainty of one converted reading over the interval, and whether it meets the target.

    Parameters
    ----------
    chosen : dict or None
    data : DatasetArrays
    study : fitlib.study.Study
    dataset : fitlib.study.DatasetSettings

    Returns
    -------
    dict
        ``largest_expanded_uncertainty`` (value and place, or None) and ``target_met`` (None without a target).
    """
    target = study.selection.target
    if chosen is None or chosen["observation_variance"] is None:
        return {"largest_expanded_uncertainty": None, "target_met": None if target is None else False}
    grid = np.linspace(*data.x_interval, CURVE_POINTS)
    curve, covariance, free = _fitted(chosen)
    variance = mean_standard_uncertainty(curve, covariance, grid) ** 2
    variance += _observation_variance(chosen, data, study, dataset, grid)
    factor = float(stats.t.isf((1 - COVERAGE_PROBABILITY) / 2, free))
    expanded = in_evaluated_unit(curve, dataset, grid, factor * np.sqrt(variance))
    place = int(np.argmax(expanded))
    met = None
    if target is not None:
        met = bool(expanded[place] <= target.expanded and (chosen["misfit"] or 0.0) <= target.expanded)
    return {
        "largest_expanded_uncertainty": {"value": number(expanded[place]), "at": number(grid[place])},
        "target_met": met,
    }
