"""Least squares for polynomials in exact arithmetic, from the decimal numbers as they were written.

A double that was read from decimal text is replaced by the shortest decimal that reads as the same double, that is by
what the user wrote; from there on everything is whole-number arithmetic until the result is rounded once. The normal
equations, hopeless in floating point, are exact here: ``N c = t`` with ``N[j, k] = sum w x^(j+k)``, solved by
fraction-free elimination (Bareiss, Math. Comp. 22 (1968) 565).
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from decimal import Decimal
from fractions import Fraction

from fitlib.numerics.rationals import padded, product, total, value_at

#: Beyond this number of parameters the numbers grow too long to be worth it; floating point then serves.
MOST_PARAMETERS = 16


@dataclass(frozen=True)
class ExactFit:
    """One polynomial fitted exactly.

    Attributes
    ----------
    coefficients : tuple of Fraction
        Of ``x^0``, ``x^1``, ….
    variance_factors : tuple of Fraction
        Variance of each coefficient divided by the variance at weight 1.
    residual_sum_of_squares : Fraction
        With weights that average 1.
    """

    coefficients: tuple[Fraction, ...]
    variance_factors: tuple[Fraction, ...]
    residual_sum_of_squares: Fraction


def as_written(values: Sequence[float]) -> list[Fraction]:
    """The decimal numbers that doubles stand for.

    Parameters
    ----------
    values : sequence of float

    Returns
    -------
    list of Fraction
    """
    return [Fraction(Decimal(repr(float(value)))) for value in values]


def square_root(value: Fraction) -> float:
    """Square root of an exact number, rounded once.

    Parameters
    ----------
    value : Fraction
        Not negative.

    Returns
    -------
    float
        inf beyond the range of doubles.
    """
    if value <= 0:
        return 0.0
    # 2^(2s) n/d with at least 128 bits before the root leaves 64 correct bits after it
    shift = max(0, (128 - value.numerator.bit_length() + value.denominator.bit_length() + 1) // 2)
    root = math.isqrt((value.numerator << 2 * shift) // value.denominator)
    try:
        return float(Fraction(root, 1 << shift))
    except OverflowError:
        return math.inf


def exact_fits(
    x: Sequence[Fraction],
    y: Sequence[Fraction],
    weights: Sequence[Fraction],
    orders: Sequence[int],
    fixed_points: Sequence[tuple[Fraction, Fraction]] = (),
) -> dict[int, ExactFit]:
    """Fit polynomials of several degrees to the same data.

    Parameters
    ----------
    x, y : sequence of Fraction
    weights : sequence of Fraction
        Their scale does not matter.
    orders : sequence of int
        Degrees.
    fixed_points : sequence of (Fraction, Fraction)
        Points through which every polynomial passes.

    Returns
    -------
    dict of int to ExactFit
        Without degrees that the data do not determine or that have too many parameters.
    """
    nodal, interpolant = _through(fixed_points)
    target = [b - value_at(interpolant, a) for a, b in zip(x, y, strict=True)]
    damped = [w * value_at(nodal, a) ** 2 for w, a in zip(weights, x, strict=True)] if fixed_points else list(weights)
    # sum w (t - nodal q)^2 = sum (w nodal^2) (t / nodal - q)^2, but without dividing by nodal
    cross = [w * value_at(nodal, a) for w, a in zip(weights, x, strict=True)] if fixed_points else list(weights)
    sizes = {order: order + 1 - len(fixed_points) for order in orders}
    wanted = {order: size for order, size in sizes.items() if 1 <= size <= min(MOST_PARAMETERS, len(x))}
    if not wanted:
        return {}
    moments = _Moments.of(x, target, damped, cross, weights, max(wanted.values()))
    mean_weight = sum(weights) / len(weights)
    fits = {}
    for order, size in wanted.items():
        solved = moments.solve(size)
        if solved is not None:
            free, inverse, rss = solved
            fits[order] = _expand(free, inverse, rss / mean_weight, mean_weight, nodal, interpolant)
    return fits


@dataclass(frozen=True)
class _Moments:
    """Sums of whole numbers; ``x`` is scaled by ``step``, the moments by their own denominators."""

    powers: list[Fraction]
    products: list[Fraction]
    square: Fraction
    step: int

    @classmethod
    def of(cls, x, target, damped, cross, weights, size: int) -> _Moments:
        step = math.lcm(*(value.denominator for value in x))
        whole = [int(value * step) for value in x]
        powers, _ = _sums(whole, damped, 2 * size - 1)
        products, _ = _sums(whole, [w * t for w, t in zip(cross, target, strict=True)], size)
        square = sum(w * t * t for w, t in zip(weights, target, strict=True))
        return cls(powers, products, Fraction(square), step)

    def solve(self, size: int):
        """Coefficients and inverse normal matrix in powers of x, residual sum of squares; None if singular."""
        rows = [
            [self.powers[j + k] for k in range(size)]
            + [self.products[j]]
            + [Fraction(int(j == k)) for k in range(size)]
            for j in range(size)
        ]
        solved = _eliminate(_whole_rows(rows), size)
        if solved is None:
            return None
        scaled = [row[0] for row in solved]
        rss = self.square - sum(a * b for a, b in zip(scaled, self.products, strict=False))
        scale = [Fraction(self.step) ** k for k in range(size)]
        inverse = [[row[1 + k] * scale[j] * scale[k] for k in range(size)] for j, row in enumerate(solved)]
        return [value * factor for value, factor in zip(scaled, scale, strict=True)], inverse, rss


def _sums(whole: list[int], factors: list[Fraction], count: int) -> tuple[list[Fraction], int]:
    """``sum factor * whole^k`` for k below ``count``, in whole numbers until the end."""
    denominator = math.lcm(*(Fraction(value).denominator for value in factors))
    terms = [int(value * denominator) for value in factors]
    sums = []
    for k in range(count):
        sums.append(Fraction(sum(terms), denominator))
        if k + 1 < count:
            terms = [term * value for term, value in zip(terms, whole, strict=True)]
    return sums, denominator


def _whole_rows(rows: list[list[Fraction]]) -> list[list[int]]:
    """Each equation multiplied by the smallest number that makes it whole."""
    whole = []
    for row in rows:
        factor = math.lcm(*(value.denominator for value in row))
        whole.append([int(value * factor) for value in row])
    return whole


def _eliminate(rows: list[list[int]], size: int) -> list[list[Fraction]] | None:
    """Right-hand sides of the solved system; fraction-free Gauss-Jordan elimination (Bareiss 1968)."""
    previous = 1
    for k in range(size):
        place = next((r for r in range(k, size) if rows[r][k]), None)
        if place is None:
            return None
        rows[k], rows[place] = rows[place], rows[k]
        pivot, pivot_row = rows[k][k], rows[k]
        for r in range(size):
            if r != k:
                factor = rows[r][k]
                rows[r] = [(pivot * a - factor * b) // previous for a, b in zip(rows[r], pivot_row, strict=True)]
        previous = pivot
    return [[Fraction(value, rows[r][r]) for value in rows[r][size:]] for r in range(size)]


def _expand(free, inverse, rss: Fraction, mean_weight: Fraction, nodal, interpolant) -> ExactFit:
    """From the free part to the whole polynomial, and from its normal matrix to variance factors at mean weight 1."""
    length = len(free) + len(nodal) - 1
    coefficients = padded(total(product(nodal, free), interpolant), length)
    # Row m of the map from free to whole coefficients holds nodal[m - j]
    rows = [[nodal[m - j] if 0 <= m - j < len(nodal) else 0 for j in range(len(free))] for m in range(length)]
    factors = [
        sum(a * inverse[j][k] * b for j, a in enumerate(row) if a for k, b in enumerate(row) if b) for row in rows
    ]
    return ExactFit(tuple(coefficients), tuple(Fraction(value) * mean_weight for value in factors), rss)


def _through(points) -> tuple[list[Fraction], list[Fraction]]:
    """Nodal polynomial of the fixed points, and the polynomial through them (Newton)."""
    nodal, interpolant = [Fraction(1)], [Fraction(0)]
    for a, b in points:
        factor = (b - value_at(interpolant, a)) / value_at(nodal, a)
        interpolant = total(interpolant, [factor * value for value in nodal])
        nodal = product(nodal, [-a, Fraction(1)])
    return nodal, interpolant
