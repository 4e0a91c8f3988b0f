"""From the steps of one dataset to its result: the record that tables, figures and report read."""

from __future__ import annotations

import numpy as np

from fitlib.analysis.candidates import CandidateSet
from fitlib.analysis.dataset import DatasetArrays, make_arrays
from fitlib.analysis.evaluated import in_evaluated_unit, needs_inversion
from fitlib.analysis.fits import make_candidates
from fitlib.analysis.function_record import function_record
from fitlib.analysis.in_use import make_curves, need_met, verdict_of, verification_table
from fitlib.analysis.jsonable import number, numbers
from fitlib.analysis.warnings import collect_warnings
from fitlib.numerics.diagnostics import studentized_residuals, suspects
from fitlib.numerics.families import restore

#: What a candidate that was not fitted has in place of each number.
_EMPTY = {
    "residual_sum_of_squares": None,
    "residual_standard_deviation": None,
    "fitted_point_loss": None,
    "aicc": None,
    "bic": None,
    "aicc_levels": None,
    "bic_levels": None,
    "condition_number": None,
    "exact": None,
    "monotone": None,
    "turning_points": [],
    "excursion": None,
    "lack_of_fit": None,
    "lack_of_fit_within_series": None,
    "misfit": None,
    "serial": None,
    "terms": [],
    "scaled": None,
    "power_shift": None,
}
_HEAD = ("candidate", "family", "group", "degree", "parameters", "status", "message")
_HEAD += ("degrees_of_freedom", "level_degrees_of_freedom")


def assemble(study, dataset, observations, steps: dict[str, dict]) -> dict:
    """Put the steps of one dataset together.

    Parameters
    ----------
    study : fitlib.study.Study
    dataset : fitlib.study.DatasetSettings
    observations : fitlib.observations.Observations
    steps : dict of str to dict
        Results of all steps.

    Returns
    -------
    dict
        JSON-able; its layout is described in DEVELOPERS.md.
    """
    data = make_arrays(study, dataset, observations)
    candidates = make_candidates(data, study)
    selection = steps["selection"]
    schemes = [steps[f"scheme:{scheme.id}"] for scheme in study.validation]
    records = steps["fits"]["candidates"]
    chosen = records.get(selection["candidate"]) if selection["candidate"] else None
    rows = _observation_table(observations, data, candidates, chosen)
    curves = make_curves(records, chosen, data, study, dataset)
    result = {
        "format": 1,
        "dataset": dataset.id,
        "file_name": dataset.file_name,
        "settings": _settings(study, dataset, data),
        "account": [_account(item) for item in observations.account],
        "observations": rows,
        "levels": _levels(data),
        "design": _design(data),
        "candidates": [_candidate(record, schemes, selection) for record in records.values()],
        "schemes": [_scheme(scheme) for scheme in schemes],
        "selection": _selection(selection, records, schemes, rows, chosen, dataset)
        | need_met(chosen, data, study, dataset),
        "verification": verification_table(rows, chosen, data, study, dataset),
        "curves": curves,
        "function": None if chosen is None else function_record(study, dataset, data, chosen, selection),
    }
    result["warnings"] = collect_warnings(result, study, dataset, observations)
    return result


def _settings(study, dataset, data: DatasetArrays) -> dict:
    selection = study.selection
    stimulus = {"quantity": study.stimulus.quantity, "unit": study.stimulus.unit}
    response = {"quantity": study.response.quantity, "unit": study.response.unit}
    target = selection.target
    return {
        "evaluation": dataset.evaluation,
        "function": dataset.function,
        "measuring_interval": list(data.interval),
        "stimulus": stimulus,
        "response": response,
        "fitted": stimulus if dataset.function == "analysis" else response,
        "evaluated": stimulus if dataset.evaluation == "inverse" else response,
        "record": dict(dataset.record),
        "weighting": study.weighting,
        "rule": selection.rule,
        "loss": selection.loss,
        "alpha": selection.alpha,
        "monotone": bool(study.requires_monotone(dataset)),
        "degrees_of_freedom": selection.degrees_of_freedom,
        "target": None if target is None else {"expanded": target.expanded, "coverage_factor": target.coverage_factor},
    }


