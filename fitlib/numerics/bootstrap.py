"""Bootstrap losses: resample units, refit, and judge by the units that were not drawn.

The loss is the leave-one-out bootstrap of Efron & Tibshirani, J. Am. Stat. Assoc. 92 (1997) 548, eq. 17: each
observation's squared error is averaged over the draws that left its unit out. Copies of a unit stay together.
"""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass

import numpy as np

from fitlib.numerics.families.protocol import Problem
from fitlib.numerics.validation import weighted_mean

#: A member that cannot be fitted in more than this share of the draws gets no bootstrap loss.
LARGEST_FAILED_SHARE = 0.10
#: Residuals held at once; the results depend on it by rounding alone.
RESIDUALS_AT_ONCE = 4_000_000


@dataclass(frozen=True)
class BootstrapErrors:
    """Squared errors of undrawn observations.

    Attributes
    ----------
    squared : ndarray of shape (members, n)
        Mean over the draws that left the observation out; nan for a member that failed too often or an observation
        that was in every draw.
    rank_deficient : ndarray of shape (members,), int
        Draws that did not determine the member.
    left_out : ndarray of shape (n,), int
        Draws that left the observation out.
    draws : int
    """

    squared: np.ndarray
    rank_deficient: np.ndarray
    left_out: np.ndarray
    draws: int


def bootstrap_errors(
    problem: Problem,
    parameters: Sequence[int],
    counts: Iterable[np.ndarray],
    units: np.ndarray,
    level_index: np.ndarray,
) -> BootstrapErrors:
    """Refit to every draw and average the squared errors of the observations not drawn.

    Parameters
    ----------
    problem : Problem
    parameters : sequence of int
        Of each member; a draw with fewer distinct levels fails.
    counts : iterable of ndarray of shape (draws, units), int
        Draws, in blocks; the results do not depend on how they are cut.
    units : ndarray of shape (n,), int
        Unit of each observation.
    level_index : ndarray of shape (n,), int

    Returns
    -------
    BootstrapErrors
    """
    members, n = len(parameters), units.size
    sizes = np.asarray(parameters)
    total, number = np.zeros((members, n)), np.zeros((members, n))
    deficient, draws, left_out = np.zeros(members, dtype=int), 0, np.zeros(n, dtype=int)
    step = max(1, RESIDUALS_AT_ONCE // (n * members))
    for block in counts:
        for start in range(0, block.shape[0], step):
            rows = block[start : start + step, units]
            levels = distinct_levels(rows, level_index)
            residual, sound = problem.refit_finite(rows, levels)
            sound &= levels[None, :] >= sizes[:, None]
            undrawn = (rows == 0).T.astype(float)
            np.multiply(residual, residual, out=residual)
            residual *= undrawn
            total += np.matmul(residual, sound.astype(float)[:, :, None])[:, :, 0]
            number += sound.astype(float) @ undrawn.T
            deficient += (~sound).sum(axis=1)
            left_out += undrawn.sum(axis=1).astype(int)
            draws += rows.shape[0]
    with np.errstate(invalid="ignore", divide="ignore"):
        squared = np.where(number > 0, total / number, np.nan)
    squared[deficient > LARGEST_FAILED_SHARE * draws] = np.nan
    return BootstrapErrors(squared, deficient, left_out, draws)


def distinct_levels(rows: np.ndarray, level_index: np.ndarray) -> np.ndarray:
    """Number of different levels in each draw.

    Parameters
    ----------
    rows : ndarray of shape (draws, n), int
        Count of each observation.
    level_index : ndarray of shape (n,), int

    Returns
    -------
    ndarray of shape (draws,), int
    """
    order = np.argsort(level_index, kind="stable")
    starts = np.flatnonzero(np.diff(level_index[order], prepend=-1))
    return (np.add.reduceat(rows[:, order], starts, axis=1) > 0).sum(axis=1)


def unit_losses(squared: np.ndarray, weights: np.ndarray, units: np.ndarray, count: int) -> np.ndarray:
    """Mean loss of each unit over the draws that left it out, shape (members, count)."""
    return np.stack([weighted_mean(squared[:, units == k], weights[units == k]) for k in range(count)], axis=1)
