"""Folds, held-out losses, and their standard errors.

The loss of a scheme is ``sum(w r^2) / sum(w)`` over held-out residuals ``r`` of the same observations for every
candidate (mean squared prediction error; Stone, J. R. Stat. Soc. B 36 (1974) 111; Geisser, J. Am. Stat. Assoc. 70
(1975) 320). The unit of its standard error is the level: repeats are averaged first.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from fitlib.numerics.families.protocol import Problem

#: From here on a fold is counted by its own levels and not by all.
MANY_LEVELS = 1000


@dataclass(frozen=True)
class Fold:
    """One set of observations that is left out together.

    Attributes
    ----------
    label : str
    rows : ndarray of int
    repeat : int
        Number of the repeat to which the fold belongs.
    """

    label: str
    rows: np.ndarray
    repeat: int = 0


@dataclass(frozen=True)
class SchemeErrors:
    """Squared held-out residuals of one scheme.

    Attributes
    ----------
    squared : ndarray of shape (members, n)
        Mean over the repeats of the squared held-out residual of each observation; nan where a fold failed.
    fold_loss : ndarray of shape (members, folds)
    failed : ndarray of shape (members, folds), bool
    """

    squared: np.ndarray
    fold_loss: np.ndarray
    failed: np.ndarray


@dataclass(frozen=True)
class Loss:
    """Losses of all members under one scheme.

    Attributes
    ----------
    loss, standard_error, interior : ndarray of shape (members,)
        ``interior`` leaves out the first and the last level.
    levels : ndarray of shape (members, L)
        Mean loss per level.
    """

    loss: np.ndarray
    standard_error: np.ndarray
    interior: np.ndarray
    levels: np.ndarray


def unit_folds(units: np.ndarray, labels: Sequence[str]) -> list[Fold]:
    """One fold for each unit (level, series or observation).

    Parameters
    ----------
    units : ndarray of shape (n,), int
        Number of the unit of each observation, 0 to ``len(labels) - 1``.
    labels : sequence of str

    Returns
    -------
    list of Fold
    """
    order = np.argsort(units, kind="stable")
    bounds = np.searchsorted(units[order], np.arange(len(labels) + 1))
    return [Fold(label, order[bounds[k] : bounds[k + 1]]) for k, label in enumerate(labels)]


def shuffled_folds(units: np.ndarray, count: int, folds: int, orders: Sequence[np.ndarray]) -> list[Fold]:
    """Folds of units in nearly equal numbers, one partition for each repeat.

    Parameters
    ----------
    units : ndarray of shape (n,), int
    count : int
        Number of units.
    folds : int
    orders : sequence of ndarray of shape (count,)
        A permutation of the units for each repeat.

    Returns
    -------
    list of Fold
    """
    result = []
    for repeat, order in enumerate(orders):
        place = np.empty(count, dtype=int)
        place[order] = np.arange(count) % folds
        for fold in range(folds):
            rows = np.flatnonzero(place[units] == fold)
            result.append(Fold(f"repeat {repeat + 1} fold {fold + 1}", rows, repeat))
    return result


def scheme_errors(
    problem: Problem,
    parameters: Sequence[int],
    folds: Sequence[Fold],
    root_weights: np.ndarray,
    level_index: np.ndarray,
) -> SchemeErrors:
    """Leave out each fold in turn and keep the squared residuals.

    Parameters
    ----------
    problem : Problem
        Solver with the data.
    parameters : sequence of int
        Of each member; a fold whose kept observations cover fewer levels fails.
    folds : sequence of Fold
        Within a repeat they do not overlap.
    root_weights : ndarray of shape (n,)
    level_index : ndarray of shape (n,), int

    Returns
    -------
    SchemeErrors
    """
    members, n = len(parameters), level_index.size
    sizes = np.asarray(parameters)
    limits = _levels_kept(folds, level_index)
    total, visits = np.zeros((n, members)), np.zeros(n)
    fold_loss = np.full((members, len(folds)), np.nan)
    failed = limits[None, :] < sizes[:, None]
    weights = root_weights**2
    for numbers, rows, residual in problem.held_out_batches([fold.rows for fold in folds], limits):
        squared = residual**2
        weight = weights[rows]
        np.add.at(total, rows, squared.transpose(0, 2, 1))
        np.add.at(visits, rows, 1)
        fold_loss[:, numbers] = np.einsum("bmr,br->mb", squared, weight) / weight.sum(axis=1)
        failed[:, numbers] |= np.isnan(squared).any(axis=2).T
    with np.errstate(invalid="ignore", divide="ignore"):
        return SchemeErrors(total.T / visits, fold_loss, failed)


def _levels_kept(folds: Sequence[Fold], level_index: np.ndarray) -> np.ndarray:
    """Number of levels that each fold keeps in."""
    sizes = np.bincount(level_index)
    kept = np.full(len(folds), sizes.size)
    for number, fold in enumerate(folds):
        if fold.rows.size == 1:
            kept[number] -= sizes[level_index[fold.rows[0]]] == 1
        elif sizes.size > MANY_LEVELS:
            levels, counts = np.unique(level_index[fold.rows], return_counts=True)
            kept[number] -= np.count_nonzero(counts == sizes[levels])
        else:
            counts = np.bincount(level_index[fold.rows], minlength=sizes.size)
            kept[number] -= np.count_nonzero((counts == sizes) & (sizes > 0))
    return kept


def weighted_mean(values: np.ndarray, weights: np.ndarray) -> np.ndarray:
    """Mean over the last axis with the given weights; nan where any value is nan or nothing is there."""
    if weights.size == 0:
        return np.full(values.shape[:-1], np.nan)
    return values @ weights / weights.sum()


def level_means(values: np.ndarray, weights: np.ndarray, level_index: np.ndarray, count: int) -> np.ndarray:
    """Weighted means per level.

    Parameters
    ----------
    values : ndarray of shape (members, n)
    weights : ndarray of shape (n,)
    level_index : ndarray of shape (n,), int
    count : int
        Number of levels.

    Returns
    -------
    ndarray of shape (members, count)
        nan for a level without observations.
    """
    sums = np.stack([np.bincount(level_index, row * weights, minlength=count) for row in values])
    total = np.bincount(level_index, weights, minlength=count)
    with np.errstate(invalid="ignore", divide="ignore"):
        return sums / total


def summarise(squared: np.ndarray, root_weights: np.ndarray, level_index: np.ndarray, count: int) -> Loss:
    """Loss, standard error over levels, interior loss and losses per level.

    Parameters
    ----------
    squared : ndarray of shape (members, n)
    root_weights : ndarray of shape (n,)
    level_index : ndarray of shape (n,), int
    count : int
        Number of levels.

    Returns
    -------
    Loss
    """
    weights = root_weights**2
    levels = level_means(squared, weights, level_index, count)
    level_weights = np.bincount(level_index, weights, minlength=count)
    return Loss(
        loss=levels @ level_weights / level_weights.sum(),
        standard_error=standard_error(levels, level_weights),
        interior=weighted_mean(levels[:, 1:-1], level_weights[1:-1]),
        levels=levels,
    )


def standard_error(levels: np.ndarray, level_weights: np.ndarray) -> np.ndarray:
    """Standard error of a weighted mean of levels.

    For equal weights this is ``s / sqrt(L)``; in general the variance of a ratio with the levels as primary units
    (Cochran, Sampling Techniques, 3rd ed. 1977, eq. 2.46, without the finite population factor).

    Parameters
    ----------
    levels : ndarray of shape (members, L)
    level_weights : ndarray of shape (L,)

    Returns
    -------
    ndarray of shape (members,)
        nan with fewer than two levels.
    """
    count = level_weights.size
    if count < 2:
        return np.full(levels.shape[0], np.nan)
    share = level_weights / level_weights.sum()
    centred = levels - (levels @ share)[:, None]
    return np.sqrt(count / (count - 1) * np.sum((share * centred) ** 2, axis=1))
