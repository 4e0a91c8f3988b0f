"""The calibration function for machines: what functions/<dataset>.json holds."""

from __future__ import annotations

import hashlib
import json

import numpy as np

from fitlib.analysis.dataset import DatasetArrays
from fitlib.analysis.words import figure
from fitlib.numerics.families import restore
from fitlib.numerics.inverse import inverse_evaluation
from fitlib.numerics.shortened import shortest
from fitlib.numerics.uncertainty import mean_standard_uncertainty
from fitlib.numerics.weighting import spread

#: Points at which a shortened form is compared with the issued function.
SHORT_FORM_POINTS = 65
#: Test vectors inside the interval, both ends included.
VECTORS_INSIDE = 21
FIT_ONLY = "fit-only uncertainty: not a complete measurement uncertainty"


def function_record(study, dataset, data: DatasetArrays, chosen: dict, selection: dict) -> dict:
    """The record of the chosen function.

    Parameters
    ----------
    study : fitlib.study.Study
    dataset : fitlib.study.DatasetSettings
    data : DatasetArrays
    chosen : dict
        Its record of the step ``fits``.
    selection : dict
        Result of the step ``selection``.

    Returns
    -------
    dict
        JSON-able.
    """
    curve = restore(chosen["scaled"])
    record = {
        "format": 1,
        "dataset": dataset.id,
        "family": chosen["family"],
        "candidate": chosen["candidate"],
        "evaluation": dataset.evaluation,
        "function": dataset.function,
        "weighting": study.weighting,
        "weight_scale": float(_weight_scale(study, data)),
        "stimulus": {"quantity": study.stimulus.quantity, "unit": study.stimulus.unit},
        "response": {"quantity": study.response.quantity, "unit": study.response.unit},
        "measuring_interval": list(data.interval),
        "response_at_ends": _response_at_ends(dataset, curve, data),
        "scaled": chosen["scaled"],
        "covariance": chosen["covariance"],
        "degrees_of_freedom": chosen["covariance_degrees_of_freedom"],
        "reading_standard_deviation": chosen["reading_standard_deviation"],
        "level_standard_deviation": chosen["level_standard_deviation"],
        "power_coefficients": chosen["terms"],
        "power_shift": chosen["power_shift"],
        "short_form": _short_form(study, dataset, curve, data, chosen),
        "verdict": selection["verdict"],
        "verdict_reason": selection["verdict_reason"],
        "choice": selection["choice"],
        "uncertainty_statement": FIT_ONLY,
        "cautions": cautions(study, dataset, data, selection["verdict"], chosen["reading_standard_deviation"] > 0),
        "record": dict(dataset.record),
        "test_vectors": _test_vectors(dataset, curve, data, chosen["monotone"]),
    }
    return record | {"digest": record_digest(record)}


def _short_form(study, dataset, curve, data: DatasetArrays, chosen: dict) -> dict | None:
    """Fewest digits of the power coefficients that move no converted value noticeably."""
    estimates = [term["estimate"] for term in chosen["terms"]]
    if None in estimates or chosen["observation_variance"] is None or chosen["exact"]:
        return None
    x = np.linspace(*data.x_interval, SHORT_FORM_POINTS)
    covariance = np.array(chosen["covariance"], dtype=float)
    variance = observation_variance(study, dataset, curve, x, data, chosen)
    form = shortest(curve, estimates, x, np.sqrt(mean_standard_uncertainty(curve, covariance, x) ** 2 + variance))
    if form is None:
        return None
    return {"digits": form.digits, "coefficients": list(form.coefficients), "largest_share": float(form.largest_share)}


def record_digest(record: dict) -> str:
    """SHA-256 of a function record without its digest, so that a hand edit is noticed when it is read.

    Parameters
    ----------
    record : dict

    Returns
    -------
    str
        Hexadecimal.
    """
    text = json.dumps(record, sort_keys=True, separators=(",", ":"), ensure_ascii=False, allow_nan=False)
    return hashlib.sha256(text.encode("utf-8")).hexdigest()


