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

from fitlib.numerics.nested import solve_nested

#: A design with a larger condition number in the scaled basis is treated as rank deficient.
LARGEST_CONDITION = 1e12
#: Problems with a smaller relative pivot are refitted by QR: normal equations lose digits there.
SMALLEST_PIVOT = 1e-2
#: The same for draws of a bootstrap, of which only means are used.
SMALLEST_DRAW_PIVOT = 1e-4
#: Below this pivot a left-out block of a resample is taken to leave the member undetermined.
SMALLEST_RESAMPLED_PIVOT = 1e-6
#: Products of basis functions kept for all draws together; beyond it each draw forms its own.
PRODUCTS_AT_ONCE = 1_000_000
#: Doubles held at once by batched problems; results do not depend on it.
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
        self._largest = self._largest_sound()
        self._rests = self._residuals_of_all_sizes()

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

    def residuals(self) -> np.ndarray:
        """Residuals of all members on the fitted points, shape (members, n), unweighted; nan without a fit."""
        out = np.full((len(self.sizes), self.design.shape[0]), np.nan)
        for number, size in enumerate(self.sizes):
            if size <= self._largest:
                out[number] = self._rests[size - 1] / self.root_weights
        return out

    def _residuals_of_all_sizes(self) -> np.ndarray:
        """Weighted residuals (largest, n) of the members with 1, 2, … parameters, from the largest downwards."""
        q, z = self._q[:, : self._largest], self._z[: self._largest]
        rests = np.empty((self._largest, q.shape[0]))
        rest = self._weighted_target - q @ z
        rest = rest - q @ (q.T @ rest)  # twice is enough (Björck 1996, sec. 2.4.5)
        for size in range(self._largest, 0, -1):
            rests[size - 1] = rest
            rest = rest + q[:, size - 1] * z[size - 1]
        return rests

    def held_out(self, blocks: Sequence[np.ndarray], limits: np.ndarray | None = None) -> list[np.ndarray]:
        """Residuals of each block of observations when the block is left out of the fit.

        In closed form from the one factorisation: in the basis ``Q`` the normal matrix without block B is
        ``I - Q_B^T Q_B`` and the right-hand side ``Q^T y - Q_B^T y_B`` (the block form of Cook & Weisberg, Residuals
        and Influence in Regression, 1982, eq. A.2.1). Blocks near the limit of rank are refitted by QR.

        Parameters
        ----------
        blocks : sequence of ndarray of int
            Row numbers of each block; blocks may overlap.
        limits : ndarray of shape (blocks,), int, or None
            Largest member that each block can leave determined, where the caller knows it.

        Returns
        -------
        list of ndarray of shape (members, rows of the block)
            Unweighted residuals; nan for a member that is not determined without the block.
        """
        out = [np.full((len(self.sizes), block.size), np.nan) for block in blocks]
        for numbers, _, values in self.held_out_batches(blocks, limits):
            for number, value in zip(numbers, values, strict=True):
                out[number] = value
        return out

    def held_out_batches(
        self, blocks: Sequence[np.ndarray], limits: np.ndarray | None = None
    ) -> Iterator[tuple[np.ndarray, np.ndarray, np.ndarray]]:
        """The same in batches of blocks of equal length, for many blocks.

        Parameters
        ----------
        blocks : sequence of ndarray of int
        limits : ndarray of shape (blocks,), int, or None

        Yields
        ------
        numbers : ndarray of int
            Which blocks.
        rows : ndarray of shape (numbers, length), int
        residual : ndarray of shape (numbers, members, length)
        """
        limits = np.full(len(blocks), self._largest) if limits is None else np.minimum(limits, self._largest)
        for numbers in _in_batches(blocks, self._largest):
            rows = np.stack([blocks[number] for number in numbers])
            if self._largest == 0:
                yield numbers, rows, np.full((rows.shape[0], len(self.sizes), rows.shape[1]), np.nan)
            else:
                yield numbers, rows, self._without(rows, limits[numbers])

    def _largest_sound(self) -> int:
        """Largest member that all observations together determine; a part of a sound design is sound."""
        sizes = sorted({size for size in self.sizes if size <= self._rows}, reverse=True)
        return next((size for size in sizes if self._sound(size)), 0)

    def _sound(self, size: int) -> bool:
        return _condition(self._r[:size, :size]) < LARGEST_CONDITION

    def _without(self, rows: np.ndarray, limits: np.ndarray) -> np.ndarray:
        """Residuals (blocks, members, rows) of blocks of equal length."""
        sizes = np.array(self.sizes)
        place = np.minimum(sizes, self._largest) - 1
        block = self._q[rows][:, :, : self._largest]
        normal = np.eye(self._largest)[:, :, None] - np.einsum("bri,brj->ijb", block, block)
        right = -np.einsum("brj,br->jb", block, self._rests[-1][rows])
        solved = solve_nested(normal, right, self._z[: self._largest], np.ones((self._largest, 1)))
        change = np.einsum("brm,pmb->bpr", block, solved.changes[place])
        held = (self._rests[place][:, rows].transpose(1, 0, 2) - change) / self.root_weights[rows][:, None, :]
        within = sizes[:, None] <= limits[None, :]
        held[~within.T] = np.nan
        weak = within & (solved.smallest_pivot[place] < SMALLEST_PIVOT)
        for number in np.flatnonzero(weak.any(axis=0)):
            self._refit_weak(held[number], rows[number], weak[:, number])
        return held

    def _refit_weak(self, out: np.ndarray, block: np.ndarray, weak: np.ndarray) -> None:
        keep = np.ones(self.design.shape[0], dtype=bool)
        keep[block] = False
        sizes = [size for size, bad in zip(self.sizes, weak, strict=True) if bad]
        if not keep.any():
            out[weak] = np.nan
            return
        part = LinearProblem(self.design[keep][:, : max(sizes)], self.target[keep], self.root_weights[keep], sizes)
        for number, fit in zip(np.flatnonzero(weak), part.fit(), strict=True):
            size = self.sizes[number]
            out[number] = self.target[block] - self.design[block, :size] @ fit.coefficients

    def refit(self, counts: np.ndarray, limits: np.ndarray | None = None) -> np.ndarray:
        """Residuals of all observations for fits to resamples.

        Parameters
        ----------
        counts : ndarray of shape (draws, n), int
            How often each observation is in each draw.
        limits : ndarray of shape (draws,), int, or None
            Largest member that each draw can determine, where the caller knows it.

        Returns
        -------
        ndarray of shape (members, n, draws)
            Unweighted residuals of every observation, drawn or not; nan where the draw does not determine the member.
        """
        residual, determined = self.refit_finite(counts, limits)
        residual.transpose(0, 2, 1)[~determined] = np.nan
        return residual

    def refit_finite(self, counts: np.ndarray, limits: np.ndarray | None = None) -> tuple[np.ndarray, np.ndarray]:
        """The same without nan, for sums over many draws.

        Parameters
        ----------
        counts : ndarray of shape (draws, n), int
        limits : ndarray of shape (draws,), int, or None

        Returns
        -------
        residual : ndarray of shape (members, n, draws)
            Finite, and meaningless where the member is not determined.
        determined : ndarray of shape (members, draws), bool
        """
        sizes, draws = np.array(self.sizes), counts.shape[0]
        if self._largest == 0:
            return np.zeros((sizes.size, self.design.shape[0], draws)), np.zeros((sizes.size, draws), dtype=bool)
        limits = np.full(draws, self._largest) if limits is None else np.minimum(limits, self._largest)
        place = np.minimum(sizes, self._largest) - 1
        normal, right = self._normal_of(counts)
        solved = solve_nested(normal, right, self._z[: self._largest], normal[np.diag_indices(self._largest)])
        residual = self._q[:, : self._largest] @ solved.changes[place]
        np.subtract(self._rests[place][:, :, None], residual, out=residual)
        residual /= self.root_weights[:, None]
        determined = sizes[:, None] <= limits[None, :]
        weak = determined & (solved.smallest_pivot[place] < SMALLEST_DRAW_PIVOT)
        again = np.flatnonzero(weak.any(axis=0))
        if again.size:
            better = self._refit_by_qr(counts[again])
            lost = np.isnan(better[:, 0])
            better[np.broadcast_to(lost[:, None], better.shape)] = 0.0
            for member in range(sizes.size):
                which = weak[member, again]
                residual[member][:, again[which]] = better[member][:, which]
            determined[:, again] &= ~(lost & weak[:, again])
        return residual, determined

    def _normal_of(self, counts: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
        """Normal matrices (P, P, draws) and right-hand sides (P, draws) of draws, in the basis of all observations."""
        return self._weigh(np.arange(self.design.shape[0]), counts)

    def _weigh(self, rows: np.ndarray, counts: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
        q = self._q[rows, : self._largest]
        weights = counts.T.astype(float)
        right = (q * self._rests[-1][rows, None]).T @ weights
        if q.size * self._largest > PRODUCTS_AT_ONCE:
            return np.stack([q.T @ (q * column[:, None]) for column in weights.T], axis=2), right
        products = (q[:, :, None] * q[:, None, :]).reshape(rows.size, -1)
        return (products.T @ weights).reshape(self._largest, self._largest, counts.shape[0]), right

    def resampled_held_out(self, counts: np.ndarray, blocks: Sequence[np.ndarray]) -> np.ndarray:
        """Held-out residuals of each block within each resample, for repeating a whole selection on resamples.

        Parameters
        ----------
        counts : ndarray of shape (draws, n), int
        blocks : sequence of ndarray of int
            Together they hold every observation once.

        Returns
        -------
        ndarray of shape (members, n, draws)
            Unweighted; nan where the rest of the draw does not determine the member.
        """
        sizes = np.array(self.sizes)
        out = np.full((sizes.size, self.design.shape[0], counts.shape[0]), np.nan)
        if self._largest == 0:
            return out
        place = np.minimum(sizes, self._largest) - 1
        normal, right = self._normal_of(counts)
        whole = normal[np.diag_indices(self._largest)]
        for rows in blocks:
            part, part_right = self._weigh(rows, counts[:, rows])
            solved = solve_nested(normal - part, right - part_right, self._z[: self._largest], whole)
            held = self._rests[place][:, rows, None] - self._q[rows, : self._largest] @ solved.changes[place]
            weak = (solved.smallest_pivot[place] < SMALLEST_RESAMPLED_PIVOT) | (sizes > self._largest)[:, None]
            held.transpose(0, 2, 1)[weak] = np.nan
            out[:, rows] = held / self.root_weights[rows, None]
        return out

    def _refit_by_qr(self, counts: np.ndarray) -> np.ndarray:
        largest = self._largest
        root = np.sqrt(counts)
        weighted = self._weighted[None, :, :largest] * root[:, :, None]
        q, r = np.linalg.qr(weighted)
        z = np.einsum("dnp,dn->dp", q, self._weighted_target * root)
        prediction = _nested_predictions(self.design[:, :largest], r, z, np.linalg.norm(weighted, axis=1))
        sizes = np.minimum(np.array(self.sizes), largest)
        out = self.target[None, :, None] - prediction[:, sizes - 1].transpose(1, 2, 0)
        out[np.array(self.sizes) > largest] = np.nan
        return out


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


def _in_batches(blocks: Sequence[np.ndarray], largest: int) -> Iterator[np.ndarray]:
    """Numbers of blocks of equal length, few enough at a time to bound the memory."""
    lengths = np.array([block.size for block in blocks], dtype=int)
    for length in np.unique(lengths[lengths > 0]):
        numbers = np.flatnonzero(lengths == length)
        step = max(1, BLOCK_DOUBLES // (4 * max(largest, 1) * (max(largest, 1) + int(length))))
        for start in range(0, numbers.size, step):
            yield numbers[start : start + step]


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
