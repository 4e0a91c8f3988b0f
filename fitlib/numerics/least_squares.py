"""Linear least squares for nested designs: one QR factorisation serves every member of a family.

A nested design is one matrix whose first ``p`` columns are the design of the member with ``p`` parameters. With
``A = diag(root_weights) @ design = Q R`` (Householder QR; Golub & Van Loan, Matrix Computations, 4th ed., sec. 5.3.3)
the first ``p`` columns of ``Q`` and the leading block of ``R`` belong to that member.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass

import numpy as np
from scipy.linalg import solve_triangular

#: A design with a larger condition number in the scaled basis is treated as rank deficient.
LARGEST_CONDITION = 1e12
#: Below this smallest eigenvalue of I - H_BB a left-out block is refitted rather than updated in closed form, so that
#: cancellation cannot eat more than about four digits.
SMALLEST_BLOCK_EIGENVALUE = 1e-4
#: Below this pivot a left-out block of a resample is taken to leave the member undetermined.
SMALLEST_RESAMPLED_PIVOT = 1e-9
#: Doubles held at once by the batched refits; blocks of draws are cut to it, results do not depend on it.
BLOCK_DOUBLES = 4_000_000


@dataclass(frozen=True)
class LinearFit:
    """The least-squares fit of one member.

    Attributes
    ----------
    coefficients : ndarray of shape (p,)
    inverse_normal : ndarray of shape (p, p)
        ``(A^T A)^-1``; times a variance it is the covariance of the coefficients.
    fitted, residual, leverage : ndarray of shape (n,)
        On the fitted quantity's own scale (residuals unweighted); leverage of the weighted fit.
    residual_sum_of_squares : float
        Weighted sum of squares.
    condition_number : float
        Of the weighted design in the scaled basis, 2-norm.
    message : str
        Empty, or why there is no fit (then the arrays are filled with nan).
    """

    coefficients: np.ndarray
    inverse_normal: np.ndarray
    fitted: np.ndarray
    residual: np.ndarray
    leverage: np.ndarray
    residual_sum_of_squares: float
    condition_number: float
    message: str = ""


@dataclass(frozen=True)
class HeldOut:
    """Residuals of observations left out of the fit.

    Attributes
    ----------
    residual : ndarray of shape (members, n)
        Unweighted; nan for observations that were in no block or whose block failed.
    failed : ndarray of shape (members, blocks), bool
        Blocks without which the member's coefficients are not determined.
    """

    residual: np.ndarray
    failed: np.ndarray


class LinearProblem:
    """All members of one nested linear family on one dataset.

    Parameters
    ----------
    design : ndarray of shape (n, largest)
        Columns in the order in which members take them up.
    target : ndarray of shape (n,)
        Dependent variable less any part that carries no coefficient.
    root_weights : ndarray of shape (n,)
        Square roots of the weights.
    sizes : sequence of int
        Number of columns of each member, at least 1.
    """

    def __init__(self, design: np.ndarray, target: np.ndarray, root_weights: np.ndarray, sizes: Sequence[int]):
        self.design = design
        self.target = target
        self.root_weights = root_weights
        self.sizes = tuple(int(size) for size in sizes)
        self._weighted = design * root_weights[:, None]
        self._weighted_target = target * root_weights
        rows = min(design.shape[0], design.shape[1])
        self._q, self._r = np.linalg.qr(self._weighted)
        self._z = self._q.T @ self._weighted_target
        self._rows = rows

    def fit(self) -> tuple[LinearFit, ...]:
        """Fit every member.

        Returns
        -------
        tuple of LinearFit
            In the order of ``sizes``; a member without a fit says why in its message.
        """
        return tuple(self._fit_member(size) for size in self.sizes)

    def _fit_member(self, size: int) -> LinearFit:
        n = self.design.shape[0]
        if size > n:
            return _no_fit(n, size, f"{size} parameters need at least {size} observations; there are {n}")
        condition = _condition(self._r[:size, :size])
        if not condition < LARGEST_CONDITION:
            return _no_fit(
                n, size, f"the observations do not determine {size} parameters (rank deficient design)", condition
            )
        return self._solve_member(size, condition)

    def _solve_member(self, size: int, condition: float) -> LinearFit:
        r, q = self._r[:size, :size], self._q[:, :size]
        coefficients = solve_triangular(r, self._z[:size])
        weighted_residual = self._weighted_target - self._weighted[:, :size] @ coefficients
        # One step of refinement: it costs nothing and takes out most of the rounding of the triangular solve
        # (Björck, Numerical Methods for Least Squares Problems, 1996, sec. 2.9.3).
        coefficients = coefficients + solve_triangular(r, q.T @ weighted_residual)
        fitted = self.design[:, :size] @ coefficients
        residual = self.target - fitted
        inverse_r = solve_triangular(r, np.eye(size))
        return LinearFit(
            coefficients=coefficients,
            inverse_normal=inverse_r @ inverse_r.T,
            fitted=fitted,
            residual=residual,
            leverage=np.einsum("ij,ij->i", q, q),
            residual_sum_of_squares=float(np.sum((self.root_weights * residual) ** 2)),
            condition_number=condition,
        )

    def held_out(self, blocks: Sequence[np.ndarray]) -> HeldOut:
        """Residuals of each block of observations when the block is left out of the fit.

        In closed form from the one factorisation: ``r_B(held out) = (I - H_BB)^-1 r_B`` in the weighted scale
        (Cook & Weisberg, Residuals and Influence in Regression, 1982, sec. 3.2 and eq. A.2.1 for a single case; the
        block form follows from the same identity). Blocks near the limit of rank are refitted.

        Parameters
        ----------
        blocks : sequence of ndarray of int
            Row numbers of each block; blocks do not overlap.

        Returns
        -------
        HeldOut
        """
        residual = np.full((len(self.sizes), self.design.shape[0]), np.nan)
        failed = np.zeros((len(self.sizes), len(blocks)), dtype=bool)
        for member, size in enumerate(self.sizes):
            if size > self._rows or not _condition(self._r[:size, :size]) < LARGEST_CONDITION:
                failed[member] = True
                continue
            weighted = self._weighted_residual(size)
            for numbers in _by_length(blocks):
                rows = np.stack([blocks[number] for number in numbers])
                values, smallest = _leave_blocks_out(self._q[:, :size], weighted, rows)
                for place, number in enumerate(numbers):
                    if smallest[place] < SMALLEST_BLOCK_EIGENVALUE:
                        values[place], failed[member, number] = self._refit_without(blocks[number], size)
                residual[member, rows] = values / self.root_weights[rows]
        return HeldOut(residual, failed)

    def _weighted_residual(self, size: int) -> np.ndarray:
        q = self._q[:, :size]
        residual = self._weighted_target - q @ self._z[:size]
        return residual - q @ (q.T @ residual)  # twice is enough (Björck 1996, sec. 2.4.5)

    def _refit_without(self, block: np.ndarray, size: int) -> tuple[np.ndarray, bool]:
        keep = np.ones(self.design.shape[0], dtype=bool)
        keep[block] = False
        if keep.sum() < size:
            return np.full(block.size, np.nan), True
        part = LinearProblem(self.design[keep, :size], self.target[keep], self.root_weights[keep], (size,))
        fit = part.fit()[0]
        if fit.message:
            return np.full(block.size, np.nan), True
        held = self.target[block] - self.design[block, :size] @ fit.coefficients
        return held * self.root_weights[block], False

    def refit(self, counts: np.ndarray) -> Iterator[tuple[slice, np.ndarray]]:
        """Residuals of all observations for fits to resamples, in blocks of draws of bounded memory.

        Parameters
        ----------
        counts : ndarray of shape (draws, n), int
            How often each observation is in each draw.

        Yields
        ------
        draws : slice
            The draws that this block covers.
        residual : ndarray of shape (draws in the block, members, n)
            Unweighted residuals of every observation, drawn or not; nan where the draw does not determine the member.
        """
        n, largest = self.design.shape
        step = max(1, BLOCK_DOUBLES // (n * max(largest, 1) * 4))
        for start in range(0, counts.shape[0], step):
            part = slice(start, min(start + step, counts.shape[0]))
            yield part, self._refit_block(counts[part])

    def _refit_block(self, counts: np.ndarray) -> np.ndarray:
        largest = min(max(self.sizes), self.design.shape[0])
        root = np.sqrt(counts)
        weighted = self._weighted[None, :, :largest] * root[:, :, None]
        q, r = np.linalg.qr(weighted)
        z = np.einsum("dnp,dn->dp", q, self._weighted_target * root)
        prediction = _nested_predictions(self.design[:, :largest], r, z, np.linalg.norm(weighted, axis=1))
        out = np.full((counts.shape[0], len(self.sizes), self.design.shape[0]), np.nan)
        for member, size in enumerate(self.sizes):
            if size <= largest:
                out[:, member] = self.target - prediction[:, size - 1]
        return out

    def resampled_held_out(
        self, counts: np.ndarray, blocks: Sequence[np.ndarray]
    ) -> Iterator[tuple[slice, np.ndarray]]:
        """Held-out residuals of each block within each resample, for repeating a whole selection on resamples.

        In the basis ``Q`` of a draw the normal matrix without block B is ``I - Q_B^T Q_B``. Its Cholesky factor is
        nested like ``R``, so that one factorisation per draw and block serves all members (Golub & Van Loan, 4th ed.,
        sec. 4.2.3 and 6.5.4).

        Parameters
        ----------
        counts : ndarray of shape (draws, n), int
        blocks : sequence of ndarray of int
            Together they hold every observation once.

        Yields
        ------
        draws : slice
        residual : ndarray of shape (draws in the block, members, n)
            Unweighted; nan where the rest of the draw does not determine the member.
        """
        n, largest = self.design.shape
        step = max(1, BLOCK_DOUBLES // (n * max(largest, 1) * 4))
        for start in range(0, counts.shape[0], step):
            part = slice(start, min(start + step, counts.shape[0]))
            yield part, self._resampled_block(counts[part], blocks)

    def _resampled_block(self, counts: np.ndarray, blocks: Sequence[np.ndarray]) -> np.ndarray:
        largest = min(max(self.sizes), self.design.shape[0])
        root = np.sqrt(counts)
        weighted = self._weighted[None, :, :largest] * root[:, :, None]
        target = self._weighted_target * root
        q, r = np.linalg.qr(weighted)
        z = np.einsum("dnp,dn->dp", q, target)
        # Rank already lost in the draw as a whole: q then holds arbitrary directions
        pivots = np.abs(np.diagonal(r, axis1=1, axis2=2))
        norms = np.maximum(np.linalg.norm(weighted, axis=1), np.finfo(float).tiny)
        sound = np.logical_and.accumulate(pivots > norms * 100 / LARGEST_CONDITION, axis=1)
        out = np.full((counts.shape[0], len(self.sizes), self.design.shape[0]), np.nan)
        for rows in blocks:
            held = _nested_held_out(q[:, rows], z, target[:, rows], sound)
            with np.errstate(divide="ignore", invalid="ignore"):
                held = held / (root[:, None, rows] * self.root_weights[rows])
            for member, size in enumerate(self.sizes):
                if size <= largest:
                    out[:, member, rows] = held[:, size - 1]
        return out


def _nested_held_out(block: np.ndarray, z: np.ndarray, target: np.ndarray, sound: np.ndarray) -> np.ndarray:
    """Weighted held-out residuals, shape (draws, largest, rows), by a Cholesky factor built column by column."""
    draws, rows, largest = block.shape
    normal = np.eye(largest) - block.transpose(0, 2, 1) @ block
    right = z - np.einsum("drp,dr->dp", block, target)
    factor = np.zeros_like(normal)
    t = np.zeros((draws, largest))
    v = np.zeros((draws, largest, rows))
    prediction = np.zeros((draws, largest, rows))
    fine = np.ones(draws, dtype=bool)
    for j in range(largest):
        row = factor[:, j, :j]
        pivot = normal[:, j, j] - np.einsum("dk,dk->d", row, row)
        fine = fine & sound[:, j] & (pivot > SMALLEST_RESAMPLED_PIVOT)
        root = np.sqrt(np.where(fine, pivot, 1.0))
        factor[:, j, j] = root
        below = normal[:, j + 1 :, j] - np.einsum("dik,dk->di", factor[:, j + 1 :, :j], row)
        factor[:, j + 1 :, j] = below / root[:, None]
        t[:, j] = (right[:, j] - np.einsum("dk,dk->d", row, t[:, :j])) / root
        v[:, j] = (block[:, :, j] - np.einsum("dk,dkr->dr", row, v[:, :j])) / root[:, None]
        prediction[:, j] = (prediction[:, j - 1] if j else 0.0) + v[:, j] * t[:, j, None]
        prediction[~fine, j] = np.nan
    return target[:, None, :] - prediction


def _nested_predictions(design: np.ndarray, r: np.ndarray, z: np.ndarray, norms: np.ndarray) -> np.ndarray:
    """Predictions of all nested members by forward substitution on ``M = X R^-1``; nan once the rank is lost."""
    draws, largest = z.shape
    scaled = np.empty((draws, largest, design.shape[0]))
    prediction = np.empty_like(scaled)
    sound = np.ones(draws, dtype=bool)
    for column in range(largest):
        pivot = r[:, column, column]
        sound &= np.abs(pivot) > np.maximum(norms[:, column], np.finfo(float).tiny) / LARGEST_CONDITION * 100
        rest = design[:, column] - np.einsum("dk,dkn->dn", r[:, :column, column], scaled[:, :column])
        with np.errstate(divide="ignore", invalid="ignore", over="ignore"):
            scaled[:, column] = np.where(sound[:, None], rest / np.where(sound, pivot, 1.0)[:, None], 0.0)
        previous = prediction[:, column - 1] if column else 0.0
        prediction[:, column] = previous + scaled[:, column] * z[:, column, None]
        prediction[~sound, column] = np.nan
    return prediction


def _leave_blocks_out(q: np.ndarray, weighted: np.ndarray, rows: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Held-out weighted residuals of blocks of equal length, and the smallest eigenvalue of each ``I - H_BB``."""
    block = q[rows]
    residual = weighted[rows]
    if rows.shape[1] <= q.shape[1]:
        matrix = np.eye(rows.shape[1]) - block @ block.transpose(0, 2, 1)
        smallest = np.linalg.eigvalsh(matrix)[:, 0]
        safe = np.where((smallest < SMALLEST_BLOCK_EIGENVALUE)[:, None, None], np.eye(rows.shape[1]), matrix)
        return np.linalg.solve(safe, residual[:, :, None])[:, :, 0], smallest
    # Woodbury: (I - B B^T)^-1 = I + B (I - B^T B)^-1 B^T, the smaller matrix when a block is longer than p.
    matrix = np.eye(q.shape[1]) - block.transpose(0, 2, 1) @ block
    smallest = np.linalg.eigvalsh(matrix)[:, 0]
    safe = np.where((smallest < SMALLEST_BLOCK_EIGENVALUE)[:, None, None], np.eye(q.shape[1]), matrix)
    inner = np.linalg.solve(safe, block.transpose(0, 2, 1) @ residual[:, :, None])
    return residual + (block @ inner)[:, :, 0], smallest


def _by_length(blocks: Sequence[np.ndarray]) -> list[list[int]]:
    groups: dict[int, list[int]] = {}
    for number, block in enumerate(blocks):
        if block.size:
            groups.setdefault(block.size, []).append(number)
    return list(groups.values())


def _condition(r: np.ndarray) -> float:
    if not np.all(np.isfinite(r)) or r.shape[0] < r.shape[1]:
        return np.inf
    values = np.linalg.svd(r, compute_uv=False)
    return float(values[0] / values[-1]) if values[-1] > 0 else np.inf


def _no_fit(n: int, size: int, message: str, condition: float = np.inf) -> LinearFit:
    nothing = np.full(n, np.nan)
    return LinearFit(
        np.full(size, np.nan), np.full((size, size), np.nan), nothing, nothing, nothing, np.nan, condition, message
    )
