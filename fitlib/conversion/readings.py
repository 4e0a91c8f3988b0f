"""Read a file of readings: every row is kept, and what is not a number is said by row."""

from __future__ import annotations

import csv
import io
import re
from dataclasses import dataclass

from fitlib.errors import InputError, Problem

LARGEST_FILE = 200_000_000  # bytes, as for the data of one dataset
MOST_ROWS = 1_000_000
DELIMITERS = {"comma": ",", "semicolon": ";", "tab": "\t"}

_NUMBER = re.compile(r"[+-]?([0-9]+\.?[0-9]*|\.[0-9]+)([eE][+-]?[0-9]+)?")


@dataclass(frozen=True)
class Row:
    """One row of a readings file.

    Attributes
    ----------
    number : int
        Line in the file; the header is line 1.
    cells : tuple of str
        As read.
    reading : float
        NaN when the cell is not a number.
    fault : str
        Why there is no reading; empty when there is one.
    """

    number: int
    cells: tuple[str, ...]
    reading: float
    fault: str = ""


@dataclass(frozen=True)
class Readings:
    """A readings file.

    Attributes
    ----------
    header : tuple of str
    column : str
        The column that was read.
    rows : tuple of Row
        Every row but wholly blank lines.
    blank_lines : tuple of int
        Numbers of the wholly blank lines.
    """

    header: tuple[str, ...]
    column: str
    rows: tuple[Row, ...]
    blank_lines: tuple[int, ...]


def parse_number(cell: str, decimal: str = "point") -> float | None:
    """Return the number that a cell holds, or None.

    Parameters
    ----------
    cell : str
    decimal : {"point", "comma"}

    Returns
    -------
    float or None
        None for text and for an empty cell.
    """
    text = cell.strip()
    if decimal == "comma":
        if "." in text:
            return None
        text = text.replace(",", ".")
    return float(text) if _NUMBER.fullmatch(text) else None


def _decode(raw: bytes, path: str) -> str:
    if len(raw) > LARGEST_FILE:
        raise _refusal(path, f"is larger than {LARGEST_FILE} bytes")
    if raw[:2] in (b"\xff\xfe", b"\xfe\xff"):
        raise _refusal(path, "is UTF-16 text; save it as UTF-8")
    try:
        return raw.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        line = raw.count(b"\n", 0, error.start) + 1
        raise InputError([Problem(path, "is not UTF-8 text; save it as UTF-8", line=line)]) from None


def _refusal(path: str, message: str, key: str = "") -> InputError:
    return InputError([Problem(file=path, message=message, key=key)])


def _sniff(text: str) -> str:
    """The delimiter that stands most often in the header; comma when none does."""
    header = text.lstrip("\r\n").split("\n", 1)[0]
    return max(DELIMITERS.values(), key=header.count)


def _lines(text: str, delimiter: str, path: str) -> list[tuple[int, list[str]]]:
    """Rows with the number of the line on which each begins."""
    reader = csv.reader(io.StringIO(text, newline=""), delimiter=delimiter, strict=True)
    lines, start = [], 1
    try:
        for cells in reader:
            lines.append((start, cells))
            start = reader.line_num + 1
    except csv.Error as error:
        raise InputError([Problem(path, f"cannot be read as CSV: {error}", line=start)]) from None
    if len(lines) > MOST_ROWS + 1:
        raise _refusal(path, f"has more than {MOST_ROWS} rows")
    return lines


def _blank(cells: list[str]) -> bool:
    return not any(cell.strip() for cell in cells)


def _check_header(header: list[str], line: int, path: str, decimal: str) -> None:
    names = [name.strip() for name in header]
    if all(parse_number(name, decimal) is not None for name in names if name):
        message = "the first row holds numbers and no names; a header row is expected, with a name for each column"
        raise InputError([Problem(path, message, line=line)])
    twice = sorted({name for name in names if name and names.count(name) > 1})
    if twice:
        raise InputError([Problem(path, f"the header has {', '.join(map(repr, twice))} more than once", line=line)])


def _choose_column(header: list[str], rows: list[list[str]], wanted: str | None, decimal: str, path: str) -> int:
    names = [name.strip() for name in header]
    listed = ", ".join(name or "''" for name in names)
    if wanted is not None:
        if wanted.strip() in names:
            return names.index(wanted.strip())
        raise _refusal(path, f"there is no column {wanted!r}; the columns are {listed}", "--column")
    numeric = [i for i in range(len(names)) if _numeric(rows, i, decimal)]
    if len(numeric) == 1:
        return numeric[0]
    if numeric:
        choices = ", ".join(names[i] or "''" for i in numeric)
        raise _refusal(path, f"several columns hold numbers ({choices}); name the readings with --column", "--column")
    raise _refusal(path, f"no column holds numbers; name the readings with --column; the columns are {listed}")


def _numeric(rows: list[list[str]], index: int, decimal: str) -> bool:
    """Whether at least half of the filled cells of a column are numbers."""
    cells = [row[index] for row in rows if index < len(row) and row[index].strip()]
    return bool(cells) and 2 * sum(parse_number(cell, decimal) is not None for cell in cells) >= len(cells)


def _read_row(number: int, cells: list[str], width: int, index: int, decimal: str) -> Row:
    fault, reading = "", None
    if len(cells) != width:
        fault = f"the row has {len(cells)} cells, the header {width}"
    elif not cells[index].strip():
        fault = "the cell is empty"
    else:
        reading = parse_number(cells[index], decimal)
        if reading is None:
            other = "comma" if decimal == "point" else "point"
            readable = parse_number(cells[index], other) is not None
            hint = f"; for a decimal {other} give --decimal {other}" if readable else ""
            fault = f"the cell holds {cells[index].strip()[:40]!r}, which is not a number{hint}"
    return Row(number, tuple(cells), float("nan") if reading is None else reading, fault)


def read_readings(
    raw: bytes, path: str, column: str | None = None, delimiter: str | None = None, decimal: str = "point"
) -> Readings:
    """Read a file of readings.

    Parameters
    ----------
    raw : bytes
        What the file holds: CSV with a header row.
    path : str
        The file as the user named it, for messages.
    column : str, optional
        The column to read; by default the only one that holds numbers.
    delimiter : {"comma", "semicolon", "tab"}, optional
        By default the one that stands most often in the header.
    decimal : {"point", "comma"}

    Returns
    -------
    Readings

    Raises
    ------
    InputError
        The file is not CSV text, has no rows, or the column is not there or not the only one.
    """
    text = _decode(raw, path)
    mark = DELIMITERS[delimiter] if delimiter else _sniff(text)
    if decimal == "comma" and mark == ",":
        raise _refusal(path, "a decimal comma needs another delimiter than comma", "--decimal")
    lines = _lines(text, mark, path)
    filled = [(number, cells) for number, cells in lines if not _blank(cells)]
    if len(filled) < 2:
        raise _refusal(path, "has no readings; expected a header row and one row for each reading")
    line, header = filled[0]
    _check_header(header, line, path, decimal)
    index = _choose_column(header, [cells for _, cells in filled[1:]], column, decimal, path)
    rows = tuple(_read_row(number, cells, len(header), index, decimal) for number, cells in filled[1:])
    blank = tuple(number for number, cells in lines if _blank(cells))
    return Readings(tuple(name.strip() for name in header), header[index].strip(), rows, blank)
