"""Conversions as a CSV table: the columns of the readings file first, then what became of each reading."""

from __future__ import annotations

import re
from collections import Counter
from collections.abc import Callable, Iterable, Sequence
from dataclasses import dataclass, replace

from fitlib.conversion.readings import Readings, parse_number
from fitlib.conversion.record import Conversion

COLUMNS = (
    "verdict",
    "value",
    "unit",
    "standard_uncertainty",
    "expanded_uncertainty",
    "coverage_factor",
    "coverage_probability",
    "readings",
    "choice",
    "note",
)
# A spreadsheet would take such a text for a formula, the wide signs in some locales; apostrophes before the sign count
# too, so that a cell can be turned back into its text without doubt.
_FORMULA = re.compile("[' ]*[=+\\-@\t\r\n\uff1d\uff0b\uff0d\uff20]")


@dataclass(frozen=True)
class ConversionTable:
    """A table of conversions, and what it holds.

    Attributes
    ----------
    text : str
        CSV with one header row.
    verdicts : dict of str to int
        How many readings have each verdict.
    without_value : int
        Readings for which there is no value.
    """

    text: str
    verdicts: dict[str, int]
    without_value: int


def guard(cell: str) -> str:
    """Return a cell that no spreadsheet takes for a formula.

    Parameters
    ----------
    cell : str

    Returns
    -------
    str
        With a leading ``'`` when it is a text that starts with a sign; numbers are left alone.
    """
    is_number = parse_number(cell) is not None or parse_number(cell, "comma") is not None
    return f"'{cell}" if _FORMULA.match(cell) and not is_number else cell


def _cell(value: object) -> str:
    if value is None:
        return ""
    return repr(float(value)) if isinstance(value, float) else guard(str(value))


def _answer_cells(conversion: Conversion, choice: str) -> list[str]:
    record = {**vars(conversion), "choice": choice}
    return [_cell(record[name]) for name in COLUMNS]


def _own_names(header: Sequence[str]) -> list[str]:
    """Names of the file's columns, changed where the table has a column of that name itself."""
    taken = {"row", *COLUMNS}
    return [f"{name}_in_file" if name in taken else name for name in header]


def _write(header: list[str], rows: Iterable[list[str]]) -> str:
    return "".join(",".join(map(_quoted, cells)) + "\n" for cells in [header, *rows])


def _quoted(cell: str) -> str:
    """As RFC 4180 has it; the writer of the standard library leaves a lone carriage return bare."""
    return '"' + cell.replace('"', '""') + '"' if any(mark in cell for mark in ',"\r\n') else cell


def _table(header: list[str], rows: list[list[str]], conversions: list[Conversion], choice: str) -> ConversionTable:
    complete = [[*cells, *_answer_cells(each, choice)] for cells, each in zip(rows, conversions, strict=True)]
    without = sum(conversion.value is None for conversion in conversions)
    verdicts = dict(Counter(conversion.verdict for conversion in conversions))
    return ConversionTable(_write([*header, *COLUMNS], complete), verdicts, without)


def _fit(cells: Sequence[str], width: int) -> list[str]:
    """As many cells as the header has: missing ones empty, surplus ones joined into the last."""
    if len(cells) > width:
        return [*cells[: width - 1], ";".join(cells[width - 1 :])]
    return [*cells, *[""] * (width - len(cells))]


def conversion_table(
    readings: Readings, convert: Callable[[float, int], Conversion], averaged: int = 1, choice: str = "decided"
) -> ConversionTable:
    """Convert every row of a readings file; no row is dropped.

    Parameters
    ----------
    readings : Readings
    convert : callable
        ``CalibrationFunction.convert`` or one of its kind.
    averaged : int
        How many readings were averaged in each row.
    choice : str
        ``decided`` or ``tie``, marked in every row.

    Returns
    -------
    ConversionTable
    """
    known: dict[float, Conversion] = {}
    conversions, rows = [], []
    width = len(readings.header)
    for row in readings.rows:
        if row.reading not in known or row.fault:
            known[row.reading] = convert(row.reading, averaged)
        conversion = known[row.reading]
        conversions.append(replace(conversion, note=row.fault) if row.fault else conversion)
        rows.append([str(row.number), *(guard(cell) for cell in _fit(row.cells, width))])
    return _table(["row", *(guard(name) for name in _own_names(readings.header))], rows, conversions, choice)


def answers_table(conversions: Sequence[Conversion], given_as: str, choice: str = "decided") -> ConversionTable:
    """Make the table of readings that were given one by one.

    Parameters
    ----------
    conversions : sequence of Conversion
    given_as : {"response", "stimulus"}
        Name of the first column.
    choice : str
        ``decided`` or ``tie``, marked in every row.

    Returns
    -------
    ConversionTable
    """
    rows = [[repr(each.given), guard(each.given_unit)] for each in conversions]
    return _table([given_as, f"{given_as}_unit"], rows, list(conversions), choice)
