"""What a family of candidate functions has to offer; the rest of fitlib asks for nothing else."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from typing import Protocol

import numpy as np


@dataclass(frozen=True)
class Member:
    """One function of a family.

    Attributes
    ----------
    order : int
        What the family counts its members by (the degree of a polynomial).
    parameters : int
        Number of free coefficients.
    probe : bool
        True for a member that is fitted only to judge lack of fit, and can never be chosen.
    """

    order: int
    parameters: int
    probe: bool = False


class Curve(Protocol):
    """One member with its coefficients: the function that is issued."""

    def evaluate(self, x: np.ndarray) -> np.ndarray:
        """Value at each x."""

    def slope(self, x: np.ndarray) -> np.ndarray:
        """Derivative in x at each x."""

    def jacobian(self, x: np.ndarray) -> np.ndarray:
        """Derivatives in the coefficients, shape (n, p)."""

    def turning_points(self, lower: float, upper: float) -> np.ndarray:
        """Points strictly inside the interval where the slope changes sign, ascending."""

    def to_record(self) -> dict:
        """Numbers and words from which ``families.restore`` makes the same curve."""


class Problem(Protocol):
    """A solver with the data of one dataset, for all members of a family at once."""

    def fit(self) -> Sequence:
        """One fit for each member."""

    def residuals(self) -> np.ndarray:
        """Residuals (members, n) on the fitted points; nan without a fit."""

    def held_out(self, blocks: Sequence[np.ndarray], limits: np.ndarray | None = None) -> list[np.ndarray]:
        """Residuals (members, rows) of each block when it is left out; nan where a member is not determined."""

    def held_out_batches(self, blocks: Sequence[np.ndarray], limits: np.ndarray | None = None) -> Iterator:
        """The same in batches of equal length: numbers, rows, residuals (blocks, members, rows)."""

    def refit(self, counts: np.ndarray, limits: np.ndarray | None = None) -> np.ndarray:
        """Residuals (members, n, draws) of all observations for fits to resamples."""

    def refit_finite(self, counts: np.ndarray, limits: np.ndarray | None = None) -> tuple[np.ndarray, np.ndarray]:
        """The same without nan, and which members (members, draws) are determined."""

    def resampled_held_out(self, counts: np.ndarray, blocks: Sequence[np.ndarray]) -> np.ndarray:
        """Residuals (members, n, draws) of blocks left out of each resample."""


class Family(Protocol):
    """The members of one ``families`` entry, made ready for one dataset."""

    members: tuple[Member, ...]

    def problem(self, x: np.ndarray, y: np.ndarray, root_weights: np.ndarray) -> Problem:
        """Hand data to the family's solver."""

    def curve(self, member: Member, coefficients: np.ndarray) -> Curve:
        """The function of one member with given coefficients."""

    def exact(self, x, y, weights) -> dict:
        """Exact fits by order, where the family has them; else an empty dict."""

    def two_orders_higher(self, member: Member) -> Member | None:
        """The member against which lack of fit of ``member`` is judged."""
