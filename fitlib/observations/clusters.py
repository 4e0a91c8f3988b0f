"""Do stimulus values gather in groups without repeating? The rule behind the question for a level tolerance.

Held-out losses are only honest when all observations of one level are held out together. Where each visit to a level
has its own stimulus value (setting scatter), exact equality would make every visit a level of its own. Three signs:

1. Groups. The sorted gaps between distinct values fall into many small and some large ones. Were the values placed at
   random, the gaps would be exponential, and the chance that among n gaps the k smallest all stay below 1/r of the
   others is C(n, k) k B((n - k) r + 1, k), with B the beta function (order statistics of independent exponentials; own
   derivation, see `log_chance`). Gaps that are this unlikely are groups, if at least three groups exist, half of them
   were visited more than once, the values inside a group change from series to series, and the case does not rest on
   one crowded group. The condition on series keeps levels that were put close together on purpose, and are met again
   by every series, from being taken for scatter. The rule is applied on the stimulus and, for scatter that grows with
   it, on its logarithm.
2. Few repeats. In two or more series over the same interval, less than half of the values that could have repeated do.
3. Strays. Most values repeat, and a few that hardly do lie close beside them (`strays`).
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from fitlib.observations.strays import find_strays

LEAST_CHANCE = 1e-3
LEAST_RATIO = 2.0
LEAST_GROUPS = 3
CROWD = 3.0
LEAST_SHARED_VALUES = 4


@dataclass(frozen=True)
class Clusters:
    """What was found.

    Attributes
    ----------
    sign : {"groups", "few repeats", "strays"}
    distinct : int
        Distinct stimulus values.
    closest : float
        Smallest gap between two of them; with a tolerance below it, each value is a level of its own.
    groups : int or None
        Groups that they form; None when they form none.
    width, gap : float or None
        Width of the widest group and smallest gap between groups, in the unit of the stimulus.
    tolerance : float or None
        Proposed level tolerance; None when no single one keeps the groups apart.
    strays : tuple of int
        Places of the observations that lie beside a level; empty for the other signs.
    """

    sign: str
    distinct: int
    closest: float
    groups: int | None = None
    width: float | None = None
    gap: float | None = None
    tolerance: float | None = None
    strays: tuple[int, ...] = ()


def log_chance(gaps: int, small: int, ratio: float) -> float:
    """Logarithm of the bound C(n, k) k B((n - k) r + 1, k) on the chance of such gaps at random places.

    For k given independent exponential gaps with the largest at x (density k (1 - e^-x)^(k-1) e^-x), the n - k others
    all exceed r x with probability e^-(n-k)rx; the integral over x is k B((n - k) r + 1, k), and C(n, k) sets of k gaps
    are possible.
    """
    n, k = gaps, small
    choose = math.lgamma(n + 1) - math.lgamma(k + 1) - math.lgamma(n - k + 1)
    a = (n - k) * ratio + 1
    return choose + math.log(k) + math.lgamma(a) + math.lgamma(k) - math.lgamma(a + k)


def _visits(label: np.ndarray, series: np.ndarray, count: int) -> np.ndarray:
    """How often each value was set: runs of rows, in the order read, with the same value in the same series."""
    fresh = np.ones(label.size, dtype=bool)
    fresh[1:] = (label[1:] != label[:-1]) | (series[1:] != series[:-1])
    return np.bincount(label[fresh], minlength=count)


def _most_per_series(group: np.ndarray, label: np.ndarray, series: np.ndarray, groups: int) -> np.ndarray:
    """The largest number of distinct values that one series has in each group."""
    pairs = np.unique(np.stack((series, label)), axis=1)
    cell, counts = np.unique(np.stack((group[pairs[1]], pairs[0])), axis=1, return_counts=True)
    most = np.zeros(groups, dtype=int)
    np.maximum.at(most, cell[0], counts)
    return most


def _is_scatter(group: np.ndarray, label: np.ndarray, series: np.ndarray, visits: np.ndarray) -> bool:
    """Whether groups of values look like levels that were set again, not like levels meant to differ."""
    groups = int(group[-1]) + 1
    sizes = np.bincount(group, minlength=groups)
    several = sizes > 1
    met_again = several | (np.bincount(group, weights=visits, minlength=groups) > 1)
    if groups < LEAST_GROUPS or several.sum() < 2 or 2 * met_again.sum() < groups:
        return False
    once = np.bincount(group, weights=visits == 1, minlength=groups)
    if np.unique(series).size > 1:
        changing = (sizes > _most_per_series(group, label, series, groups)) | (once == sizes)
    else:
        changing = once > 0
    changing &= several
    return bool(changing.sum() >= 2 and 2 * changing.sum() >= several.sum())


def _edges(group: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Places of the first and last value of each group."""
    firsts = np.flatnonzero(np.diff(group, prepend=-1))
    return firsts, np.append(firsts[1:], group.size) - 1


