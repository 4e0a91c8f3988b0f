"""From numpy to plain numbers that JSON can hold; nothing there becomes None."""

from __future__ import annotations

import math

import numpy as np


def number(value) -> float | None:
    """A float, or None for nan and the infinities."""
    value = float(value)
    return value if math.isfinite(value) else None


def numbers(values) -> list[float | None]:
    """A list of floats with None for nan and the infinities."""
    return [number(value) for value in np.asarray(values, dtype=float).ravel()]


def matrix(values) -> list[list[float | None]]:
    """A list of rows."""
    return [numbers(row) for row in np.asarray(values, dtype=float)]
