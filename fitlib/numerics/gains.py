"""The rule ``supported_gain``: more parameters only where two independent looks at the levels support them.

A candidate with more parameters is preferred to a simpler one only when

1. its held-out loss is lower by more than ``LEAST_STANDARD_ERRORS`` standard errors of the loss difference, paired
   by level; paired, because the levels are the same and their deviations largely cancel (Breiman et al.,
   Classification and Regression Trees, 1984, sec. 3.4.3, use the standard error of the loss itself). The first and the
   last level count half: each stands for half a gap, and leaving it out asks for an extrapolation that the function
   will never be used for; and
2. it also fits the level means better than chance allows, by the F test (Draper & Smith, Applied Regression Analysis,
   3rd ed. 1998, sec. 6.1), exact for nested candidates and a yardstick for others.

The simplest candidate to which no richer one is preferred is taken. The combination is ours; the numbers were tuned on
half of a set of simulated studies and are quoted on the other half (tests/statistical/choices.md).
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy import stats

#: Paired standard errors by which the loss has to be lower.
LEAST_STANDARD_ERRORS = 0.8
#: Weight of an end level beside an interior one.
END_WEIGHT = 0.5


@dataclass(frozen=True)
class Gain:
    """What a candidate with more parameters gains over a simpler one.

    Attributes
    ----------
    standard_errors : ndarray of shape (draws,)
        Difference of the losses in paired standard errors; positive where the richer one has the smaller loss.
    p : ndarray of shape (draws,)
        Upper tail probability of the F test on level means.
    """

    standard_errors: np.ndarray
    p: np.ndarray

    def supported(self, alpha: float) -> np.ndarray:
        """Whether both looks support the richer candidate, shape (draws,)."""
        return (self.standard_errors > LEAST_STANDARD_ERRORS) & (self.p < alpha)


def damped_weights(level_weights: np.ndarray) -> np.ndarray:
    """Weights of the levels with the first and last level that carry weight halved.

    Parameters
    ----------
    level_weights : ndarray of shape (L, draws)
        0 for a level that was not drawn.

    Returns
    -------
    ndarray of shape (L, draws)
        Each draw's weights add up to 1.
    """
    weights = level_weights.astype(float)
    there = weights > 0
    draws = np.arange(weights.shape[1])
    first, last = np.argmax(there, axis=0), there.shape[0] - 1 - np.argmax(there[::-1], axis=0)
    weights[first, draws] *= END_WEIGHT
    weights[last, draws] = np.where(last > first, weights[last, draws] * END_WEIGHT, weights[last, draws])
    total = weights.sum(axis=0)
    return weights / np.where(total > 0, total, 1.0)


def gain(
    simpler: np.ndarray,
    richer: np.ndarray,
    weights: np.ndarray,
    squares: tuple[np.ndarray, np.ndarray],
    parameters: tuple[int, int],
    floors: tuple[float, np.ndarray],
) -> Gain:
    """Gain of a richer candidate over a simpler one, for many draws.

    Parameters
    ----------
    simpler, richer : ndarray of shape (L, draws)
        Losses of the levels.
    weights : ndarray of shape (L, draws)
        From ``damped_weights``.
    squares : pair of ndarray of shape (draws,)
        Level sums of squares about the two fits.
    parameters : pair of int
    floors : (float, ndarray of shape (draws,))
        Loss and level sum of squares below which candidates cannot be told apart.

    Returns
    -------
    Gain
        0 standard errors where both losses are below the floor.
    """
    difference = simpler - richer
    mean = np.einsum("ld,ld->d", weights, difference)
    levels = (weights > 0).sum(axis=0)
    spread = np.einsum("ld,ld->d", weights**2, (difference - mean) ** 2)
    with np.errstate(divide="ignore", invalid="ignore"):
        error = np.sqrt(levels / (levels - 1) * spread)
        standard_errors = np.where(error > 0, mean / error, np.sign(mean) * np.inf)
    negligible = np.einsum("ld,ld->d", weights, simpler) <= floors[0]
    standard_errors = np.where(negligible | (mean == 0), 0.0, standard_errors)
    return Gain(standard_errors, _f_probability(squares, parameters, levels, floors[1]))


def _f_probability(squares, parameters, levels: np.ndarray, floor: np.ndarray) -> np.ndarray:
    extra, spare = parameters[1] - parameters[0], levels - parameters[1]
    if extra < 1:
        return np.ones(levels.size)
    with np.errstate(divide="ignore", invalid="ignore"):
        ratio = (squares[0] - squares[1]) / extra / (squares[1] / np.maximum(spare, 1))
    p = stats.f.sf(np.nan_to_num(ratio, nan=0.0), extra, np.maximum(spare, 1))
    p = np.where(squares[1] <= floor, 0.0, p)
    return np.where((squares[0] <= floor) | (spare < 1), 1.0, p)


def simplest_unbeaten(
    supported: np.ndarray, losses: np.ndarray, parameters: np.ndarray, usable: np.ndarray
) -> np.ndarray:
    """The simplest candidate to which no richer one is preferred.

    Parameters
    ----------
    supported : ndarray of shape (m, m, draws), bool
        ``[k, j]``: the gain of j over k is supported.
    losses : ndarray of shape (m, draws)
        Among equal parameter counts the smallest loss stands for all.
    parameters : ndarray of shape (m,), int
    usable : ndarray of shape (m, draws), bool

    Returns
    -------
    ndarray of shape (draws,), int
        -1 where nothing is usable.
    """
    chosen = np.full(losses.shape[1], -1)
    beaten = (supported & usable[None, :, :]).any(axis=1)
    for count in np.unique(parameters):
        peers = np.flatnonzero(parameters == count)
        values = np.where(usable[peers], losses[peers], np.inf)
        best = peers[np.argmin(values, axis=0)]
        draws = np.arange(best.size)
        free = (chosen < 0) & usable[best, draws] & ~beaten[best, draws]
        chosen[free] = best[free]
    return chosen
