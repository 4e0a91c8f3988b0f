"""What a selection rule may look at: for one set of observations, or for many resamples at once."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np


@dataclass(frozen=True)
class Evidence:
    """What a rule may look at, for all members side by side.

    Attributes
    ----------
    parameters : ndarray of shape (m,), int
    level_losses : ndarray of shape (m, L)
        Of the deciding scheme; nan where it failed.
    level_weights : ndarray of shape (L,)
    level_squares : ndarray of shape (m,)
        Weighted sum of squares of the level means about each fit.
    floor : float
        Losses below it count as equal.
    """

    parameters: np.ndarray
    level_losses: np.ndarray
    level_weights: np.ndarray
    level_squares: np.ndarray
    floor: float = 0.0


@dataclass(frozen=True)
class ManyEvidence:
    """Evidence of many resamples.

    Attributes
    ----------
    parameters : ndarray of shape (m,), int
    level_losses : ndarray of shape (m, L, draws)
        nan where a draw does not judge a candidate, anything finite at a level that was not drawn.
    level_weights : ndarray of shape (L, draws)
        0 for a level that was not drawn.
    level_squares : ndarray of shape (m, draws)
    floor : float
    """

    parameters: np.ndarray
    level_losses: np.ndarray
    level_weights: np.ndarray
    level_squares: np.ndarray
    floor: float = 0.0
