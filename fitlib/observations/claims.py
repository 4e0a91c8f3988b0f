"""Rows named by a `where`: exclusions and verification points."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from difflib import get_close_matches
from typing import Any

from fitlib.observations.columns import missing_column
from fitlib.observations.numbers import read_number
from fitlib.observations.tables import Table
from fitlib.observations.wording import listed, number, quoted

Place = tuple[int, int]  # (which file, which row of it)


def _is_number(value: Any) -> bool:
    return isinstance(value, int | float) and not isinstance(value, bool)


def _wanted_text(value: Any) -> str:
    return str(value).lower() if isinstance(value, bool) else str(value).strip()


def _cell(table: Table, key: str, place: int) -> str | None:
    """Field of a row under a key; None when the row has no such field."""
    if key in table.header:
        row = table.rows[place]
        return row[table.header.index(key)] if row else None
    if key == "row":
        return str(table.lines[place])
    return table.file if key == "file" else None


def _agrees(cell: str | None, value: Any, decimal: str) -> bool:
    if cell is None:
        return False
    if _is_number(value):
        found = read_number(cell, decimal)
        return found is not None and found == value
    return cell == _wanted_text(value)


def _has_key(table: Table, key: str) -> bool:
    return key in table.header or key in ("row", "file")


def _narrow(table: Table, key: str, value: Any, decimal: str, places: Sequence[int]) -> list[int]:
    mark = "point" if key == "row" and key not in table.header else decimal
    return [place for place in places if _agrees(_cell(table, key, place), value, mark)]


def match(where: Mapping[str, Any], tables: Sequence[Table], decimal: str) -> tuple[list[Place], str]:
    """Find the rows for which every key of a `where` agrees.

    Parameters
    ----------
    where : mapping
        Column names, or ``row`` and ``file`` where a file has no such column, and the values wanted. A number agrees
        with a field that holds the same number, text with the same text.
    tables : sequence of Table
        All files of the dataset.
    decimal : {"point", "comma"}

    Returns
    -------
    places : list of (int, int)
        File and row, counted from 0.
    message : str
        Empty, or what is wrong: an unknown key, no row, or a row number that stands in several files.
    """
    unknown = [key for key in where if not any(_has_key(table, key) for table in tables)]
    if unknown:
        names = tuple(dict.fromkeys(name for table in tables for name in table.header))
        return [], "; ".join(missing_column(key, names) for key in unknown) + "; `row` and `file` may be used too"
    places = []
    for which, table in enumerate(tables):
        found = range(len(table.rows)) if all(_has_key(table, key) for key in where) else ()
        for key, value in where.items():
            found = _narrow(table, key, value, decimal, found)
        places.extend((which, place) for place in found)
    if not places:
        return [], _nothing_found(where, tables, decimal)
    if "row" in where and "file" not in where and len({which for which, _ in places}) > 1:
        files = listed([tables[which].file for which in dict.fromkeys(which for which, _ in places)])
        return [], f"row {where['row']} stands in several files ({files}); add the key `file`"
    return places, ""


def _nothing_found(where: Mapping[str, Any], tables: Sequence[Table], decimal: str) -> str:
    alone = {}
    for key, value in where.items():
        alone[key] = sum(len(_narrow(table, key, value, decimal, range(len(table.rows)))) for table in tables)
    reasons = [_values_of(key, where[key], tables, decimal) for key, count in alone.items() if count == 0]
    if not reasons:
        reasons = ["each key agrees with some rows, but no row agrees with all of them"]
    wanted = ", ".join(f"{key}: {value}" for key, value in where.items())
    return f"no row matches {{{wanted}}}; " + "; ".join(reasons)


def _values_of(key: str, value: Any, tables: Sequence[Table], decimal: str) -> str:
    """What a key does hold, so that the user sees the value meant."""
    if key == "row" and not any(key in table.header for table in tables):
        spans = [f"{table.lines[0]} to {table.lines[-1]} ({table.file})" for table in tables]
        return f"rows are on lines {listed(spans)}"
    cells = (_cell(table, key, place) for table in tables for place in range(len(table.rows)))
    held = list(dict.fromkeys(cell for cell in cells if cell))
    if _is_number(value):
        numbers = sorted({found for cell in held if (found := read_number(cell, decimal)) is not None})
        if len(numbers) > 8:
            return f"the nearest number in {quoted(key)} is {number(min(numbers, key=lambda x: abs(x - value)))}"
    near = get_close_matches(_wanted_text(value), held, n=1) if len(held) > 8 else []
    return f"{quoted(key)} holds {listed([quoted(cell) for cell in (near or held)])}{' and others' if near else ''}"
