"""Invented results in the form that the analysis hands to collect: tank gauges with two levels of competition."""

from __future__ import annotations

import copy

LEVELS = [0.0, 2.5, 5.0, 7.5, 10.0]
SERIES = ["1", "2"]


def make_study(ids=("TG-1", "TG-2"), **changes):
    """A resolved study; keyword arguments replace top-level keys."""
    study = {
        "study": "tank-gauges",
        "title": "Tank gauges",
        "stimulus": {"quantity": "water level", "unit": "m"},
        "response": {"quantity": "loop current", "unit": "mA"},
        "random_seed": 7,
        "datasets": [{"id": name, "file_name": name, "files": [f"data/{name}.csv"], "exclusions": []} for name in ids],
        "families": [{"family": "polynomial", "degrees": [1, 2], "fixed_points": []}],
        "validation": [
            {"id": "leave_one_level_out", "scheme": "leave_one_level_out"},
            {"id": "bootstrap", "scheme": "bootstrap", "draws": 200, "unit": "level"},
        ],
        "selection": {"loss": "leave_one_level_out", "rule": "one_standard_error", "degrees_of_freedom": 3},
    }
    return study | copy.deepcopy(changes)


def make_result(name="TG-1", file_name=None, chosen="polynomial-1", offset=0.0, series=SERIES, verdict="adequate"):
    """A result whose curve is 4 + 1.6 x + offset."""
    points = [(label, level) for label in series for level in LEVELS]
    return {
        "dataset": name,
        "file_name": file_name or name,
        "format": 1,
        "settings": _settings(),
        "account": [_account(name, len(points))],
        "observations": _observations(name, points, offset),
        "levels": [_level(level, len(series)) for level in LEVELS],
        "design": {
            "observations": len(points),
            "levels": 5,
            "series": len(series),
            "replicates": False,
            "largest_supported_parameters": 2,
            "notes": ["Few levels."],
        },
        "candidates": [_candidate(degree, chosen, offset) for degree in (1, 2)],
        "schemes": _schemes(),
        "selection": _selection(chosen, verdict, name),
        "verification": [_verification(name)],
        "curves": {},
        "function": _function(name, chosen, offset, verdict),
        "warnings": ["Only 5 levels."],
    }


def make_bundle(results=None, failures=(), study=None):
    """The study with its results."""
    results = [make_result("TG-1"), make_result("TG-2", offset=0.5)] if results is None else results
    study = study or make_study([result["dataset"] for result in results])
    return {"study": study, "results": results, "failures": list(failures)}


def _settings():
    return {
        "evaluation": "inverse",
        "function": "calibration",
        "measuring_interval": [0, 10],
        "stimulus": {"quantity": "water level", "unit": "m"},
        "response": {"quantity": "loop current", "unit": "mA"},
        "fitted": {"quantity": "loop current", "unit": "mA"},
        "evaluated": {"quantity": "water level", "unit": "m"},
        "record": {"serial_number": "0042", "conditions": "23 °C"},
        "weighting": "none",
        "rule": "one_standard_error",
        "loss": "leave_one_level_out",
        "alpha": None,
        "degrees_of_freedom": 3,
        "target": {"expanded": 0.01, "coverage_factor": 2},
    }


def _account(name, count):
    return {
        "file": f"data/{name}.csv",
        "read": count + 1,
        "used": count,
        "excluded": 0,
        "verification": 1,
        "rejected": 0,
    }


def _observations(name, points, offset):
    count = len(points)
    fitted = [4 + 1.6 * level + offset for _, level in points]
    residual = [0.01 * (-1) ** index for index in range(count)]
    columns = {
        "file": [f"data/{name}.csv"] * count,
        "row": list(range(2, count + 2)),
        "series": [label for label, _ in points],
        "direction": ["rising"] * count,
        "level": [level for _, level in points],
        "stimulus": [level for _, level in points],
        "response": [a + b for a, b in zip(fitted, residual, strict=True)],
        "state": ["used"] * count,
        "reason": [""] * count,
        "fitted": fitted,
        "residual": residual,
        "leverage": [0.2] * count,
        "studentized_residual": [residual[0] * 100] * count,
        "flag": [""] * count,
    }
    last = {"file": f"data/{name}.csv", "row": count + 2, "series": "9", "direction": "", "state": "verification"}
    last |= {"stimulus": 3.0, "response": 8.81, "fitted": 8.8 + offset, "residual": 0.01 - offset}
    return {key: [*values, last.get(key)] for key, values in columns.items()}


def _level(level, series):
    same = {"first_stimulus": level, "last_stimulus": level}
    return {"level": level, "observations": series, "series": series, **same}


