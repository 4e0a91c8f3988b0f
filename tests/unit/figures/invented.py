"""An invented result of one dataset, shaped as the analysis shapes it: numpy polynomials fitted to a level sensor.

Only what the figures and the report read is made here; the statistics are rough and stand for nothing.
"""

from __future__ import annotations

import numpy as np

SCHEMES = ("leave_one_level_out", "leave_one_series_out", "leave_one_out")


def observe(levels: int = 11, series: int = 3, seed: int = 7) -> dict:
    """Readings of a submersible level sensor: loop current against water level, rising and falling."""
    rng = np.random.default_rng(seed)
    rows: dict[str, list] = {"stimulus": [], "response": [], "series": [], "direction": [], "state": []}
    heights = np.linspace(0, 10, levels)
    shared = rng.normal(0, 0.004, levels)
    for number in range(series + 1):
        for at, height in enumerate(heights):
            rows["stimulus"].append(float(height))
            current = 4 + 1.58 * height + 0.002 * height**2 + shared[at] + rng.normal(0, 0.003)
            rows["response"].append(float(current))
            rows["series"].append(str(number + 1))
            rows["direction"].append("rising" if number % 2 == 0 else "falling")
            rows["state"].append("verification" if number == series else "used")
    rows["state"][levels // 2] = "excluded"
    rows["response"][levels // 2] += 0.05
    return rows


def _fit(x: np.ndarray, y: np.ndarray, degree: int) -> np.polynomial.Chebyshev:
    return np.polynomial.Chebyshev.fit(x, y, degree, domain=(0, 10))


def _held_out(x: np.ndarray, y: np.ndarray, folds: list[np.ndarray], degree: int) -> np.ndarray:
    out = np.full(x.size, np.nan)
    for fold in folds:
        out[fold] = y[fold] - _fit(x[~fold], y[~fold], degree)(x[fold])
    return out


def _scheme(name: str, x: np.ndarray, y: np.ndarray, series: np.ndarray, degrees: range) -> tuple[dict, dict]:
    units = {"leave_one_level_out": x, "leave_one_series_out": series, "leave_one_out": np.arange(x.size)}[name]
    labels = list(dict.fromkeys(units.tolist()))
    folds = [units == label for label in labels]
    word = {"leave_one_level_out": "level", "leave_one_series_out": "series", "leave_one_out": "row"}[name]
    listed = [
        {"fold": f"{word} {label}", "observations": int(fold.sum()), "losses": {}}
        for label, fold in zip(labels, folds, strict=True)
    ]
    losses, level_losses = {}, {}
    applies = len(folds) > 1
    for degree in degrees if applies else ():
        candidate = f"polynomial-{degree}"
        squares = _held_out(x, y, folds, degree) ** 2
        per_level = [float(squares[x == level].mean()) for level in np.unique(x)]
        inner = np.isin(x, np.unique(x)[1:-1])
        losses[candidate] = {
            "loss": float(squares.mean()),
            "standard_error": float(np.std(per_level, ddof=1) / np.sqrt(len(per_level))),
            "interior_loss": float(squares[inner].mean()),
            "failed_folds": 0,
        }
        level_losses[candidate] = per_level
        for entry, fold in zip(listed, folds, strict=True):
            entry["losses"][candidate] = float(squares[fold].mean())
    record = {
        "scheme": name, "status": "evaluated" if applies else "not_evaluated",
        "message": "" if applies else "there is only one series",
        "unit": {"level": "level", "series": "series", "row": "observation"}[word],
        "row_wise": word == "row", "folds": listed if applies else [], "level_losses": level_losses, "draws": None,
        "rank_deficient_draws": None,
    }  # fmt: skip
    return record, losses


def _candidate(degree: int, x: np.ndarray, y: np.ndarray, losses: dict, chosen: int) -> dict:
    curve, parameters = _fit(x, y, degree), degree + 1
    squares = float(((y - curve(x)) ** 2).sum())
    levels = np.unique(x).size
    power = curve.convert(kind=np.polynomial.Polynomial).coef
    eligible = degree > 0 and levels - parameters >= 3
    reason = "simplest candidate below the threshold" if degree == chosen else "not the simplest below the threshold"
    if degree == 0:
        reason = "degree 0 cannot be inverted"
    elif not eligible:
        reason = f"{levels} levels less {parameters} parameters leave fewer than 3 degrees of freedom"
    return {
        "candidate": f"polynomial-{degree}", "family": "polynomial", "group": 0, "degree": degree,
        "parameters": parameters, "status": "fitted", "message": "",
        "degrees_of_freedom": x.size - parameters, "level_degrees_of_freedom": levels - parameters,
        "residual_sum_of_squares": squares,
        "residual_standard_deviation": float(np.sqrt(squares / (x.size - parameters))),
        "fitted_point_loss": squares / x.size, "aicc": -100.0 + degree, "bic": -90.0 + degree,
        "aicc_levels": -50.0 + degree, "bic_levels": -45.0 + degree, "condition_number": 1.0 + degree,
        "monotone": degree > 0, "turning_points": [], "excursion": None,
        "lack_of_fit": {"f": 3.2, "p": 0.004, "numerator_df": levels - parameters, "denominator_df": x.size - levels,
                        "sum_of_squares": squares / 2, "pure_error_sum_of_squares": squares / 2},
        "misfit": 0.0031, "serial": {"ratio": 1.8, "p": 0.31},
        "losses": {scheme: found[f"polynomial-{degree}"] for scheme, found in losses.items() if found},
        "bootstrap_share": None, "eligible": eligible, "chosen": degree == chosen, "reason": reason,
        "terms": [{"term": f"x^{k}", "estimate": float(value), "standard_uncertainty": 0.002 / 10**k}
                  for k, value in enumerate(power)],
        "scaled": {"basis": "chebyshev", "centre": 5.0, "half_span": 5.0, "fixed_points": [],
                   "coefficients": [float(value) for value in curve.coef]},
        "power_shift": 1.1e-14,
    }  # fmt: skip


def make_result(dataset: str = "LS-101", levels: int = 11, series: int = 3, top: int = 9, seed: int = 7) -> dict:
    """Return an invented result of a level sensor, with candidates of degree 0 to `top`."""
    rows = observe(levels, series, seed)
    state = np.array(rows["state"])
    x, y = np.array(rows["stimulus"]), np.array(rows["response"])
    used = state == "used"
    degrees = range(0, top + 1)
    schemes, losses = [], {}
    for name in SCHEMES:
        record, losses[name] = _scheme(name, x[used], y[used], np.array(rows["series"])[used], degrees)
        schemes.append(record)
    deciding = losses["leave_one_level_out"]
    best = min(deciding, key=lambda candidate: deciding[candidate]["loss"])
    threshold = deciding[best]["loss"] + deciding[best]["standard_error"]
    chosen = next(d for d in degrees if d > 0 and deciding[f"polynomial-{d}"]["loss"] <= threshold)
    candidates = [_candidate(degree, x[used], y[used], losses, chosen) for degree in degrees]
    return {
        "dataset": dataset, "file_name": dataset, "format": 1, "settings": _settings(),
        "account": [{"file": "data/spring.csv", "read": x.size, "used": int(used.sum()), "excluded": 1,
                     "verification": int((state == "verification").sum()), "rejected": 0}],
        "observations": _observations(rows, _fit(x[used], y[used], chosen)),
        "levels": [{"level": float(level), "observations": int((x[used] == level).sum()), "series": series,
                    "first_stimulus": float(level), "last_stimulus": float(level)} for level in np.unique(x[used])],
        "design": {"observations": int(used.sum()), "levels": levels, "series": series, "replicates": False,
                   "largest_supported_parameters": levels - 3, "notes": []},
        "candidates": candidates, "schemes": schemes,
        "selection": _selection(chosen, best, threshold, losses, degrees),
        "verification": _verification(rows, _fit(x[used], y[used], chosen)),
        "curves": _curves(x[used], y[used], degrees, chosen), "function": None,
        "warnings": ["leave_one_out is row-wise: copies of a level stand on both sides."],
    }  # fmt: skip


def _settings() -> dict:
    level, current = {"quantity": "water level", "unit": "m"}, {"quantity": "loop current", "unit": "mA"}
    return {
        "evaluation": "inverse", "function": "calibration", "measuring_interval": [0.0, 10.0], "stimulus": level,
        "response": current, "fitted": current, "evaluated": level,
        "record": {"serial_number": "LS-101", "date": "2026-04-03", "conditions": "23 °C"}, "weighting": "none",
        "rule": "one_standard_error", "loss": "leave_one_level_out", "alpha": None, "degrees_of_freedom": 3,
        "target": {"expanded": 0.01, "coverage_factor": 2.0},
    }  # fmt: skip


def _observations(rows: dict, curve: object) -> dict:
    size = len(rows["state"])
    fitted = [float(curve(x)) if state != "excluded" else None
              for x, state in zip(rows["stimulus"], rows["state"], strict=True)]  # fmt: skip
    residual = [None if f is None else y - f for y, f in zip(rows["response"], fitted, strict=True)]
    return {
        "file": ["data/spring.csv"] * size, "row": list(range(2, size + 2)), "level": list(rows["stimulus"]),
        **rows, "reason": ["cable moved (shift lead, 2026-04-03)" if s == "excluded" else "" for s in rows["state"]],
        "fitted": fitted, "residual": residual, "leverage": [0.1] * size, "studentized_residual": [0.5] * size,
        "flag": ["suspect" if number == 15 else "" for number in range(size)],
    }  # fmt: skip


def _selection(chosen: int, best: str, threshold: float, losses: dict, degrees: range) -> dict:
    name, deciding = f"polynomial-{chosen}", losses["leave_one_level_out"]
    rival = f"polynomial-{chosen + 1}" if chosen + 1 in degrees else "polynomial-0"
    rankings = {scheme: min(found, key=lambda one: found[one]["loss"]) for scheme, found in losses.items() if found}
    return {
        "candidate": name, "verdict": "adequate", "choice": "decided",
        "verdict_reason": "No smooth misfit was found.",
        "choice_reason": f"{name} is the simplest candidate within one standard error of the smallest loss.",
        "runner_up": rival, "margin": (deciding[rival]["loss"] - deciding[name]["loss"]) / deciding[name]["loss"],
        "smallest_loss_candidate": best, "threshold": threshold, "loss": deciding[name]["loss"],
        "outer_loss": deciding[name]["loss"] * 1.1, "outer_loss_interior": deciding[name]["loss"] * 0.8,
        "outer_choices": {name: 9, rival: 2}, "interior_candidate": rival, "rankings": rankings,
        "largest_residual": {"value": 0.0123, "in_evaluated_unit": 0.0077, "stimulus": 4.0, "file": "data/spring.csv",
                             "row": 7},
        "components": {"repeatability": 0.003, "repeatability_evaluated": 0.0019, "pure_error": 0.0032,
                       "pure_error_evaluated": 0.002, "level_deviation": 0.004, "level_deviation_evaluated": 0.0025,
                       "level_deviation_found": True},
    }  # fmt: skip


def _verification(rows: dict, curve: object) -> list[dict]:
    found = []
    for number, state in enumerate(rows["state"]):
        if state == "verification":
            x, y = rows["stimulus"][number], rows["response"][number]
            found.append({"file": "data/spring.csv", "row": number + 2, "series": rows["series"][number],
                          "stimulus": x, "response": y, "fitted": float(curve(x)), "residual": float(y - curve(x)),
                          "evaluated_deviation": float(y - curve(x)) / 1.6})  # fmt: skip
    return found


def _curves(x: np.ndarray, y: np.ndarray, degrees: range, chosen: int) -> dict:
    grid = np.linspace(0, 10, 201)
    base = _fit(x, y, chosen)(grid)
    band = 0.002 * (1 + 0.5 * ((grid - 5) / 5) ** 2)
    return {
        "stimulus": grid.tolist(), "abscissa": {"quantity": "water level", "unit": "m"},
        "candidates": {f"polynomial-{degree}": _fit(x, y, degree)(grid).tolist() for degree in degrees},
        "confidence_band": {"coverage_probability": 0.95, "lower": (base - band).tolist(),
                            "upper": (base + band).tolist()},
        "prediction_interval": {"coverage_probability": 0.95, "lower": (base - 0.011).tolist(),
                                "upper": (base + 0.011).tolist()},
    }  # fmt: skip
