"""Which column plays which part, and the fields of each part as numbers or words."""

from __future__ import annotations

from dataclasses import dataclass, field
from difflib import get_close_matches

import numpy as np

from fitlib.observations.faults import Faults
from fitlib.observations.numbers import explain, read_number
from fitlib.observations.tables import Table
from fitlib.observations.wording import quoted

ROLES = ("stimulus", "response", "series", "direction", "level")
DIRECTIONS = {"rising": "rising", "up": "rising", "falling": "falling", "down": "falling"}


@dataclass
class FileRows:
    """One file with its parts read; `faults` holds what is wrong with each row until exclusions are known.

    What no exclusion covers then goes to `collected`.
    """

    table: Table
    stimulus: np.ndarray
    response: np.ndarray
    level: np.ndarray | None
    series: list[str]
    direction: list[str]
    collected: Faults
    faults: dict[int, list[tuple[str, str]]] = field(default_factory=dict)


def nearest_name(name: str, known: tuple[str, ...]) -> str | None:
    """The known name most like `name`, without regard to case."""
    by_case = {other.casefold(): other for other in reversed(known) if other}
    close = get_close_matches(name.casefold(), list(by_case), n=1, cutoff=0.5)
    return by_case[close[0]] if close else None


def missing_column(name: str, known: tuple[str, ...]) -> str:
    """Plain words for a column that a file does not have."""
    near = nearest_name(name, known)
    guess = f'did you mean "{near}"? ' if near else ""
    return f"there is no column {quoted(name)}; {guess}the file has {_names(known)}"


def _names(known: tuple[str, ...]) -> str:
    shown = ", ".join(quoted(other) for other in known[:20] if other)
    return shown + (f" and {len(known) - 20} more" if len(known) > 20 else "")


def missing_columns(table: Table, columns) -> dict[str, str]:
    """What to say of each declared column that the table does not have, by its part."""
    wanted = {role: getattr(columns, role) for role in ROLES if getattr(columns, role) is not None}
    return {role: _missing(name, table) for role, name in wanted.items() if name not in table.header}


def _missing(name: str, table: Table) -> str:
    near = nearest_name(name, table.header)
    message = f"column {quoted(name)} is not in {table.file}; its columns are {_names(table.header)}"
    if near:
        message += f"; did you mean {quoted(near)}?"
    if len(table.header) == 1 and any(mark in table.header[0] for mark in ",;\t"):
        message += f" (read as one column with delimiter {table.delimiter}; declare the delimiter)"
    return message


def _numbers(rows: FileRows, name: str, decimal: str) -> np.ndarray:
    values = np.full(len(rows.table.rows), np.nan)
    for place, text in enumerate(rows.table.column(name)):
        number = read_number(text, decimal)
        if number is not None:
            values[place] = number
        elif rows.table.rows[place]:
            kind, message = explain(text, decimal)
            rows.faults.setdefault(place, []).append((kind, f"column {quoted(name)}: {message}"))
    return values


def _series(rows: FileRows, name: str) -> list[str]:
    words = rows.table.column(name)
    for place, word in enumerate(words):
        if not word and rows.table.rows[place]:
            message = f"column {quoted(name)}: missing value (the field is empty); every row needs its series"
            rows.faults.setdefault(place, []).append(("missing series", message))
    return words


def _directions(rows: FileRows, name: str) -> list[str]:
    words = []
    for place, word in enumerate(rows.table.column(name)):
        words.append(DIRECTIONS.get(word.casefold(), ""))
        if not words[-1] and rows.table.rows[place]:
            found = quoted(word) if word else "an empty field"
            message = f"column {quoted(name)}: {found} is not a direction; rising, falling, up or down are allowed"
            rows.faults.setdefault(place, []).append(("direction", message))
    return words


def read_roles(table: Table, columns, decimal: str, collected: Faults) -> FileRows:
    """Read the parts of every row.

    Parameters
    ----------
    table : Table
        A table that has every declared column.
    columns : fitlib.study.Columns
        Names of the columns by part.
    decimal : {"point", "comma"}
    collected : Faults
        The faults of this file.

    Returns
    -------
    FileRows
        Numbers are NaN where a field is none; the faults say why, by place of the row.
    """
    count = len(table.rows)
    rows = FileRows(table, np.empty(0), np.empty(0), None, [""] * count, [""] * count, collected)
    rows.stimulus = _numbers(rows, columns.stimulus, decimal)
    rows.response = _numbers(rows, columns.response, decimal)
    if columns.level is not None:
        rows.level = _numbers(rows, columns.level, decimal)
    if columns.series is not None:
        rows.series = _series(rows, columns.series)
    if columns.direction is not None:
        rows.direction = _directions(rows, columns.direction)
    for place, fault in table.uneven.items():
        rows.faults[place] = [fault]
    return rows
