"""Coefficients in powers of the stimulus, from the scaled Chebyshev basis, in exact arithmetic and rounded once.

Doubles are whole numbers times powers of two, so that the change of basis can be carried out in rational numbers
without any rounding; only the published coefficient is rounded.
"""

from __future__ import annotations

from dataclasses import dataclass
from fractions import Fraction

import numpy as np

from fitlib.numerics.exact import ExactFit, square_root
from fitlib.numerics.families.polynomial import PolynomialCurve, Scale
from fitlib.numerics.rationals import padded, product, total, value_at


@dataclass(frozen=True)
class PowerForm:
    """A polynomial in powers of the stimulus.

    Attributes
    ----------
    coefficients : ndarray of shape (degree + 1,)
        Of ``x^0``, ``x^1``, …; correctly rounded.
    standard_uncertainties : ndarray of shape (degree + 1,)
    largest_shift : float
        Largest difference over the interval between the issued function and these rounded coefficients, both in
        exact arithmetic, in the unit of the fitted quantity.
    """

    coefficients: np.ndarray
    standard_uncertainties: np.ndarray
    largest_shift: float


def power_form(
    curve: PolynomialCurve,
    covariance: np.ndarray,
    lower: float,
    upper: float,
    exact_fit: ExactFit | None = None,
    plain_variance: Fraction | None = None,
) -> PowerForm:
    """Coefficients in powers of the stimulus with their standard uncertainties.

    Parameters
    ----------
    curve : PolynomialCurve
    covariance : ndarray of shape (p, p)
        Of the scaled coefficients.
    lower, upper : float
        Interval over which the shift caused by rounding is computed.
    exact_fit : ExactFit or None
        The same fit in exact arithmetic; its coefficients are then published, rounded once, and the shift is that
        between them and the issued function.
    plain_variance : Fraction or None
        Variance at weight 1, where the covariance is that and nothing else; the uncertainties are then exact, too.

    Returns
    -------
    PowerForm
    """
    columns, constant = _columns(curve.scale, len(curve.coefficients))
    issued = _combine(columns, constant, [Fraction(float(value)) for value in curve.coefficients])
    rounded = [_to_double(value) for value in (exact_fit.coefficients if exact_fit else issued)]
    transform = np.array([[_to_double(value) for value in column] for column in columns]).T
    # The law of propagation of uncertainty (JCGM 100:2008, eq. 13) for a linear change of basis. The square root of
    # the covariance is transformed, not the covariance, so that cancellation costs half as many digits.
    with np.errstate(over="ignore", invalid="ignore"):  # powers of an extreme unit may leave the range of doubles
        uncertainties = np.sqrt(np.sum((transform @ _root(covariance)) ** 2, axis=1))
    return PowerForm(
        coefficients=np.array(rounded),
        standard_uncertainties=_exact_roots(exact_fit, plain_variance, uncertainties),
        largest_shift=_largest_shift(issued, rounded, lower, upper),
    )


def _exact_roots(exact_fit: ExactFit | None, variance: Fraction | None, otherwise: np.ndarray) -> np.ndarray:
    if exact_fit is None or variance is None:
        return otherwise
    return np.array([square_root(factor * variance) for factor in exact_fit.variance_factors])


def _columns(scale: Scale, count: int) -> tuple[list[list[Fraction]], list[Fraction]]:
    """Exact power coefficients of each basis function, and of the part that carries no coefficient."""
    centre, half = Fraction(scale.centre), Fraction(scale.half_span)
    u = [-centre / half, 1 / half]
    basis = [[Fraction(1)], u]
    while len(basis) < max(count, len(scale.nodal), len(scale.interpolant)):
        basis.append(total(product([2 * u[0], 2 * u[1]], basis[-1]), [-term for term in basis[-2]]))
    nodal = _series(basis, scale.nodal)
    constant = _series(basis, scale.interpolant)
    length = count + len(scale.nodal) - 1
    columns = [padded(product(nodal, basis[j]), length) for j in range(count)]
    return columns, padded(constant, length)


def _series(basis: list[list[Fraction]], coefficients: np.ndarray) -> list[Fraction]:
    terms = [Fraction(0)]
    for function, value in zip(basis, coefficients, strict=False):
        terms = total(terms, [Fraction(float(value)) * term for term in function])
    return terms


def _combine(columns, constant, coefficients) -> list[Fraction]:
    rows = zip(constant, *columns, strict=True)
    return [row[0] + sum(a * b for a, b in zip(row[1:], coefficients, strict=True)) for row in rows]


def _to_double(value: Fraction) -> float:
    try:
        return float(value)  # Python rounds a ratio of whole numbers to nearest even
    except OverflowError:
        return float("inf") if value > 0 else float("-inf")


def _root(covariance: np.ndarray) -> np.ndarray:
    values, vectors = np.linalg.eigh(covariance)
    return vectors * np.sqrt(np.clip(values, 0, None))


def _largest_shift(exact: list[Fraction], rounded: list[float], lower: float, upper: float) -> float:
    if not all(np.isfinite(rounded)):
        return float("inf")
    change = [a - Fraction(b) for a, b in zip(exact, rounded, strict=True)]
    points = [Fraction(lower) + (Fraction(upper) - Fraction(lower)) * k / 64 for k in range(65)]
    return _to_double(max(abs(value_at(change, point)) for point in points))
