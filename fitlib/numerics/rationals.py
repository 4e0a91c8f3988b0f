"""Polynomials with exact rational coefficients, lowest power first."""

from __future__ import annotations

from collections.abc import Sequence
from fractions import Fraction


def value_at(coefficients: Sequence[Fraction], x: Fraction) -> Fraction:
    """Value at x (Horner's scheme).

    Parameters
    ----------
    coefficients : sequence of Fraction
    x : Fraction

    Returns
    -------
    Fraction
    """
    total = Fraction(0)
    for value in reversed(coefficients):
        total = total * x + value
    return total


def product(a: Sequence[Fraction], b: Sequence[Fraction]) -> list[Fraction]:
    """Coefficients of the product.

    Parameters
    ----------
    a, b : sequence of Fraction

    Returns
    -------
    list of Fraction
    """
    terms = [Fraction(0)] * (len(a) + len(b) - 1)
    for i, left in enumerate(a):
        for j, right in enumerate(b):
            terms[i + j] += left * right
    return terms


def padded(a: Sequence[Fraction], length: int) -> list[Fraction]:
    """The same polynomial with zeros for the powers that it lacks.

    Parameters
    ----------
    a : sequence of Fraction
    length : int

    Returns
    -------
    list of Fraction
    """
    return list(a) + [Fraction(0)] * (length - len(a))


def total(a: Sequence[Fraction], b: Sequence[Fraction]) -> list[Fraction]:
    """Coefficients of the sum.

    Parameters
    ----------
    a, b : sequence of Fraction

    Returns
    -------
    list of Fraction
    """
    length = max(len(a), len(b))
    return [left + right for left, right in zip(padded(a, length), padded(b, length), strict=True)]
