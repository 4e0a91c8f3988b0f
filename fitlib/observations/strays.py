"""Set values that stray from a level which is otherwise met exactly, so that they would be levels of their own.

Where most observations lie at values that are met again and again, a value that is hardly met, and lies within a small
share of the usual gap beside another one, is most likely that level set again, not a level put there on purpose:

- *Hardly met*: in one series only where there are several, or half as often as usual, or less. The value beside it may
  be a level, or another value that is hardly met (two series, one of which strays).
- *Beside*: within 5 % of the gap between the levels around it, and of the median gap between levels. The first keeps
  levels that crowd at one end of an interval of decades from being taken for strays.
- *No continuum*: what lies close together holds one level at most.
- *In place of the level*: with the stray value, its series (where there is only one series, the level) has no more
  observations there than others have. Else it was put there in addition, and only 2 % of the gap make it a stray.

Own rule, tested on seeded data; no source.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

NEAR = 0.05
VERY_NEAR = 0.02
LEAST_LEVELS = 3
_ROUNDING = 1 + 1e-9


@dataclass(frozen=True)
class Strays:
    """Stray values and what they belong to.

    Attributes
    ----------
    group : ndarray of int, shape (n_values,)
        Number of the level of each ascending value, from 0.
    places : tuple of int
        The observations that stray, in the order read.
    """

    group: np.ndarray
    places: tuple[int, ...]


def _hardly_met(label: np.ndarray, series: np.ndarray, counts: np.ndarray) -> np.ndarray:
    repeated = counts[counts > 1]
    if repeated.size == 0:
        return np.ones(counts.size, dtype=bool)
    hardly = 2 * counts <= np.median(repeated)
    if np.unique(series).size == 1:
        return hardly | (counts < 2)
    met = np.bincount(np.unique(np.stack((label, series)), axis=1)[0], minlength=counts.size)
    return hardly | (met < 2)


def _share_of_gap(values: np.ndarray, hardly: np.ndarray) -> np.ndarray:
    """Each gap between neighbouring values as a share of the usual gap there; infinite between two levels."""
    levels = np.flatnonzero(~hardly)
    between = np.diff(values[levels])
    below = np.searchsorted(levels, np.arange(values.size - 1), side="right") - 1
    around = between[np.clip(below, 0, between.size - 1)]
    share = np.diff(values) / np.minimum(around, np.median(between))
    return np.where(hardly[:-1] | hardly[1:], share, np.inf)


def _grouped(joined: np.ndarray) -> np.ndarray:
    return np.concatenate(([0], np.cumsum(~joined)))


def _without_continua(joined: np.ndarray, is_level: np.ndarray) -> np.ndarray:
    group = _grouped(joined)
    return joined & (np.bincount(group, weights=is_level) <= 1)[group[1:]]


def _in_place(group: np.ndarray, series: np.ndarray, asked: np.ndarray) -> np.ndarray:
    """Whether the series of each observation asked for has no more observations at its level than others have."""
    pairs, counts = np.unique(np.stack((group, series)), axis=1, return_counts=True)
    cells: dict[int, dict[int, int]] = {}
    for (level, one), count in zip(pairs.T.tolist(), counts.tolist(), strict=True):
        cells.setdefault(level, {})[one] = count
    if np.unique(series).size == 1:
        most = sorted(sum(own.values()) for own in cells.values())[-2:]
        total = {level: sum(own.values()) for level, own in cells.items()}
        return np.array([total[level] < most[1] or most[0] == most[1] for level in group[asked].tolist()])
    found = []
    for level, one in zip(group[asked].tolist(), series[asked].tolist(), strict=True):
        others = [count for other, count in cells[level].items() if other != one]
        found.append(bool(others) and cells[level][one] <= max(others))
    return np.array(found, dtype=bool)


def find_strays(values: np.ndarray, label: np.ndarray, series: np.ndarray) -> Strays | None:
    """Look for values that stray from levels.

    Parameters
    ----------
    values : ndarray of float, shape (n_values,)
        Distinct stimulus values, ascending.
    label : ndarray of int, shape (n_used,)
        Which of them each observation has.
    series : ndarray of int, shape (n_used,)
        Number of the series of each observation; all equal when there is no such column.

    Returns
    -------
    Strays or None
        None when there are none, or when too little repeats to speak of levels.
    """
    counts = np.bincount(label, minlength=values.size)
    hardly = _hardly_met(label, series, counts)
    at_levels = counts[~hardly]
    if hardly.all() or not hardly.any() or at_levels.size < LEAST_LEVELS or 2 * at_levels.sum() < counts.sum():
        return None
    share = _share_of_gap(values, hardly)
    joined = _without_continua(share <= NEAR * _ROUNDING, ~hardly)
    close = np.append(False, joined) | np.append(joined, False)
    asked = np.flatnonzero((hardly & close)[label])
    if asked.size == 0:
        return None
    nearest = np.minimum(np.append(np.inf, share), np.append(share, np.inf))
    in_place = _in_place(_grouped(joined)[label], series, asked)
    places = asked[in_place | (nearest[label[asked]] <= VERY_NEAR * _ROUNDING)]
    if places.size == 0:
        return None
    belongs = ~hardly
    belongs[label[places]] = True
    group = _grouped(joined & belongs[:-1] & belongs[1:])
    return Strays(_with_split_levels(values, counts, group), tuple(places.tolist()))


def _with_split_levels(values: np.ndarray, counts: np.ndarray, group: np.ndarray) -> np.ndarray:
    """Join values as close as strays are, where no group then has more observations than the largest had before.

    Strays that agree with each other look like a level of their own, and halve the one that they stray from.
    """
    firsts, behind = np.flatnonzero(np.diff(group, prepend=-1)), np.flatnonzero(np.diff(group, append=group[-1] + 1))
    wider = _grouped(np.diff(values) <= np.max(values[behind] - values[firsts]) * _ROUNDING)
    most = np.max(np.bincount(group, weights=counts))
    return wider if np.max(np.bincount(wider, weights=counts)) <= most else group