def _candidate(degree, chosen, offset):
    name = f"polynomial-{degree}"
    coefficients = [12.0 + offset, 8.0] if degree == 1 else [12.0 + offset, 8.0, 0.001]
    estimates = [4.0 + offset, 1.6] if degree == 1 else [4.001 + offset, 1.5992, 0.00008]
    terms = [
        {"term": f"x^{k}", "estimate": value, "standard_uncertainty": 0.001 / (k + 1)}
        for k, value in enumerate(estimates)
    ]
    return {
        "candidate": name,
        "family": "polynomial",
        "group": 0,
        "degree": degree,
        "parameters": degree + 1,
        "status": "fitted",
        "message": "",
        "degrees_of_freedom": 9 - degree,
        "level_degrees_of_freedom": 4 - degree,
        "residual_sum_of_squares": 0.001,
        "residual_standard_deviation": 0.011,
        "fitted_point_loss": 0.0001,
        "aicc": -80.25,
        "bic": -79.5,
        "aicc_levels": None,
        "bic_levels": -39.125,
        "condition_number": 1.5,
        "monotone": True,
        "turning_points": [] if degree == 1 else [-9995.0, 1.25],
        "excursion": {"stimulus": 1.25, "amount": 0.002, "in_residual_sd": 0.2, "in_span": 0.0001},
        "lack_of_fit": {
            "f": 1.125,
            "p": 0.375,
            "numerator_df": 4 - degree,
            "denominator_df": 5,
            "sum_of_squares": 0.0004,
            "pure_error_sum_of_squares": 0.0006,
        },
        "misfit": 0.004,
        "serial": {"ratio": 1.75, "p": 0.3},
        "losses": {
            "leave_one_level_out": {
                "loss": 0.0002 * degree,
                "standard_error": 0.00003,
                "interior_loss": 0.00015,
                "failed_folds": 0,
            },
            "bootstrap": {"loss": 0.0003, "standard_error": None, "interior_loss": None, "failed_folds": 0},
        },
        "bootstrap_share": 0.9 if degree == 1 else 0.1,
        "eligible": True,
        "chosen": name == chosen,
        "reason": "Chosen: the simplest within one standard error." if name == chosen else "Larger loss.",
        "terms": terms,
        "scaled": {
            "basis": "chebyshev",
            "centre": 5.0,
            "half_span": 5.0,
            "fixed_points": [],
            "coefficients": coefficients,
        },
        "power_shift": 1e-15,
    }


def _schemes():
    names = ["polynomial-1", "polynomial-2"]
    folds = [
        {"fold": f"level {level}", "observations": 2, "losses": {names[0]: 0.0001 * (k + 1), names[1]: None}}
        for k, level in enumerate(LEVELS)
    ]
    same = {"status": "evaluated", "message": "", "unit": "level", "row_wise": False}
    losses = {names[0]: [0.0001 * (k + 1) for k in range(5)], names[1]: [None] * 5}
    drawn = [{**fold, "draws": 70} for fold in folds]
    return [
        {
            "scheme": "leave_one_level_out",
            **same,
            "folds": folds,
            "level_losses": losses,
            "draws": None,
            "rank_deficient_draws": None,
        },
        {
            "scheme": "bootstrap",
            **same,
            "folds": drawn,
            "level_losses": losses,
            "draws": 200,
            "rank_deficient_draws": {names[0]: 0, names[1]: 3},
        },
    ]


def _selection(chosen, verdict, name):
    return {
        "candidate": chosen,
        "verdict": verdict,
        "choice": "decided",
        "verdict_reason": "No smooth misfit.",
        "choice_reason": "Smallest loss.",
        "runner_up": "polynomial-2" if chosen == "polynomial-1" else "polynomial-1",
        "margin": 1.0,
        "smallest_loss_candidate": "polynomial-1",
        "threshold": 0.00023,
        "loss": 0.0002 if chosen == "polynomial-1" else 0.0004,
        "outer_loss": 0.00025,
        "outer_loss_interior": 0.00018,
        "outer_choices": {chosen: 5},
        "interior_candidate": "polynomial-1",
        "rankings": {"leave_one_level_out": "polynomial-1", "bootstrap": "polynomial-2", "aicc": "polynomial-1"},
        "largest_residual": {
            "value": -0.01,
            "in_evaluated_unit": -0.00625,
            "stimulus": 2.5,
            "file": f"data/{name}.csv",
            "row": 3,
        },
        "components": {
            "repeatability": 0.01,
            "repeatability_evaluated": 0.00625,
            "pure_error": 0.01,
            "pure_error_evaluated": 0.00625,
            "level_deviation": None,
            "level_deviation_evaluated": None,
            "level_deviation_found": False,
        },
    }


def _verification(name):
    return {
        "file": f"data/{name}.csv",
        "row": 12,
        "series": "9",
        "stimulus": 3.0,
        "response": 8.81,
        "fitted": 8.8,
        "residual": 0.01,
        "evaluated_deviation": 0.00625,
    }


def _function(name, chosen, offset, verdict):
    candidate = _candidate(int(chosen[-1]), chosen, offset)
    size = len(candidate["scaled"]["coefficients"])
    return {
        "format": 1,
        "dataset": name,
        "family": "polynomial",
        "candidate": chosen,
        "evaluation": "inverse",
        "function": "calibration",
        "stimulus": {"quantity": "water level", "unit": "m"},
        "response": {"quantity": "loop current", "unit": "mA"},
        "measuring_interval": [0.0, 10.0],
        "response_at_ends": [4.0 + offset, 20.0 + offset],
        "scaled": candidate["scaled"],
        "covariance": [[4e-06 if i == j else 0.0 for j in range(size)] for i in range(size)],
        "degrees_of_freedom": 8.0,
        "reading_standard_deviation": 0.01,
        "level_standard_deviation": 0.0,
        "power_coefficients": candidate["terms"],
        "power_shift": 1e-15,
        "verdict": verdict,
        "verdict_reason": "No smooth misfit.",
        "choice": "decided",
        "uncertainty_statement": "fit-only uncertainty: not a complete measurement uncertainty",
        "cautions": ["Use inside the interval only.", "Local codes come first."],
        "record": {"serial_number": "0042"},
        "test_vectors": [{"stimulus": 5.0, "response": 12.0 + offset, "verdict": "within_interval"}],
    }
