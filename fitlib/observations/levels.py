"""Which observations share a level: by a declared column, by a tolerance, or by exact equality of the stimulus."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from fitlib.observations.wording import listed, number


@dataclass(frozen=True)
class Levels:
    """Levels of the used observations.

    Attributes
    ----------
    values : ndarray of float, shape (n_levels,)
        Ascending, in the unit of the stimulus.
    index : ndarray of int, shape (n_used,)
        Level of each used observation.
    span : tuple of float
        Lowest and highest stimulus that a measuring interval may reach.
    faults : tuple of str
    """

    values: np.ndarray
    index: np.ndarray
    span: tuple[float, float]
    faults: tuple[str, ...] = ()


def reach(tolerance: float, stimulus: np.ndarray) -> float:
    """The tolerance with room for the rounding of decimal numbers: 1.02 - 1.0 counts as 0.02."""
    if tolerance == 0.0 or stimulus.size == 0:
        return tolerance
    return tolerance * (1 + 1e-9) + 4 * np.finfo(float).eps * float(np.max(np.abs(stimulus)))


def _mean(values: np.ndarray) -> float:
    """Mean that does not depend on the order of the values, and is exact when all are equal."""
    ordered = np.sort(values)
    return float(ordered[0]) if ordered[0] == ordered[-1] else math.fsum(ordered) / ordered.size


def group_exactly(stimulus: np.ndarray) -> Levels:
    """Every distinct stimulus value is a level."""
    values, index = np.unique(stimulus, return_inverse=True)
    return Levels(values, index, (float(values[0]), float(values[-1])))


def group_by_tolerance(stimulus: np.ndarray, tolerance: float) -> Levels:
    """Sorted stimulus values whose gaps are within the tolerance form one level (single linkage).

    A group wider than the tolerance is a chain: its ends differ by more than what a level may, and no cut inside it is
    better than another, so that it is a fault.
    """
    order = np.argsort(stimulus, kind="stable")
    ordered = stimulus[order]
    allowed = reach(tolerance, ordered)
    starts = np.concatenate(([0], np.flatnonzero(np.diff(ordered) > allowed) + 1, [ordered.size]))
    index = np.empty(stimulus.size, dtype=int)
    values, faults = [], []
    for level, (first, behind) in enumerate(zip(starts[:-1], starts[1:], strict=True)):
        group = ordered[first:behind]
        index[order[first:behind]] = level
        values.append(_mean(group))
        if group[-1] - group[0] > allowed:
            faults.append(_chain(group, tolerance))
    slack = tolerance  # a level is known no better than its tolerance
    return Levels(np.array(values), index, (float(ordered[0]) - slack, float(ordered[-1]) + slack), tuple(faults))


def _chain(group: np.ndarray, tolerance: float) -> str:
    distinct = [number(value) for value in np.unique(group)]
    shown = listed(distinct) if len(distinct) <= 8 else f"{', '.join(distinct[:4])} … {', '.join(distinct[-2:])}"
    return (
        f"stimulus values {shown} chain: each lies within {number(tolerance)} of the next, but the ends are "
        f"{number(group[-1] - group[0])} apart; give a smaller level_tolerance, or a `level` column"
    )


def group_by_label(stimulus: np.ndarray, label: np.ndarray) -> Levels:
    """Levels as the `level` column says; it must hold values of the stimulus, not a running number."""
    values, index = np.unique(label, return_inverse=True)
    means = np.array([_mean(stimulus[index == level]) for level in range(values.size)])
    faults = []
    for level, mean in enumerate(means):
        nearest = int(np.argmin(np.abs(values - mean)))
        if abs(values[nearest] - mean) < abs(values[level] - mean):
            faults.append(
                f"level {number(values[level])} has the mean stimulus {number(mean)}, which is nearer to level "
                f"{number(values[nearest])}; the `level` column must hold the stimulus value of the level"
            )
    low = min(float(values[0]), float(np.min(stimulus[index == 0])))
    high = max(float(values[-1]), float(np.max(stimulus[index == values.size - 1])))
    return Levels(values, index, (low, high), tuple(faults))


def strays(stimulus: np.ndarray, label: np.ndarray) -> np.ndarray:
    """Places of observations whose stimulus is nearer to another declared level than to their own."""
    values, index = np.unique(label, return_inverse=True)
    above = np.clip(np.searchsorted(values, stimulus), 0, values.size - 1)
    below = np.clip(above - 1, 0, None)
    nearest = np.minimum(np.abs(values[above] - stimulus), np.abs(values[below] - stimulus))
    return np.flatnonzero(nearest < np.abs(values[index] - stimulus))


def label_others(others: np.ndarray, used: np.ndarray, levels: Levels, tolerance: float) -> np.ndarray:
    """Level of rows that are not used: that of the nearest used stimulus within the tolerance, else NaN."""
    found = np.full(others.size, np.nan)
    order = np.argsort(used, kind="stable")
    ordered = used[order]
    allowed = reach(tolerance, ordered)
    for place, value in enumerate(others):
        if math.isnan(value) or ordered.size == 0:
            continue
        right = min(int(np.searchsorted(ordered, value)), ordered.size - 1)
        nearest = min((right, max(right - 1, 0)), key=lambda candidate: abs(ordered[candidate] - value))
        if abs(ordered[nearest] - value) <= allowed:
            found[place] = levels.values[levels.index[order[nearest]]]
    return found
