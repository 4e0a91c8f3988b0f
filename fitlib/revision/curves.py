"""How far one issued function lies from another over the interval that both cover."""

from __future__ import annotations

from dataclasses import dataclass

_POINTS = 401


@dataclass(frozen=True)
class Shift:
    """Largest distance between two functions.

    Attributes
    ----------
    amount : float
        Magnitude, in the unit of the fitted quantity.
    at : float
        Where, in the unit of the independent variable.
    amount_evaluated : float or None
        Largest magnitude in the evaluated quantity, for a function that is inverted: distance over slope.
    scale : float
        Largest magnitude of the functions themselves there.
    unit, at_unit, unit_evaluated : str
    """

    amount: float
    at: float
    amount_evaluated: float | None
    scale: float
    unit: str
    at_unit: str
    unit_evaluated: str


def largest_shift(before: dict, after: dict) -> Shift | None:
    """Largest distance between two issued functions, on a grid over the interval that both cover.

    Parameters
    ----------
    before, after : dict
        What ``functions/*.json`` holds.

    Returns
    -------
    Shift or None
        None when they are not of the same kind and units, or cover no common interval.
    """
    fitted, free = _roles(after)
    same = all(before[key] == after[key] for key in ("function", "evaluation", "stimulus", "response"))
    interval = _common(_interval(before), _interval(after)) if same else None
    if interval is None:
        return None
    return _shift(before, after, interval, after[fitted]["unit"], after[free]["unit"])


def _shift(before: dict, after: dict, interval: tuple[float, float], unit: str, at_unit: str) -> Shift:
    import numpy as np

    from fitlib.numerics.families import restore

    grid = np.linspace(*interval, _POINTS)
    old, new = restore(before["scaled"]), restore(after["scaled"])
    evaluated = None
    with np.errstate(all="ignore"):  # numbers of another program may leave the range of doubles
        values = old.evaluate(grid), new.evaluate(grid)
        distance = np.abs(values[1] - values[0])
        if after["function"] == "calibration" and after["evaluation"] == "inverse":
            slope = np.abs(new.slope(grid))
            evaluated = float(np.max(distance / slope)) if np.all(slope > 0) else None
    place = int(np.argmax(distance))
    scale = float(np.max(np.abs(values)))
    return Shift(float(distance[place]), float(grid[place]), evaluated, scale, unit, at_unit, at_unit)


def _roles(function: dict) -> tuple[str, str]:
    """Which quantity is fitted, and which is the independent one."""
    return ("stimulus", "response") if function["function"] == "analysis" else ("response", "stimulus")


def _interval(function: dict) -> tuple[float, float]:
    ends = function["response_at_ends"] if function["function"] == "analysis" else function["measuring_interval"]
    return min(ends), max(ends)


def _common(first: tuple[float, float], second: tuple[float, float]) -> tuple[float, float] | None:
    lower, upper = max(first[0], second[0]), min(first[1], second[1])
    return (lower, upper) if lower < upper else None
