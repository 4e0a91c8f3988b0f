"""Guesses which column of a CSV file plays which part, with the reason for each guess and how sure it is."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from fitlib.observations.clusters import find_clusters
from fitlib.observations.columns import DIRECTIONS
from fitlib.observations.levels import group_by_label
from fitlib.observations.numbers import read_number
from fitlib.observations.run_columns import comes_in_blocks, named_as_series, words
from fitlib.observations.tables import Table

STIMULUS_WORDS = {"stimulus", "reference", "ref", "nominal", "set", "setpoint", "level", "applied", "standard", "known"}
STIMULUS_WORDS |= {"load", "target", "x", "concentration", "actual", "imposed"}
LEVEL_WORDS = {"nominal", "level", "set", "setpoint", "target", "step"}
RESPONSE_WORDS = {"response", "reading", "indication", "indicated", "output", "signal", "measured", "display", "y"}
RESPONSE_WORDS |= {"displayed", "instrument", "sensor", "current", "voltage", "counts", "deflection", "absorbance"}
OTHER_WORDS = {"time", "date", "timestamp", "index", "no", "nr", "id", "row", "number", "replicate"}
OTHER_WORDS |= {"operator", "remark", "note", "comment"}
LEAST_READABLE = 0.8
SURE, LIKELY, GUESS = "sure", "fairly sure", "a guess, please check"


@dataclass(frozen=True)
class Guess:
    """A column for one part, why, and how sure that is."""

    column: str
    reason: str
    confidence: str


@dataclass(frozen=True, eq=False)
class Profile:
    """One column: its words, its fields, and its numbers (NaN where a field is none)."""

    name: str
    words: set[str]
    cells: Sequence[str]
    numbers: np.ndarray

    @property
    def numeric(self) -> bool:
        """Whether at least four of five fields are numbers."""
        return bool(np.mean(np.isfinite(self.numbers)) >= LEAST_READABLE)

    @property
    def distinct(self) -> int:
        """Number of distinct numbers; values that gather in groups count once a group."""
        found = self.numbers[np.isfinite(self.numbers)]
        clusters = find_clusters(found, np.zeros(found.size, dtype=int))
        return clusters.groups if clusters is not None and clusters.groups else np.unique(found).size


def sniff_decimal(table: Table) -> str:
    """Decimal mark by the fields that are a number with one mark only; a point when there is no telling."""
    votes = {"point": 0, "comma": 0}
    for row in table.rows:
        for cell in row:
            as_point, as_comma = read_number(cell, "point"), read_number(cell, "comma")
            if (as_point is None) != (as_comma is None):
                votes["point" if as_comma is None else "comma"] += 1
    return "comma" if votes["comma"] > votes["point"] else "point"


def profiles(table: Table, decimal: str) -> list[Profile]:
    """A profile of every named column."""
    found = []
    for name in table.header:
        if not name:
            continue
        cells = table.column(name)
        numbers = [read_number(cell, decimal) for cell in cells]
        values = np.array([np.nan if number is None else number for number in numbers])
        found.append(Profile(name, words(name), cells, values))
    return found


def _direction(columns: Sequence[Profile]) -> Guess | None:
    for column in columns:
        if all(cell.casefold() in DIRECTIONS for cell in column.cells):
            return Guess(column.name, "every field says rising, falling, up or down", SURE)
    return None


def _series_by_name(columns: Sequence[Profile]) -> Guess | None:
    for column in columns:
        if named_as_series(column.name, column.cells):
            return Guess(column.name, "by its name", SURE)
    return None


def _series_by_blocks(columns: Sequence[Profile], stimulus: Profile) -> Guess | None:
    """A column that stays the same while the stimulus passes through three values or more, block by block."""
    for column in columns:
        if comes_in_blocks(column.cells, stimulus.numbers):
            return Guess(column.name, "its rows come in blocks that pass through several stimulus values", GUESS)
    return None


def _named(columns: Sequence[Profile], wanted: set[str], other: set[str]) -> list[Profile]:
    return [column for column in columns if column.words & wanted and not column.words & other]


def _richest(columns: Sequence[Profile]) -> tuple[Profile | None, tuple[str, str]]:
    if not columns:
        return None, ("", GUESS)
    chosen = max(columns, key=lambda column: np.unique(column.numbers).size)
    if len(columns) == 1:
        return chosen, ("by its name", SURE)
    return chosen, (f"by its name and its many values, among {len(columns)} columns whose names fit", LIKELY)


def _pair(columns: Sequence[Profile]) -> tuple[Profile, Profile, Guess, Guess]:
    """Stimulus and response among two numeric columns or more."""
    stimuli = _named(columns, STIMULUS_WORDS, RESPONSE_WORDS)
    responses = _named(columns, RESPONSE_WORDS, STIMULUS_WORDS)
    # Of several names that fit, the column with more values: a nominal value repeats more than what was set, and a
    # counter of readings more than the readings.
    stimulus, why_stimulus = _richest(stimuli)
    response, why_response = _richest(responses)
    if stimulus is None:
        rest = [column for column in columns if column is not response]
        stimulus = min(rest, key=lambda column: column.distinct)  # the first of equals
        clear = all(2 * stimulus.distinct <= column.distinct for column in columns if column is not stimulus)
        behaviour = "it has the fewest distinct values" if len(rest) > 1 else "the number column that is left"
        why_stimulus = (behaviour, LIKELY if clear else GUESS)
    if response is None:
        rest = [column for column in columns if column is not stimulus and not column.words & LEVEL_WORDS]
        rest = rest or [column for column in columns if column is not stimulus]
        response = max(rest, key=lambda column: column.distinct)
        sure = why_stimulus[1] == SURE and len(rest) == 1
        behaviour = "the number column that is left" if len(rest) == 1 else "it has the most distinct values"
        why_response = (behaviour, LIKELY if sure else GUESS)
    return stimulus, response, Guess(stimulus.name, *why_stimulus), Guess(response.name, *why_response)


def _level(columns: Sequence[Profile], stimulus: Profile) -> Guess | None:
    """A column that names the level of each stimulus value; only where the stimulus itself varies within levels."""
    for column in columns:
        if not column.words & LEVEL_WORDS or not np.array_equal(
            np.isfinite(column.numbers), np.isfinite(stimulus.numbers)
        ):
            continue
        known = np.isfinite(column.numbers)
        label, value = column.numbers[known], stimulus.numbers[known]
        if 1 < np.unique(label).size < np.unique(value).size and not group_by_label(value, label).faults:
            return Guess(column.name, "by its name, and its values lie beside those of the stimulus", LIKELY)
    return None


def guess_columns(columns: Sequence[Profile]) -> dict[str, Guess]:
    """Guess the part of each column.

    Parameters
    ----------
    columns : sequence of Profile

    Returns
    -------
    dict of str to Guess
        By part: ``stimulus`` and ``response``, and ``series``, ``direction``, ``level`` where there is one. Empty when
        there are no two number columns.
    """
    found: dict[str, Guess] = {}
    for part, guess in (("direction", _direction(columns)), ("series", _series_by_name(columns))):
        if guess is not None:
            found[part] = guess
    taken = {guess.column for guess in found.values()}
    left = [column for column in columns if column.name not in taken]
    numeric = [column for column in left if column.numeric]
    likely = [column for column in numeric if not column.words & OTHER_WORDS]
    numeric = likely if len(likely) > 1 else numeric
    if len(numeric) < 2:
        return {}
    stimulus, response, found["stimulus"], found["response"] = _pair(numeric)
    left = [column for column in left if column not in (stimulus, response)]
    level = _level([column for column in left if column.numeric], stimulus)
    if level is not None:
        found["level"] = level
        left = [column for column in left if column.name != level.column]
    if "series" not in found:
        unnamed = [column for column in left if not column.words & OTHER_WORDS]
        guess = _series_by_blocks(unnamed, stimulus)
        if guess is not None:
            found["series"] = guess
    return found
