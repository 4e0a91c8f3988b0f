"""Many small nested least-squares problems at once, by Cholesky factors built column by column.

Each problem is a normal matrix ``G`` in the orthonormal basis of the whole dataset, where the whole dataset has
``G = I`` and the coefficients ``z``. The leading block of a Cholesky factor is the factor of the leading block (Golub &
Van Loan, Matrix Computations, 4th ed., sec. 4.2.3), so that one factorisation serves every member of a nested family.
The problems run along the last axis, so that each step is one long vector operation.

What is solved for is the *change* of each member's coefficients against the fit to the whole dataset: all numbers then
have the size of residuals, and rounding is relative to them and not to the curve.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np


@dataclass(frozen=True)
class NestedSolutions:
    """Solutions of nested problems.

    Attributes
    ----------
    changes : ndarray of shape (P, P, problems)
        ``[p - 1, :, k]`` is the change of the coefficients of the member with ``p`` parameters (zeros beyond ``p``).
    smallest_pivot : ndarray of shape (P, problems)
        Smallest pivot met up to each member, relative to the whole; a small one marks a problem that normal equations
        cannot be trusted with.
    """

    changes: np.ndarray
    smallest_pivot: np.ndarray


def solve_nested(normal: np.ndarray, right: np.ndarray, z: np.ndarray, whole: np.ndarray) -> NestedSolutions:
    """Solve all nested members of all problems.

    The right-hand side of the member with p parameters is ``right[:p] + G[:p, p:] z[p:]``: the columns that it lacks
    are part of its residual. With ``G = L L^T`` and ``W = L^-1`` the second part becomes ``L[p:, :p]^T z[p:]`` after
    multiplication by ``W``.

    Parameters
    ----------
    normal : ndarray of shape (P, P, problems)
        Symmetric, positive semidefinite.
    right : ndarray of shape (P, problems)
        For the residuals of the largest member.
    z : ndarray of shape (P,)
        Coefficients of the whole dataset.
    whole : ndarray of shape (P, problems) or (P, 1)
        Diagonal against which a pivot is small: what cancelled to give ``normal``.

    Returns
    -------
    NestedSolutions
        After a pivot of zero or less the changes are meaningless (but finite); the pivots say so.
    """
    factor, inverse, pivots = _factorise(normal, whole)
    size, problems = right.shape
    t = np.einsum("jmd,md->jd", inverse, right)
    changes = np.zeros_like(inverse)
    lacking = np.zeros((size, problems))
    for p in range(size, 0, -1):
        changes[p - 1, :p] = np.einsum("kd,kmd->md", t[:p] + lacking[:p], inverse[:p, :p])
        lacking += factor[p - 1] * z[p - 1]
    return NestedSolutions(changes, np.minimum.accumulate(pivots, axis=0))


def _factorise(normal: np.ndarray, whole: np.ndarray) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """Cholesky factor, its inverse, and relative pivots."""
    size, problems = normal.shape[0], normal.shape[2]
    factor = np.zeros((size, size, problems))
    inverse = np.zeros((size, size, problems))
    pivots = np.empty((size, problems))
    for j in range(size):
        row = factor[j, :j]
        pivot = normal[j, j] - np.einsum("kd,kd->d", row, row)
        pivots[j] = np.where(whole[j] > 0, pivot / np.where(whole[j] > 0, whole[j], 1.0), 0.0)
        root = np.sqrt(np.where(pivots[j] > np.finfo(float).eps, pivot, 1.0))
        factor[j, j] = root
        factor[j + 1 :, j] = (normal[j + 1 :, j] - np.einsum("ikd,kd->id", factor[j + 1 :, :j], row)) / root
        # Row j of the inverse factor: L W = I, solved by forward substitution
        inverse[j, :j] = -np.einsum("kd,kmd->md", row, inverse[:j, :j]) / root
        inverse[j, j] = 1 / root
    return factor, inverse, pivots
