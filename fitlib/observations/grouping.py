"""From used rows to levels: the declared way of grouping, what it must satisfy, and advice when none is declared."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass

import numpy as np

from fitlib.observations.clusters import Clusters, find_clusters
from fitlib.observations.levels import (
    Levels,
    group_by_label,
    group_by_tolerance,
    group_exactly,
    label_others,
    strays,
)
from fitlib.observations.wording import listed, number, plural

Blame = Callable[[str, str], None]
SHOWN_STRAYS = 20


@dataclass(frozen=True)
class Rows:
    """Rows of a dataset as arrays, all files joined.

    Attributes
    ----------
    file : sequence of str
    line : ndarray of int, shape (n_rows,)
    stimulus, response : ndarray of float, shape (n_rows,)
    label : ndarray of float, shape (n_rows,), or None
        The `level` column.
    series : sequence of str
    state : sequence of str
    """

    file: Sequence[str]
    line: np.ndarray
    stimulus: np.ndarray
    response: np.ndarray
    label: np.ndarray | None
    series: Sequence[str]
    state: Sequence[str]

    @property
    def used(self) -> np.ndarray:
        """Places of the used rows."""
        return np.flatnonzero(np.array(self.state) == "used")


@dataclass(frozen=True)
class Grouped:
    """Level and level index of every row, and notes for the reader."""

    level: np.ndarray
    index: np.ndarray
    notes: tuple[str, ...] = ()


def series_numbers(words: Sequence[str]) -> np.ndarray:
    """Series as whole numbers, in the order of first appearance."""
    numbers = {word: place for place, word in enumerate(dict.fromkeys(words))}
    return np.array([numbers[word] for word in words], dtype=int)


def _ways_out(found: Clusters) -> str:
    apart = "`level_tolerance: 0` if each value is meant as a level of its own"
    if found.tolerance is None:
        return f"no single tolerance keeps them apart: name a `level` column, or give {apart}"
    return f"give `level_tolerance: {found.tolerance:g}` (or a `level` column), or {apart}"


def _stray_rows(found: Clusters, rows: Rows) -> str:
    named = [f"{rows.file[at]} row {rows.line[at]} ({number(rows.stimulus[at])})" for at in rows.used[[*found.strays]]]
    return listed(named, SHOWN_STRAYS)


def _exchanged(rows: Rows) -> bool:
    """Whether it is the response that repeats, as set values do, and not the stimulus."""
    used = rows.used
    stimulus, response = (np.unique(part[used]).size for part in (rows.stimulus, rows.response))
    return 2 * response <= used.size and 2 * response <= stimulus


def advice(found: Clusters, rows: Rows) -> str:
    """What was found among the stimulus values, and what the user may declare."""
    seen = f"{found.distinct} distinct stimulus values"
    if found.sign == "strays":
        what = f"{_stray_rows(found, rows)}: set beside a level that is met more often, and would be a level of its own"
        return f"{what}; observations of one level must be held out together: {_ways_out(found)}"
    if found.sign == "groups":
        what = (
            f"{seen} gather in {found.groups} groups without repeating (widest group {number(found.width)}, smallest "
            f"gap between groups {number(found.gap)})"
        )
    else:
        what = f"{seen}, of which few repeat over the series"
        if found.groups is not None:
            what += f"; rank by rank they form {found.groups} groups"
    hint = "are stimulus and response exchanged? The response repeats, the stimulus does not; else " * _exchanged(rows)
    return f"{what}; observations of one level must be held out together: {hint}{_ways_out(found)}"


def _declared(rows: Rows, tolerance: float | None) -> Levels:
    used = rows.used
    if rows.label is not None:
        return group_by_label(rows.stimulus[used], rows.label[used])
    if tolerance is not None and tolerance > 0:
        return group_by_tolerance(rows.stimulus[used], tolerance)
    return group_exactly(rows.stimulus[used])


def _level_of_all(rows: Rows, levels: Levels, tolerance: float) -> np.ndarray:
    used = rows.used
    level = np.full(rows.stimulus.size, np.nan)
    others = np.setdiff1d(np.arange(rows.stimulus.size), used)
    if rows.label is not None:
        level[others] = rows.label[others]
    else:
        level[others] = label_others(rows.stimulus[others], rows.stimulus[used], levels, tolerance)
    level[used] = levels.values[levels.index]
    return level


def _stray_note(rows: Rows) -> list[str]:
    used = rows.used
    found = used[strays(rows.stimulus[used], rows.label[used])]
    if found.size == 0:
        return []
    named = [f"{rows.file[at]} row {rows.line[at]}" for at in found]
    verb = "is" if found.size == 1 else "are"
    return [
        f"{listed(named)}: the stimulus {verb} nearer to another declared level than to the row's own; please check"
    ]


def _still_clustered(rows: Rows, levels: Levels) -> list[str]:
    """A tolerance that is too small would split levels in silence."""
    centres = levels.values[levels.index]
    found = find_clusters(centres, series_numbers([rows.series[at] for at in rows.used]))
    if found is not None and found.sign == "strays":
        named = _stray_rows(found, rows)
        return [
            f"{named}: with this level_tolerance still beside a level, as one of its own; is the tolerance too small?"
        ]
    if found is None or found.sign != "groups":
        return []
    return [
        f"with this level_tolerance there are {levels.values.size} levels, which still gather in {found.groups} "
        "groups; if a group is one level, the tolerance is too small"
    ]


def _check_interval(interval: tuple[float, float] | None, levels: Levels, blame: Blame) -> None:
    if interval is None:
        return
    low, high = interval
    if low < levels.span[0] or high > levels.span[1]:
        span = f"[{number(levels.values[0])}, {number(levels.values[-1])}]"
        message = f"[{number(low)}, {number(high)}] reaches beyond the levels used, {span}; it must lie within them"
        blame("measuring_interval", message)


def group_used(rows: Rows, dataset, settled: bool, blame: Blame) -> Grouped:
    """Put every used row at its level.

    Parameters
    ----------
    rows : Rows
    dataset : fitlib.study.DatasetSettings
    settled : bool
        False while rows or files are rejected: their levels are not known, so that nothing is said about too few
        levels or an interval that is too wide.
    blame : callable
        Takes (key below the dataset, message) for each fault.

    Returns
    -------
    Grouped
    """
    nothing = Grouped(np.full(rows.stimulus.size, np.nan), np.full(rows.stimulus.size, -1))
    used, tolerance = rows.used, dataset.level_tolerance
    if used.size == 0:
        if settled:
            blame("", "no row is used; at least two levels are needed")
        return nothing
    levels = _declared(rows, tolerance)
    for fault in levels.faults:
        blame("columns.level" if rows.label is not None else "level_tolerance", fault)
    notes: list[str] = []
    if rows.label is not None:
        notes += _stray_note(rows)
    elif tolerance is None:
        found = find_clusters(rows.stimulus[used], series_numbers([rows.series[at] for at in used]))
        if found is not None:
            blame("level_tolerance", advice(found, rows))
    elif tolerance > 0 and not levels.faults:
        notes += _still_clustered(rows, levels)
    if settled and levels.values.size == 1:
        where = f"{plural(used.size, 'used row')} at {number(levels.values[0])}"
        notes.append(f"only one level is used ({where}): no function can be fitted")
    if settled:
        _check_interval(dataset.measuring_interval, levels, blame)
    index = np.full(rows.stimulus.size, -1)
    index[used] = levels.index
    return Grouped(_level_of_all(rows, levels, tolerance or 0.0), index, tuple(notes))