def _chance_of(centres: np.ndarray, group: np.ndarray) -> float:
    """Logarithm of the chance of a grouping; 0 (certain) when groups are not clearly narrower than the gaps.

    The width of the widest group stands for its widest gap, which it can only exceed: the chance is overstated, and
    chains do not pass for groups.
    """
    firsts, lasts = _edges(group)
    gap = np.min(centres[firsts[1:]] - centres[lasts[:-1]])
    width = np.max(centres[lasts] - centres[firsts])
    small = centres.size - firsts.size
    if small == 0 or gap < LEAST_RATIO * width:
        return 0.0
    return log_chance(centres.size - 1, small, float(gap / width))


def _chance_without_crowd(centres: np.ndarray, group: np.ndarray, visits: np.ndarray) -> float:
    """The chance, less what one crowded group adds to it.

    Values that thin out over decades always crowd at one end, and a crowd alone is no sign of levels: where one group
    was visited far more often than the others, these must make the case without it, and be alike.
    """
    chance = _chance_of(centres, group)
    per_group = np.bincount(group, weights=visits)
    if chance == 0.0 or per_group.max() <= CROWD * np.median(per_group):
        return chance
    crowd = int(np.argmax(per_group))
    others = np.delete(per_group, crowd)
    if others.size < LEAST_GROUPS or others.max() > CROWD * np.median(others):
        return 0.0
    kept = group != crowd
    return _chance_of(centres[kept], np.unique(group[kept], return_inverse=True)[1])


def _best_grouping(centres: np.ndarray, label: np.ndarray, series: np.ndarray) -> tuple[float, np.ndarray | None]:
    """The least likely grouping of ascending values that passes every condition: its chance and group numbers."""
    gaps = np.diff(centres)
    ordered = np.sort(gaps)
    if ordered.size < 2 or ordered[0] <= 0:
        return 0.0, None
    visits = _visits(label, series, centres.size)
    best, grouping = math.log(LEAST_CHANCE), None
    for small in np.flatnonzero(ordered[1:] >= LEAST_RATIO * ordered[:-1]):
        group = np.concatenate(([0], np.cumsum(gaps > ordered[small])))
        chance = _chance_without_crowd(centres, group, visits)
        if chance < best and _is_scatter(group, label, series, visits):
            best, grouping = chance, group
    return best, grouping


def _grow(centres: np.ndarray, label: np.ndarray, series: np.ndarray) -> tuple[float, np.ndarray | None]:
    """Group, then group the groups, as long as the signs hold: replicates scatter less than series do."""
    chance, group = _best_grouping(centres, label, series)
    whole, least = group, chance
    while group is not None:
        label = group[label]
        firsts, lasts = _edges(group)
        centres = (centres[firsts] + centres[lasts]) / 2
        chance, group = _best_grouping(centres, label, series)
        if group is not None:
            whole, least = group[whole], min(chance, least)
    return least, whole


def _grow_by_ratio(values: np.ndarray, label: np.ndarray, series: np.ndarray) -> tuple[float, np.ndarray | None]:
    """Groups on the logarithm of values of one sign; a value of exactly zero is a group of its own."""
    if values[0] < 0 and values[-1] <= 0:
        chance, group = _grow_by_ratio(-values[::-1], values.size - 1 - label, series)
        return chance, None if group is None else group[-1] - group[::-1]
    if values[0] < 0:
        return 0.0, None
    zero = int(values[0] == 0)
    above = label >= zero
    chance, group = _grow(np.log(values[zero:]), label[above] - zero, series[above])
    return chance, None if group is None else np.concatenate(([0] * zero, group + zero)).astype(int)


