"""What the used observations can support, and what a person may want to change before a run."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from typing import TYPE_CHECKING

import numpy as np

from fitlib.numerics.families import parameter_count
from fitlib.observations.columns import ROLES, FileRows
from fitlib.observations.records import Observations
from fitlib.observations.run_columns import comes_in_blocks, named_as_series
from fitlib.observations.wording import number, plural, quoted

if TYPE_CHECKING:
    from fitlib.study import DatasetSettings, Study

LEVELS_FOR_A_VERDICT = 7
NAMED_CANDIDATES = 3
Advice = Iterator[tuple[str, str]]


def _at_levels(observations: Observations) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """Values of the levels, and observations and series at each."""
    used = np.flatnonzero(observations.level_index >= 0)
    index = observations.level_index[used]
    first = np.unique(index, return_index=True)[1]
    names = np.unique(np.array(observations.series, dtype=object)[used].astype(str), return_inverse=True)[1]
    met = np.bincount(np.unique(np.stack((index, names)), axis=1)[0])
    return observations.level[used][first], np.bincount(index), met


def _ends(dataset: DatasetSettings, observations: Observations) -> Advice:
    """An end of the interval that rests on less than the levels inside do."""
    values, counts, met = _at_levels(observations)
    if values.size < 3:
        return
    interval = dataset.measuring_interval or (values[0], values[-1])
    for at, word in ((0, "first"), (-1, "last")):
        beyond = interval[0] > values[0] if at == 0 else interval[1] < values[-1]
        others, other_series = (np.median(np.delete(part, at)) for part in (counts, met))
        rests = ""
        if met[at] == 1 < other_series:
            rests = f"{plural(int(counts[at]), 'observation')} of one series, where other levels are met in several"
        elif counts[at] == 1 < others:
            rests = "one observation, where other levels have several"
        if rests and not beyond:
            level = number(values[at])
            yield "", f"the {word} level, {level}, rests on {rests}; it sets the measuring interval"


def _series(dataset: DatasetSettings, observations: Observations, files: Sequence[FileRows]) -> Advice:
    """Levels that repeat without a series, while a column looks like one."""
    if dataset.columns.series is not None or _at_levels(observations)[1].max() < 2:
        return
    taken = {getattr(dataset.columns, role) for role in ROLES}
    for name in files[0].table.header:
        cells = files[0].table.column(name)
        if name not in taken and (named_as_series(name, cells) or comes_in_blocks(cells, files[0].stimulus)):
            found = f"levels repeat, and column {quoted(name)} looks like the number of a run; is it `columns.series`?"
            yield "columns", f"{found} Without it nothing is known of differences between runs"
            return


def _levels(levels: int) -> Advice:
    if levels < LEVELS_FOR_A_VERDICT:
        used = "1 level is used" if levels == 1 else f"{levels} levels are used"
        yield "", f"{used}; with fewer than {LEVELS_FOR_A_VERDICT} a verdict may be not_evaluated"


def _candidates(study: Study, levels: int) -> Advice:
    """Candidates that can never be eligible with so many levels."""
    freedom = study.selection.degrees_of_freedom
    needs = {
        name: parameter_count(family.family, degree, family.fixed_points) + freedom
        for family in study.families
        for degree, name in zip(family.degrees, family.candidate_ids, strict=True)
    }
    short = {name: need for name, need in needs.items() if need > levels}
    if not short:
        return
    (name, need), *others = short.items()
    wanted = [f"{name} needs at least {need} levels", *(f"{name} {need}" for name, need in others)][:NAMED_CANDIDATES]
    more = f" and {len(short) - len(wanted)} others more" if len(short) > len(wanted) else ""
    left_out = "it cannot be chosen" if len(short) == 1 else "they cannot be chosen"
    yield "families", f"{', '.join(wanted)}{more}; with {plural(levels, 'level')} {left_out}"


def _verification(observations: Observations) -> Advice:
    kept, used = observations.state.count("verification"), observations.state.count("used")
    if kept and kept >= used:
        yield (
            "verification_points",
            f"{kept} of {kept + used} observations are kept as verification points, {used} are used; is that meant?",
        )


def design_advice(
    study: Study, dataset: DatasetSettings, observations: Observations, files: Sequence[FileRows]
) -> tuple[tuple[str, str], ...]:
    """What a person may want to change before a run.

    Parameters
    ----------
    study : fitlib.study.Study
    dataset : fitlib.study.DatasetSettings
    observations : Observations
    files : sequence of FileRows
        What the observations were read from.

    Returns
    -------
    tuple of (str, str)
        Key below the dataset (``families`` is the study's own), and a message that names no dataset.
    """
    levels = int(observations.level_index.max()) + 1
    if levels < 1:
        return ()
    return (
        *_ends(dataset, observations),
        *_series(dataset, observations, files),
        *_levels(levels),
        *_candidates(study, levels),
        *_verification(observations),
    )
