"""From the fitted quantity's unit to the unit of the quantity that the user evaluates."""

from __future__ import annotations

import numpy as np


def needs_inversion(dataset) -> bool:
    """Whether evaluating means inverting the fitted function.

    Parameters
    ----------
    dataset : fitlib.study.DatasetSettings

    Returns
    -------
    bool
    """
    return (dataset.function == "calibration") == (dataset.evaluation == "inverse")


def in_evaluated_unit(curve, dataset, x: np.ndarray, deviation: np.ndarray) -> np.ndarray:
    """Convert deviations of the fitted quantity to the evaluated quantity, to first order.

    Parameters
    ----------
    curve : Curve
    dataset : fitlib.study.DatasetSettings
    x : ndarray of shape (n,)
    deviation : ndarray of shape (n,)
        In the fitted quantity's unit.

    Returns
    -------
    ndarray of shape (n,)
        Divided by the slope where evaluating inverts the function (inf where the slope is 0), else unchanged.
    """
    if not needs_inversion(dataset):
        return np.asarray(deviation, dtype=float)
    with np.errstate(divide="ignore", invalid="ignore"):
        return np.asarray(deviation, dtype=float) / np.abs(curve.slope(x))