def _grow_on_both_scales(values: np.ndarray, label: np.ndarray, series: np.ndarray) -> np.ndarray | None:
    """Groups on the stimulus, or on its logarithm where they are less likely there."""
    chance, group = _grow(values, label, series)
    chance_of_ratios, by_ratio = _grow_by_ratio(values, label, series)
    return by_ratio if by_ratio is not None and (group is None or chance_of_ratios < chance) else group


def _between(width: float, gap: float) -> float | None:
    """A short number between the widest group and the smallest gap, near their geometric mean."""
    if not width < gap:
        return None
    middle = math.sqrt(width * gap) if width > 0 else gap / 10
    for digits in range(1, 17):
        proposed = float(f"{middle:.{digits - 1}e}")
        if width * (1 + 1e-6) < proposed < gap * (1 - 1e-6):
            return proposed
    return None


def _closest(values: np.ndarray) -> float:
    return float(np.min(np.diff(values)))


def _described(sign: str, values: np.ndarray, group: np.ndarray, strays: tuple[int, ...] = ()) -> Clusters:
    firsts, lasts = _edges(group)
    width = float(np.max(values[lasts] - values[firsts]))
    gap = float(np.min(values[firsts[1:]] - values[lasts[:-1]]))
    return Clusters(sign, values.size, _closest(values), firsts.size, width, gap, _between(width, gap), strays)


def _few_repeats(values: np.ndarray, label: np.ndarray, series: np.ndarray) -> bool:
    pairs = np.unique(np.stack((label, series)), axis=1)
    in_series = np.bincount(pairs[0], minlength=values.size)
    place = values[pairs[0]]
    starts = np.sort([place[pairs[1] == one].min() for one in np.unique(series)])
    ends = np.sort([place[pairs[1] == one].max() for one in np.unique(series)])
    covering = np.searchsorted(starts, place, "right") - np.searchsorted(ends, place, "left")
    could = covering > 1  # another series reaches over this value, and could have met it
    repeats = could & (in_series[pairs[0]] > 1)
    return bool(could.sum() >= LEAST_SHARED_VALUES and 2 * repeats.sum() < could.sum())


def _by_rank(values: np.ndarray, label: np.ndarray, series: np.ndarray) -> np.ndarray | None:
    """Group the k-th smallest value of every series, when all series have as many and the groups stay apart."""
    ranked = [np.unique(label[series == one]) for one in np.unique(series)]
    if len({own.size for own in ranked}) != 1 or ranked[0].size < LEAST_GROUPS:
        return None
    table = np.stack(ranked)
    if np.any(values[table].max(axis=0)[:-1] >= values[table].min(axis=0)[1:]):
        return None
    group = np.empty(values.size, dtype=int)
    group[table] = np.arange(table.shape[1])
    return group


def find_clusters(stimulus: np.ndarray, series: np.ndarray) -> Clusters | None:
    """Look for stimulus values that gather in groups, hardly repeat over series, or stray from levels.

    Parameters
    ----------
    stimulus : ndarray of float, shape (n_used,)
        Finite, in the order read.
    series : ndarray of int, shape (n_used,)
        Number of the series of each observation; all equal when there is no such column.

    Returns
    -------
    Clusters or None
        None when the values may be taken as levels as they are.
    """
    values, label = np.unique(stimulus, return_inverse=True)
    if values.size < 4:
        return None
    group = _grow_on_both_scales(values, label, series)
    if group is not None:
        return _described("groups", values, group)
    if np.unique(series).size > 1 and _few_repeats(values, label, series):
        group = _by_rank(values, label, series)
        if group is None:
            return Clusters("few repeats", values.size, _closest(values))
        return _described("few repeats", values, group)
    strays = find_strays(values, label, series)
    return None if strays is None else _described("strays", values, strays.group, strays.places)
