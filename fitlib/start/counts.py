"""Counts that decide what the data can support: levels, series, replicates."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from fitlib.observations.clusters import Clusters, find_clusters
from fitlib.observations.grouping import series_numbers
from fitlib.observations.levels import Levels, group_by_label, group_by_tolerance, group_exactly


@dataclass(frozen=True)
class Counts:
    """What a file holds.

    Attributes
    ----------
    rows, unreadable : int
        Rows of the file, and those of them in which a number is missing or cannot be read.
    levels, series : int
    replicates : int
        Largest number of observations at one level in one series.
    tolerance : float or None
        Level tolerance to declare; None when levels repeat exactly or a column names them.
    clusters : Clusters or None
        Why a tolerance is needed.
    low, high : float
        Lowest and highest level.
    """

    rows: int
    unreadable: int
    levels: int
    series: int
    replicates: int
    tolerance: float | None
    clusters: Clusters | None
    low: float
    high: float


def _grouped(stimulus: np.ndarray, label: np.ndarray | None, series: np.ndarray):
    if label is not None:
        return group_by_label(stimulus, label), None, None
    clusters = find_clusters(stimulus, series)
    if clusters is None:
        return group_exactly(stimulus), None, None
    tolerance = clusters.tolerance if clusters.tolerance is not None else 0.0
    return group_by_tolerance(stimulus, tolerance), tolerance, clusters


def count(stimulus: np.ndarray, response: np.ndarray, label: np.ndarray | None, series: Sequence[str]) -> Counts | None:
    """Count levels, series and replicates among the rows that can be read.

    Parameters
    ----------
    stimulus, response : ndarray of float, shape (n_rows,)
        NaN where a field is no number.
    label : ndarray of float, shape (n_rows,), or None
        The level column.
    series : sequence of str
        Empty text when there is no series column.

    Returns
    -------
    Counts or None
        None when no row can be read.
    """
    readable = np.isfinite(stimulus) & np.isfinite(response)
    if label is not None:
        readable &= np.isfinite(label)
    if not readable.any():
        return None
    numbers = series_numbers(series)[readable]
    levels: Levels
    levels, tolerance, clusters = _grouped(stimulus[readable], None if label is None else label[readable], numbers)
    cells = np.unique(np.stack((levels.index, numbers)), axis=1, return_counts=True)[1]
    values = levels.values
    return Counts(
        rows=stimulus.size,
        unreadable=int(np.sum(~readable)),
        levels=values.size,
        series=np.unique(numbers).size,
        replicates=int(cells.max()),
        tolerance=tolerance,
        clusters=clusters,
        low=float(values[0]),
        high=float(values[-1]),
    )
