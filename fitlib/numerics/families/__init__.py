"""Families of candidate functions, and the register that names them.

A new family is one file with ``NAME``, a class that keeps ``protocol.Family``, ``parameter_count``,
``restore``, and its line in each of the registers below.
"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from fitlib.numerics.families import polynomial
from fitlib.numerics.families.protocol import Curve, Family, Member

__all__ = ["Curve", "Family", "Member", "make_family", "parameter_count", "restore"]

_MAKERS = {polynomial.NAME: polynomial.Polynomials}
_COUNTERS = {polynomial.NAME: polynomial.parameter_count}
_RESTORERS = {"chebyshev": polynomial.restore}


def make_family(name: str, x: np.ndarray, orders: Sequence[int], fixed_points: Sequence[tuple[float, float]]) -> Family:
    """Make the members of one ``families`` entry ready for one dataset.

    Parameters
    ----------
    name : str
        Name of the family.
    x : ndarray of shape (n,)
        Values of the independent variable that are used.
    orders : sequence of int
        Orders declared (degrees of a polynomial).
    fixed_points : sequence of (float, float)
        Points through which every member passes.

    Returns
    -------
    Family
    """
    return _MAKERS[name](x, orders, fixed_points)


def parameter_count(name: str, order: int, fixed_points: Sequence[tuple[float, float]]) -> int:
    """Free parameters of one candidate.

    Parameters
    ----------
    name : str
    order : int
    fixed_points : sequence of (float, float)

    Returns
    -------
    int
    """
    return _COUNTERS[name](order, len(fixed_points))


def restore(record: dict) -> Curve:
    """Make a curve from its record, as stored in ``functions/*.json`` under ``scaled``.

    Parameters
    ----------
    record : dict
        What ``Curve.to_record`` returned.

    Returns
    -------
    Curve

    Raises
    ------
    KeyError
        If the basis is not known or a key is missing.
    """
    return _RESTORERS[record["basis"]](record)
