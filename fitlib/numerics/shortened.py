"""Coefficients with fewer digits: checked against the issued function, or refused."""

from __future__ import annotations

from dataclasses import dataclass
from fractions import Fraction

import numpy as np

from fitlib.errors import FitlibError
from fitlib.numerics.families.protocol import Curve
from fitlib.numerics.rationals import value_at

#: Largest shift that shortening may cause, as a share of the standard uncertainty of a converted value.
LARGEST_SHARE = 1 / 20


@dataclass(frozen=True)
class ShortForm:
    """Coefficients in powers with fewer digits.

    Attributes
    ----------
    digits : int
        Significant digits of each coefficient.
    coefficients : tuple of str
        As they are to be printed.
    largest_share : float
        Largest shift over the interval, as a share of the standard uncertainty there.
    """

    digits: int
    coefficients: tuple[str, ...]
    largest_share: float


def shorten(curve: Curve, coefficients, digits: int, x: np.ndarray, uncertainty: np.ndarray) -> ShortForm:
    """Round the coefficients to some significant digits, if the curve allows it.

    Parameters
    ----------
    curve : Curve
        The issued function.
    coefficients : sequence of float
        In powers, full precision.
    digits : int
        1 to 17.
    x : ndarray of shape (n,)
        Points of the interval at which the shift is computed.
    uncertainty : ndarray of shape (n,)
        Standard uncertainty of a converted value there, in the unit of the fitted quantity.

    Returns
    -------
    ShortForm

    Raises
    ------
    FitlibError
        If a converted value would move by more than ``LARGEST_SHARE`` of its standard uncertainty.
    """
    form = _rounded(curve, coefficients, digits, x, uncertainty)
    if not form.largest_share <= LARGEST_SHARE:
        raise FitlibError(
            f"{digits} digits are too few: a converted value would move by {form.largest_share:.2g} of its standard "
            f"uncertainty; at most {LARGEST_SHARE:g} is allowed"
        )
    return form


def shortest(curve: Curve, coefficients, x: np.ndarray, uncertainty: np.ndarray) -> ShortForm | None:
    """The form with the fewest digits that ``shorten`` does not refuse.

    Parameters
    ----------
    curve : Curve
    coefficients : sequence of float
    x, uncertainty : ndarray of shape (n,)

    Returns
    -------
    ShortForm or None
        None when even 17 digits in powers move a value too far.
    """
    for digits in range(2, 18):
        form = _rounded(curve, coefficients, digits, x, uncertainty)
        if form.largest_share <= LARGEST_SHARE:
            return form
    return None


def _rounded(curve: Curve, coefficients, digits: int, x: np.ndarray, uncertainty: np.ndarray) -> ShortForm:
    words = tuple(f"{float(value):.{digits - 1}e}" for value in coefficients)
    numbers = [Fraction(word) for word in words]
    # Exact evaluation: rounding of the arithmetic must not be mistaken for rounding of the coefficients
    values = np.array([float(value_at(numbers, Fraction(float(point)))) for point in x])
    with np.errstate(divide="ignore", invalid="ignore"):
        share = np.abs(values - curve.evaluate(x)) / uncertainty
    return ShortForm(digits, words, float(np.max(np.where(np.isnan(share), np.inf, share))))