def cautions(study, dataset, data: DatasetArrays, verdict: str, repeatability_known: bool = True) -> list[str]:
    """What a user of the function has to be told.

    Parameters
    ----------
    study : fitlib.study.Study
    dataset : fitlib.study.DatasetSettings
    data : DatasetArrays
    verdict : str
    repeatability_known : bool

    Returns
    -------
    list of str
    """
    unit = "" if study.stimulus.unit == "1" else f" {study.stimulus.unit}"
    lower, upper = (figure(value, 8) for value in data.interval)
    serial = dataset.record.get("serial_number")
    lines = [
        f"Valid only for {study.stimulus.quantity} from {lower} to {upper}{unit}; there is no conversion outside.",
        f"Valid only for {f'the instrument with serial number {serial}' if serial else 'the instrument calibrated'}, "
        f"as it was on the day of calibration{_clause(dataset.record, 'date', ' (', ')')}"
        f"{_clause(dataset.record, 'conditions', ' and under its conditions (', ')')}.",
        f"Uncertainty stated with it is {FIT_ONLY}.",
        "Not a substitute for an accredited calibration procedure or a functional-safety assessment. Local codes, "
        "accredited procedures and the judgement of licensed or otherwise competent persons take precedence.",
        "Check it against an independent standard before use.",
    ]
    if not repeatability_known:
        lines.insert(3, "Repeatability was not observed: averaging readings does not reduce the uncertainty stated.")
    if verdict != "adequate":
        lines.insert(0, f"Verdict {verdict}: not to be used for conversion.")
    return lines


def _clause(record: dict, key: str, before: str, after: str) -> str:
    return f"{before}{record[key]}{after}" if record.get(key) else ""


def observation_variance(study, dataset, curve, x: np.ndarray, data: DatasetArrays, chosen: dict) -> np.ndarray:
    """Variance of one new observation about the function at each abscissa.

    Parameters
    ----------
    study : fitlib.study.Study
    dataset : fitlib.study.DatasetSettings
    curve : Curve
    x : ndarray of shape (n,)
        Independent variable of the fit.
    data : DatasetArrays
    chosen : dict
        Its record of the step ``fits``.

    Returns
    -------
    ndarray of shape (n,)
    """
    return chosen["observation_variance"] * _observation_spread(study, dataset, curve, x, data) ** 2


def _observation_spread(study, dataset, curve, x: np.ndarray, data: DatasetArrays) -> np.ndarray:
    """Relative standard deviation of one observation at each abscissa, 1 on average over the observations used."""
    stimulus = curve.evaluate(x) if dataset.function == "analysis" else x
    if study.weighting == "none":
        return np.ones_like(x)
    return spread(study.weighting, np.maximum(stimulus, np.min(data.stimulus))) * _weight_scale(study, data)


def _weight_scale(study, data: DatasetArrays) -> float:
    """Factor from the spread of the weighting to the standard deviation at weight 1 (weights average 1)."""
    relative = spread(study.weighting, data.stimulus)
    return float(np.sqrt(np.mean(relative**-2.0)))


def _response_at_ends(dataset, curve, data: DatasetArrays) -> list[float]:
    if dataset.function != "analysis":
        return [float(value) for value in curve.evaluate(np.array(data.interval))]
    first, last = curve.evaluate(np.array(data.x_interval))
    ends = data.x_interval if first <= last else data.x_interval[::-1]
    return [_response_near(curve, data, value, end) for value, end in zip(data.interval, ends, strict=True)]


def _response_near(curve, data: DatasetArrays, stimulus: float, expected: float) -> float:
    """Response at which an analysis function gives an end of the interval; the expected one where it is not unique."""
    margin = (data.x_interval[1] - data.x_interval[0]) / 10
    found = inverse_evaluation(curve, stimulus, data.x_interval[0] - margin, data.x_interval[1] + margin)
    return found.value if found.verdict == "within_interval" else expected


def _test_vectors(dataset, curve, data: DatasetArrays, monotone: bool) -> list[dict]:
    """Pairs of stimulus and response inside the interval, and two outside with the verdict expected."""
    ends = _response_at_ends(dataset, curve, data) if data.swapped else data.interval
    grid = np.linspace(*ends, VECTORS_INSIDE)
    values = curve.evaluate(grid)
    pairs = zip(values, grid, strict=True) if dataset.function == "analysis" else zip(grid, values, strict=True)
    ordered = sorted(pairs)
    vectors = [{"stimulus": float(a), "response": float(b), "verdict": "within_interval"} for a, b in ordered]
    return vectors + _outside(dataset, curve, data) if monotone else vectors


def _outside(dataset, curve, data: DatasetArrays) -> list[dict]:
    lower, upper = data.interval
    at_lower, at_upper = _response_at_ends(dataset, curve, data)
    step, span = (at_upper - at_lower) / 100, (upper - lower) / 100
    return [
        {"stimulus": lower - span, "response": at_lower - step, "verdict": "below_range"},
        {"stimulus": upper + span, "response": at_upper + step, "verdict": "above_range"},
    ]
