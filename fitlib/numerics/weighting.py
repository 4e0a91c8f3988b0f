"""Relative weights that follow from the stimulus alone."""

from __future__ import annotations

from collections.abc import Sequence
from fractions import Fraction

import numpy as np

#: Power of the stimulus to which the standard deviation of the response is taken to be proportional.
SPREAD_POWER = {"none": 0.0, "inverse_stimulus": 0.5, "inverse_stimulus_squared": 1.0}


def spread(weighting: str, stimulus: np.ndarray) -> np.ndarray:
    """Relative standard deviation of a response at each stimulus.

    Parameters
    ----------
    weighting : str
        A key of ``SPREAD_POWER``.
    stimulus : ndarray
        Positive, unless the weighting is ``none``.

    Returns
    -------
    ndarray
        Of the shape of ``stimulus``; 1 for ``none``.
    """
    power = SPREAD_POWER[weighting]
    return np.ones_like(stimulus, dtype=float) if power == 0 else np.asarray(stimulus, dtype=float) ** power


def exact_weights(weighting: str, stimulus: Sequence[Fraction]) -> list[Fraction]:
    """Weights without rounding, on an arbitrary scale.

    Parameters
    ----------
    weighting : str
        A key of ``SPREAD_POWER``.
    stimulus : sequence of Fraction

    Returns
    -------
    list of Fraction
    """
    power = int(2 * SPREAD_POWER[weighting])
    return [Fraction(1)] * len(stimulus) if power == 0 else [1 / value**power for value in stimulus]


def root_weights(weighting: str, stimulus: np.ndarray) -> np.ndarray:
    """Square roots of the weights, scaled so that the weights average 1.

    Relative weights carry no absolute information, so that the scale is free; with a mean of 1 the residual standard
    deviation stays in the unit of the fitted quantity.

    Parameters
    ----------
    weighting : str
        A key of ``SPREAD_POWER``.
    stimulus : ndarray of shape (n,)

    Returns
    -------
    ndarray of shape (n,)
    """
    root = 1 / spread(weighting, stimulus)
    return root / np.sqrt(np.mean(root**2))
