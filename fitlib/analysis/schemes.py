"""The validation schemes: from a declared scheme and a dataset to held-out errors."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from fitlib.analysis.candidates import CandidateSet
from fitlib.analysis.dataset import DatasetArrays
from fitlib.analysis.streams import draw_counts, permutations
from fitlib.numerics.bootstrap import unit_losses
from fitlib.numerics.validation import Fold, Loss, shuffled_folds, summarise, unit_folds

#: A scheme with fewer folds cannot decide (rule of this project; a standard error from fewer units is a guess).
FEWEST_FOLDS_TO_DECIDE = 5


@dataclass(frozen=True)
class SchemeOutcome:
    """Losses of all entries under one scheme.

    Attributes
    ----------
    message : str
        Empty, or why the scheme was not evaluated.
    loss : Loss or None
    folds : list of (label, observations, losses of the entries, draws or None)
    failed : ndarray of shape (entries,), int
        Failed folds.
    rank_deficient : ndarray of shape (entries,), int or None
    """

    message: str
    loss: Loss | None = None
    folds: tuple = ()
    failed: np.ndarray | None = None
    rank_deficient: np.ndarray | None = None


@dataclass(frozen=True)
class Units:
    """What a scheme leaves out or draws: levels, series or observations."""

    index: np.ndarray
    labels: tuple[str, ...]


def evaluate_scheme(candidates: CandidateSet, scheme, seed: int | None, names: tuple) -> SchemeOutcome:
    """Evaluate one scheme on one dataset.

    Parameters
    ----------
    candidates : CandidateSet
    scheme : fitlib.study.SchemeSettings
    seed : int or None
    names : tuple
        Names of the random streams: dataset, scheme and, in an outer fold, that fold.

    Returns
    -------
    SchemeOutcome
        With a message instead of losses where the scheme does not apply.
    """
    units = make_units(candidates.data, UNIT_OF[scheme.scheme](scheme))
    message = _does_not_apply(scheme, units)
    if message:
        return SchemeOutcome(message)
    if scheme.scheme == "bootstrap":
        return _bootstrap(candidates, scheme, units, seed, names)
    folds = _folds(scheme, units, seed, names)
    errors = candidates.errors(folds)
    data = candidates.data
    loss = summarise(errors.squared, data.root_weights, data.level_index, data.levels.size)
    rows = tuple(
        (fold.label, int(fold.rows.size), errors.fold_loss[:, number], None) for number, fold in enumerate(folds)
    )
    return SchemeOutcome("", loss, rows, errors.failed.sum(axis=1))


def make_units(data: DatasetArrays, unit: str) -> Units:
    """Units of a dataset, in the tool's own order.

    Parameters
    ----------
    data : DatasetArrays
    unit : {"level", "series", "observation"}

    Returns
    -------
    Units
    """
    if unit == "level":
        return Units(data.level_index, tuple(f"level {value!r}" for value in data.levels.tolist()))
    if unit == "series":
        return Units(data.series_index, tuple(f"series {name}" for name in data.series))
    return Units(np.arange(data.rows.size), tuple(f"observation {row + 1}" for row in data.rows.tolist()))


#: Which unit a scheme leaves out; a new scheme is a line here and, if its folds are new, one in ``_folds``.
UNIT_OF: dict[str, Callable] = {
    "leave_one_out": lambda scheme: "observation",
    "leave_one_level_out": lambda scheme: "level",
    "leave_one_series_out": lambda scheme: "series",
    "k_fold": lambda scheme: scheme.unit,
    "bootstrap": lambda scheme: scheme.unit,
}


def is_row_wise(scheme) -> bool:
    """Whether a scheme separates observations of one level."""
    return UNIT_OF[scheme.scheme](scheme) == "observation"


def level_losses(candidates: CandidateSet) -> np.ndarray:
    """Leave-one-level-out losses per level of all entries, shape (entries, L).

    Parameters
    ----------
    candidates : CandidateSet

    Returns
    -------
    ndarray of shape (entries, L)
    """
    data = candidates.data
    units = make_units(data, "level")
    errors = candidates.errors(unit_folds(units.index, units.labels))
    return summarise(errors.squared, data.root_weights, data.level_index, data.levels.size).levels


def _does_not_apply(scheme, units: Units) -> str:
    unit, count = UNIT_OF[scheme.scheme](scheme), len(units.labels)
    number = "one" if count == 1 else str(count)
    if count < 2:
        return f"needs at least two {_plural(unit)}; there is {number}"
    if scheme.scheme == "k_fold" and scheme.folds > count:
        return f"{scheme.folds} folds need at least {scheme.folds} {_plural(unit)}; there are {number}"
    return ""


def _plural(unit: str) -> str:
    return unit if unit == "series" else f"{unit}s"


def _folds(scheme, units: Units, seed: int | None, names: tuple) -> list[Fold]:
    if scheme.scheme == "k_fold":
        count = len(units.labels)
        return shuffled_folds(units.index, count, scheme.folds, permutations(seed, names, count, scheme.repeats))
    return unit_folds(units.index, units.labels)


def _bootstrap(candidates: CandidateSet, scheme, units: Units, seed: int, names: tuple) -> SchemeOutcome:
    data = candidates.data
    errors = candidates.bootstrap(lambda: draw_counts(seed, names, len(units.labels), scheme.draws), units.index)
    loss = summarise(errors.squared, data.root_weights, data.level_index, data.levels.size)
    losses = unit_losses(errors.squared, data.root_weights**2, units.index, len(units.labels))
    sizes = np.bincount(units.index, minlength=len(units.labels))
    first = np.unique(units.index, return_index=True)[1]
    left_out = errors.left_out[first]
    rows = tuple((label, int(sizes[k]), losses[:, k], int(left_out[k])) for k, label in enumerate(units.labels))
    return SchemeOutcome("", loss, rows, None, errors.rank_deficient)
