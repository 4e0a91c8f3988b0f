"""Polynomials in a scaled Chebyshev basis, free or through fixed points.

The stimulus is mapped to ``u = (x - centre) / half_span`` in [-1, 1] over the observations; the basis is ``T_j(u)``
(Mason & Handscomb, Chebyshev Polynomials, 2003, sec. 1.2). Through fixed points ``(x_k, y_k)`` the function is
``L(u) + prod((u - u_k)) * sum(c_j T_j(u))``, where ``L`` interpolates the fixed points, so that it passes through them
whatever the coefficients are.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field

import numpy as np
from numpy.polynomial import chebyshev

from fitlib.numerics.exact import ExactFit, as_written, exact_fits
from fitlib.numerics.families.protocol import Member
from fitlib.numerics.least_squares import LinearProblem

NAME = "polynomial"


@dataclass(frozen=True)
class Scale:
    """The map from the stimulus to [-1, 1], and the points through which every member passes."""

    centre: float
    half_span: float
    fixed_points: tuple[tuple[float, float], ...] = ()
    interpolant: np.ndarray = field(init=False, repr=False, compare=False)
    nodal: np.ndarray = field(init=False, repr=False, compare=False)

    def __post_init__(self):
        nodes = self.scaled(np.array([point[0] for point in self.fixed_points]))
        values = np.array([point[1] for point in self.fixed_points])
        object.__setattr__(self, "interpolant", _interpolant(nodes, values))
        object.__setattr__(self, "nodal", chebyshev.chebfromroots(nodes) if nodes.size else np.ones(1))

    def scaled(self, x: np.ndarray) -> np.ndarray:
        """Map the stimulus to the scaled variable."""
        return (np.asarray(x, dtype=float) - self.centre) / self.half_span


@dataclass(frozen=True)
class PolynomialCurve:
    """One polynomial: scale and coefficients of its free part."""

    scale: Scale
    coefficients: np.ndarray

    def series(self) -> np.ndarray:
        """Chebyshev coefficients of the whole function, fixed points included."""
        free = chebyshev.chebmul(self.scale.nodal, self.coefficients)
        return chebyshev.chebadd(free, self.scale.interpolant)

    def evaluate(self, x: np.ndarray) -> np.ndarray:
        """Value at each x (Clenshaw's recurrence)."""
        u = self.scale.scaled(x)
        free = chebyshev.chebval(u, self.coefficients)
        if not self.scale.fixed_points:
            return free
        return chebyshev.chebval(u, self.scale.interpolant) + chebyshev.chebval(u, self.scale.nodal) * free

    def slope(self, x: np.ndarray) -> np.ndarray:
        """Derivative in x at each x."""
        return chebyshev.chebval(self.scale.scaled(x), chebyshev.chebder(self.series())) / self.scale.half_span

    def jacobian(self, x: np.ndarray) -> np.ndarray:
        """Derivatives in the coefficients, shape (n, p)."""
        return _design(self.scale, np.atleast_1d(x), len(self.coefficients))

    def turning_points(self, lower: float, upper: float) -> np.ndarray:
        """Points strictly inside the interval where the slope changes sign, ascending.

        The zeros of the slope are eigenvalues of the Chebyshev companion matrix (Mason & Handscomb 2003, sec. 2.4);
        each is kept only if the function rises on one side and falls on the other.
        """
        derivative = chebyshev.chebtrim(chebyshev.chebder(self.series()), tol=0)
        if len(derivative) < 2:
            return np.empty(0)
        bounds = self.scale.scaled(np.array([lower, upper]))
        roots = chebyshev.chebroots(derivative)
        real = np.sort(roots.real[np.abs(roots.imag) < 1e-6])
        inside = real[(real > bounds[0]) & (real < bounds[1])]
        points = self.scale.centre + self.scale.half_span * inside
        return _sign_changes(self.slope, points, lower, upper)

    def to_record(self) -> dict:
        """Numbers and words from which ``families.restore`` makes the same curve."""
        return {
            "basis": "chebyshev",
            "centre": float(self.scale.centre),
            "half_span": float(self.scale.half_span),
            "fixed_points": [[float(x), float(y)] for x, y in self.scale.fixed_points],
            "coefficients": [float(value) for value in self.coefficients],
        }


class Polynomials:
    """The polynomials of one ``families`` entry for one dataset, with two degrees more as probes of lack of fit.

    Parameters
    ----------
    x : ndarray of shape (n,)
        Stimulus of the observations used; must not be constant.
    orders : sequence of int
        Degrees declared.
    fixed_points : sequence of (float, float)
        Points through which every member passes.
    probes : bool
        Whether to add the probes.
    """

    def __init__(
        self,
        x: np.ndarray,
        orders: Sequence[int],
        fixed_points: Sequence[tuple[float, float]] = (),
        probes: bool = True,
    ):
        lower, upper = float(np.min(x)), float(np.max(x))
        points = tuple((float(a), float(b)) for a, b in fixed_points)
        self.scale = Scale(lower / 2 + upper / 2, upper / 2 - lower / 2, points)
        declared = sorted(set(orders))
        added = sorted({order + 2 for order in declared} - set(declared)) if probes else []
        members = [Member(order, parameter_count(order, len(points))) for order in declared]
        members += [Member(order, parameter_count(order, len(points)), probe=True) for order in added]
        self.members = tuple(members)

    def problem(self, x: np.ndarray, y: np.ndarray, root_weights: np.ndarray) -> LinearProblem:
        """Hand data to the linear solver."""
        largest = max(member.parameters for member in self.members)
        target = y - chebyshev.chebval(self.scale.scaled(x), self.scale.interpolant)
        sizes = [member.parameters for member in self.members]
        return LinearProblem(_design(self.scale, x, largest), target, root_weights, sizes)

    def curve(self, member: Member, coefficients: np.ndarray) -> PolynomialCurve:
        """The polynomial of one member with given coefficients."""
        return PolynomialCurve(self.scale, np.asarray(coefficients, dtype=float))

    def exact(self, x, y, weights) -> dict[int, ExactFit]:
        """The declared polynomials fitted exactly to numbers as written; keys are degrees."""
        points = [(as_written([a])[0], as_written([b])[0]) for a, b in self.scale.fixed_points]
        orders = [member.order for member in self.members if not member.probe]
        return exact_fits(x, y, weights, orders, points)

    def two_orders_higher(self, member: Member) -> Member | None:
        """The polynomial two degrees higher."""
        return next((other for other in self.members if other.order == member.order + 2), None)


def parameter_count(degree: int, fixed_points: int) -> int:
    """Free coefficients of a polynomial through some fixed points.

    Parameters
    ----------
    degree : int
    fixed_points : int

    Returns
    -------
    int
    """
    return degree + 1 - fixed_points


def restore(record: dict) -> PolynomialCurve:
    """Make the curve that ``PolynomialCurve.to_record`` described.

    Parameters
    ----------
    record : dict
        Keys ``centre``, ``half_span``, ``fixed_points``, ``coefficients``.

    Returns
    -------
    PolynomialCurve
    """
    points = tuple((float(x), float(y)) for x, y in record["fixed_points"])
    scale = Scale(float(record["centre"]), float(record["half_span"]), points)
    return PolynomialCurve(scale, np.array(record["coefficients"], dtype=float))


def _design(scale: Scale, x: np.ndarray, columns: int) -> np.ndarray:
    u = scale.scaled(x)
    basis = chebyshev.chebvander(u, columns - 1)
    return basis * chebyshev.chebval(u, scale.nodal)[:, None] if scale.fixed_points else basis


def _interpolant(nodes: np.ndarray, values: np.ndarray) -> np.ndarray:
    """Chebyshev coefficients of the polynomial through the fixed points (Newton's divided differences)."""
    if not nodes.size:
        return np.zeros(1)
    table = values.astype(float)
    series = np.zeros(1)
    product = np.ones(1)
    for k in range(nodes.size):
        series = chebyshev.chebadd(series, table[0] * product)
        product = chebyshev.chebmul(product, chebyshev.chebfromroots([nodes[k]]))
        span = nodes[k + 1 :] - nodes[: nodes.size - k - 1]
        table = np.diff(table) / span
    return series


def _sign_changes(slope, points: np.ndarray, lower: float, upper: float) -> np.ndarray:
    """Keep the zeros of the slope between whose neighbours the slope has opposite signs."""
    if not points.size:
        return points
    edges = np.concatenate([[lower], points, [upper]])
    signs = np.sign(slope((edges[:-1] + edges[1:]) / 2))
    return points[signs[:-1] * signs[1:] < 0]
