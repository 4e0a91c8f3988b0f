"""Issued functions made by hand, with numpy alone, so that nothing here rests on what is tested."""

import hashlib
import json

import numpy as np
import pytest
from numpy.polynomial import chebyshev


def record_of(function, lower, upper, degree, **changes):
    """A function file for an exact polynomial; standard deviations and covariance as given in ``changes``."""
    u = np.cos(np.pi * (np.arange(degree + 1) + 0.5) / (degree + 1))
    x = (lower + upper) / 2 + (upper - lower) / 2 * u
    coefficients = np.linalg.solve(chebyshev.chebvander(u, degree), function(x))

    def value(stimulus):
        scaled = (stimulus - (lower + upper) / 2) / ((upper - lower) / 2)
        return float(chebyshev.chebval(scaled, coefficients))

    inside = np.linspace(lower, upper, 21)
    record = {
        "format": 1,
        "dataset": "LS-101",
        "family": "polynomial",
        "candidate": f"polynomial-{degree}",
        "evaluation": "inverse",
        "function": "calibration",
        "weighting": "none",
        "weight_scale": 1.0,
        "stimulus": {"quantity": "water level", "unit": "m"},
        "response": {"quantity": "loop current", "unit": "mA"},
        "measuring_interval": [float(lower), float(upper)],
        "response_at_ends": [value(lower), value(upper)],
        "scaled": {
            "basis": "chebyshev",
            "centre": (lower + upper) / 2,
            "half_span": (upper - lower) / 2,
            "fixed_points": [],
            "coefficients": coefficients.tolist(),
        },
        "covariance": (1e-6 * np.eye(degree + 1)).tolist(),
        "degrees_of_freedom": 10.0,
        "reading_standard_deviation": 0.004,
        "level_standard_deviation": 0.003,
        "power_coefficients": [],
        "power_shift": 0.0,
        "verdict": "adequate",
        "verdict_reason": "no smooth misfit was found",
        "choice": "decided",
        "uncertainty_statement": "fit-only uncertainty: not a complete measurement uncertainty",
        "cautions": ["Not a substitute for an accredited procedure."],
        "record": {"serial_number": "LS-101"},
        "test_vectors": [
            {"stimulus": float(x), "response": value(float(x)), "verdict": "within_interval"} for x in inside
        ],
    }
    return {**record, **changes}


def sealed(record):
    """The record with the digest that issuing gives it."""
    rest = {key: value for key, value in record.items() if key != "digest"}
    text = json.dumps(rest, sort_keys=True, separators=(",", ":"), ensure_ascii=False, allow_nan=False)
    return {**rest, "digest": hashlib.sha256(text.encode()).hexdigest()}


def rising(**changes):
    """1.6 mA for each metre on 4 mA, a little curved."""
    return record_of(lambda x: 4 + 1.6 * x + 0.002 * x**2, 0.0, 10.0, 2, **changes)


def falling(**changes):
    """A response that falls as the stimulus rises."""
    return record_of(lambda x: 20 - 1.6 * x - 0.002 * x**2, 0.0, 10.0, 2, **changes)


def pump(**changes):
    """A head that rises a little and then falls: the maximum is inside the interval."""
    units = {
        "dataset": "P-3",
        "evaluation": "direct",
        "stimulus": {"quantity": "flow", "unit": "m3/h"},
        "response": {"quantity": "head", "unit": "m"},
    }
    return record_of(lambda q: 48 + 0.0597 * q - 0.0019 * q**2 - 4e-6 * q**3, 0.0, 120.0, 3, **{**units, **changes})


@pytest.fixture
def records():
    """Makers of function records by name."""
    return {"rising": rising, "falling": falling, "pump": pump, "of": record_of, "sealed": sealed}


@pytest.fixture
def load(tmp_path):
    """Write a record to a file and load it."""
    from fitlib.conversion import load_function

    def write_and_load(record):
        path = tmp_path / "function.json"
        path.write_text(json.dumps(sealed(record)), encoding="utf-8")
        return load_function(path)

    return write_and_load