def _account(item) -> dict:
    return {
        "file": item.file,
        "read": item.read,
        "used": item.used,
        "excluded": item.excluded,
        "verification": item.verification,
        "rejected": item.rejected,
    }


def _levels(data: DatasetArrays) -> list[dict]:
    starts = np.flatnonzero(np.diff(data.level_index, prepend=-1))
    ends = np.append(starts[1:], data.level_index.size)
    return [
        {
            "level": float(data.levels[k]),
            "observations": int(b - a),
            "series": int(np.unique(data.series_index[a:b]).size),
            "first_stimulus": float(data.stimulus[a:b].min()),
            "last_stimulus": float(data.stimulus[a:b].max()),
        }
        for k, (a, b) in enumerate(zip(starts, ends, strict=True))
    ]


def _design(data: DatasetArrays) -> dict:
    levels = int(data.levels.size)
    return {
        "observations": int(data.rows.size),
        "levels": levels,
        "series": len(data.series),
        "replicates": bool(data.rows.size > levels),
        "largest_supported_parameters": max(levels - 2, 0),
        "notes": [],
    }


def _observation_table(observations, data: DatasetArrays, candidates: CandidateSet, chosen: dict | None) -> dict:
    count = len(observations.row)
    table = {
        "file": list(observations.file),
        "row": [int(value) for value in observations.row],
        "series": list(observations.series),
        "direction": list(observations.direction),
        "level": numbers(observations.level),
        "stimulus": numbers(observations.stimulus),
        "response": numbers(observations.response),
        "state": list(observations.state),
        "reason": list(observations.reason),
    }
    columns = ("fitted", "residual", "leverage", "studentized_residual")
    values = {name: np.full(count, np.nan) for name in columns}
    flag = [""] * count
    if chosen is not None:
        _fill_used(values, flag, data, candidates, chosen)
        _fill_verification(values, observations, chosen, data)
    return table | {name: numbers(values[name]) for name in columns} | {"flag": flag}


def _fill_used(values: dict, flag: list[str], data: DatasetArrays, candidates: CandidateSet, chosen: dict) -> None:
    fit = candidates.fit()[candidates.position(chosen["candidate"])]
    fitted = restore(chosen["scaled"]).evaluate(data.x)
    residual = data.y - fitted
    studentized = studentized_residuals(residual, data.root_weights, fit.leverage, chosen["parameters"])
    values["fitted"][data.rows] = fitted
    values["residual"][data.rows] = residual
    values["leverage"][data.rows] = fit.leverage
    values["studentized_residual"][data.rows] = studentized
    if chosen["exact"]:
        return  # residuals are rounding: nothing to suspect
    for row in data.rows[suspects(studentized, chosen["parameters"])]:
        flag[row] = "suspect"


def _fill_verification(values: dict, observations, chosen: dict, data: DatasetArrays) -> None:
    """Fitted values of verification points; none outside the measuring interval, where there is no conversion."""
    states = enumerate(observations.state)
    rows = np.array([k for k, state in states if state == "verification" and _inside(observations, k, data)], dtype=int)
    if not rows.size:
        return
    stimulus = np.asarray(observations.stimulus, dtype=float)[rows]
    response = np.asarray(observations.response, dtype=float)[rows]
    x, y = (response, stimulus) if data.swapped else (stimulus, response)
    values["fitted"][rows] = restore(chosen["scaled"]).evaluate(x)
    values["residual"][rows] = y - values["fitted"][rows]


def _inside(observations, row: int, data: DatasetArrays) -> bool:
    return verdict_of(float(observations.stimulus[row]), data) == "within_interval"


