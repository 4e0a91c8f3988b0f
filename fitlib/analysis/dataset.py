"""The arrays of one dataset as the solvers see them."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from fitlib.numerics.weighting import root_weights


@dataclass(frozen=True)
class DatasetArrays:
    """Observations used, in an order that does not depend on the order of files or rows.

    Attributes
    ----------
    rows : ndarray of int
        Position of each among the observations read.
    x, y : ndarray of shape (n,)
        Independent and dependent variable of the fit; stimulus and response, or the reverse for an analysis function.
    stimulus : ndarray of shape (n,)
    root_weights : ndarray of shape (n,)
    level_index, series_index : ndarray of shape (n,), int
    levels : ndarray of shape (L,)
        Level values, ascending.
    series : tuple of str
        Names of the series.
    interval : (float, float)
        Measuring interval, in the unit of the stimulus.
    x_interval : (float, float)
        The same interval in the independent variable; for an analysis function by interpolation between the mean
        responses of the levels, as no candidate is preferred here.
    swapped : bool
        True for an analysis function: x is the response.
    direction_index : ndarray of shape (n,), int, or None
        0 rising, 1 falling; None unless every observation says which.
    weighting : str
        From which the root weights follow.
    """

    rows: np.ndarray
    x: np.ndarray
    y: np.ndarray
    stimulus: np.ndarray
    root_weights: np.ndarray
    level_index: np.ndarray
    series_index: np.ndarray
    levels: np.ndarray
    series: tuple[str, ...]
    interval: tuple[float, float]
    x_interval: tuple[float, float]
    swapped: bool = False
    direction_index: np.ndarray | None = None
    weighting: str = "none"

    @property
    def level_weights(self) -> np.ndarray:
        """Total weight of each level, shape (L,)."""
        return np.bincount(self.level_index, self.root_weights**2, minlength=self.levels.size)

    def part(self, keep: np.ndarray) -> DatasetArrays:
        """The same dataset with some observations only, levels numbered anew."""
        kept = np.unique(self.level_index[keep])
        number = np.full(self.levels.size, -1)
        number[kept] = np.arange(kept.size)
        return replace(
            self,
            rows=self.rows[keep],
            x=self.x[keep],
            y=self.y[keep],
            stimulus=self.stimulus[keep],
            root_weights=self.root_weights[keep],
            level_index=number[self.level_index[keep]],
            series_index=self.series_index[keep],
            direction_index=None if self.direction_index is None else self.direction_index[keep],
            levels=self.levels[kept],
        )


def make_arrays(study, dataset, observations) -> DatasetArrays:
    """Arrays of the used observations of one dataset.

    Parameters
    ----------
    study : fitlib.study.Study
    dataset : fitlib.study.DatasetSettings
    observations : fitlib.observations.Observations

    Returns
    -------
    DatasetArrays
    """
    rows = _canonical_order(observations)
    stimulus = np.asarray(observations.stimulus, dtype=float)[rows]
    response = np.asarray(observations.response, dtype=float)[rows]
    names = [observations.series[row] for row in rows]
    series = tuple(sorted(set(names)))
    level_index = np.asarray(observations.level_index, dtype=int)[rows]
    first = np.unique(level_index, return_index=True)[1]
    levels = np.asarray(observations.level, dtype=float)[rows][first]
    interval = dataset.measuring_interval or (float(levels[0]), float(levels[-1]))
    swap = dataset.function == "analysis"
    return DatasetArrays(
        rows=rows,
        x=response if swap else stimulus,
        y=stimulus if swap else response,
        stimulus=stimulus,
        root_weights=root_weights(study.weighting, stimulus),
        level_index=level_index,
        series_index=np.array([series.index(name) for name in names]),
        levels=levels,
        series=series,
        interval=(float(interval[0]), float(interval[1])),
        x_interval=_between_levels(response, stimulus, level_index, interval) if swap else tuple(map(float, interval)),
        swapped=swap,
        weighting=study.weighting,
        direction_index=_directions([observations.direction[row] for row in rows]),
    )


def _canonical_order(observations) -> np.ndarray:
    used = [k for k, state in enumerate(observations.state) if state == "used"]
    used.sort(
        key=lambda k: (
            int(observations.level_index[k]),
            observations.series[k],
            observations.direction[k],
            observations.file[k],
            int(observations.row[k]),
        )
    )
    return np.array(used, dtype=int)


def _directions(words: list[str]) -> np.ndarray | None:
    if set(words) != {"rising", "falling"}:
        return None
    return np.array([int(word == "falling") for word in words])


def _between_levels(response: np.ndarray, stimulus: np.ndarray, level_index: np.ndarray, interval):
    counts = np.bincount(level_index)
    at = np.bincount(level_index, stimulus) / counts
    means = np.bincount(level_index, response) / counts
    ends = np.interp(interval, at, means)
    return float(ends.min()), float(ends.max())