def _candidate(record: dict, schemes: list[dict], selection: dict) -> dict:
    name = record["candidate"]
    nothing = {"loss": None, "standard_error": None, "interior_loss": None, "failed_folds": None}
    result = {key: record[key] for key in _HEAD}
    result |= {key: record.get(key, empty) for key, empty in _EMPTY.items()}
    return result | {
        "losses": {scheme["scheme"]: scheme["losses"].get(name, nothing) for scheme in schemes},
        "bootstrap_share": selection["bootstrap_share"].get(name),
        "eligible": selection["eligible"][name],
        "chosen": name == selection["candidate"],
        "reason": selection["reasons"][name],
    }


def _scheme(scheme: dict) -> dict:
    keys = ("scheme", "status", "message", "unit", "row_wise", "folds", "level_losses", "draws", "rank_deficient_draws")
    return {key: scheme[key] for key in keys}


def _selection(selection: dict, records: dict, schemes: list[dict], rows: dict, chosen: dict | None, dataset) -> dict:
    internal = ("bootstrap_share", "eligible", "reasons")
    return {key: value for key, value in selection.items() if key not in internal} | {
        "rankings": _rankings(selection, records, schemes),
        "largest_residual": None if chosen is None else _largest_residual(rows, chosen, dataset),
        "components": None if chosen is None else _components(chosen, rows, dataset),
    }


def _rankings(selection: dict, records: dict, schemes: list[dict]) -> dict:
    """Candidate with the smallest value under each scheme and criterion, among the eligible ones."""
    open_to = [name for name, eligible in selection["eligible"].items() if eligible]
    result = {}
    for scheme in schemes:
        values = {name: scheme["losses"].get(name, {}).get("loss") for name in open_to}
        result[scheme["scheme"]] = _least(values)
    for criterion in ("aicc", "bic", "aicc_levels", "bic_levels"):
        result[criterion] = _least({name: records[name].get(criterion) for name in open_to})
    return result


def _least(values: dict) -> str | None:
    known = {name: value for name, value in values.items() if value is not None}
    return min(known, key=known.get) if known else None


def _used(rows: dict) -> np.ndarray:
    return np.array([k for k, state in enumerate(rows["state"]) if state == "used"], dtype=int)


def _abscissa(rows: dict, which: np.ndarray, dataset) -> np.ndarray:
    column = "response" if dataset.function == "analysis" else "stimulus"
    return np.array([rows[column][k] for k in which], dtype=float)


def _largest_residual(rows: dict, chosen: dict, dataset) -> dict:
    used = _used(rows)
    residual = np.array([rows["residual"][k] for k in used], dtype=float)
    curve = restore(chosen["scaled"])
    converted = in_evaluated_unit(curve, dataset, _abscissa(rows, used, dataset), residual)
    place = int(np.argmax(np.abs(residual)))
    row = int(used[place])
    return {
        "value": number(residual[place]),
        "in_evaluated_unit": number(abs(converted[place])),
        "stimulus": rows["stimulus"][row],
        "file": rows["file"][row],
        "row": rows["row"][row],
    }


def _components(chosen: dict, rows: dict, dataset) -> dict:
    """Standard deviations in the fitted unit and, divided by the mean slope, in the evaluated unit."""
    curve = restore(chosen["scaled"])
    x = _abscissa(rows, _used(rows), dataset)
    ends = np.array([x.min(), x.max()])
    slope = abs(float(np.diff(curve.evaluate(ends))[0] / np.diff(ends)[0])) if needs_inversion(dataset) else 1.0
    parts = chosen["components"]
    names = ("repeatability", "series_deviation", "pure_error", "level_deviation")
    result = {name: parts[name] for name in names}
    for name in names:
        value = parts[name]
        result[f"{name}_evaluated"] = None if value is None or not slope > 0 else value / slope
    found = ("level_deviation_found", "series_deviation_found")
    return result | {name: parts[name] for name in found} | {"direction_difference": chosen["direction_difference"]}
