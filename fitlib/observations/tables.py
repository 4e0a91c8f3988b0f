"""From the text of a CSV file to a table of fields: delimiter, header, rows, blank lines, uneven rows."""

from __future__ import annotations

import csv
import io
from dataclasses import dataclass

from fitlib.observations.faults import Faults
from fitlib.observations.wording import quoted

DELIMITERS = {"comma": ",", "semicolon": ";", "tab": "\t"}


@dataclass(frozen=True)
class Table:
    """Fields of one CSV file as text.

    Attributes
    ----------
    file : str
        The file as the study names it.
    delimiter : str
        ``comma``, ``semicolon`` or ``tab``.
    header : tuple of str
        Column names, stripped.
    rows : list of list of str
        Fields, stripped; an empty list stands for a row whose fields cannot be told apart.
    lines : list of int
        Line on which each row starts; the header is line 1.
    blank_lines : int
        Lines without any field, which are no rows.
    uneven : dict of int to (str, str)
        Kind of fault and message of each row that is an empty list, by place.
    """

    file: str
    delimiter: str
    header: tuple[str, ...]
    rows: list[list[str]]
    lines: list[int]
    blank_lines: int
    uneven: dict[int, tuple[str, str]]

    def column(self, name: str) -> list[str]:
        """Fields of one column; empty text for a row whose fields cannot be told apart."""
        place = self.header.index(name)
        return [row[place] if row else "" for row in self.rows]


def sniff_delimiter(text: str) -> str:
    """Delimiter of a text by its header line, marks inside quotation marks aside.

    A tab if the header has one, else a semicolon if it has one, else a comma: names hold commas (``level, m``) more
    often than semicolons or tabs, and a header without any of them is one column.
    """
    header = next((line for line in io.StringIO(text, newline=None) if line.strip()), "")
    outside = "".join(header.split('"')[::2])
    return next((name for name in ("tab", "semicolon") if DELIMITERS[name] in outside), "comma")


def _plain_csv_fault(error: csv.Error) -> str:
    said = str(error)
    if "unexpected end of data" in said or "field larger" in said:
        return "a quotation mark opened in this row is not closed"
    if "expected after" in said:
        return "a closing quotation mark is followed by text; write a quotation mark inside a field twice"
    return f"cannot be read as CSV: {said}"


def _uneven(found: int, expected: int, delimiter: str, decimal: str) -> str:
    message = f"{found} field{'s' * (found != 1)} where the header has {expected}"
    if found > expected and delimiter == "comma":
        hint = "a decimal comma in a comma-separated file needs quotation marks, or another delimiter"
        return f"{message}; {hint}" if decimal == "comma" else f"{message}; is a comma meant as a decimal comma?"
    return message


def read_table(text: str, file: str, delimiter: str | None, decimal: str, faults: Faults) -> Table | None:
    """Read a CSV text.

    Parameters
    ----------
    text : str
        The text of the file.
    file : str
        The file as the study names it.
    delimiter : {"comma", "semicolon", "tab"} or None
        None takes it from the header line.
    decimal : {"point", "comma"}
        Only for the hint beside an uneven row.
    faults : Faults
        Takes the faults of the file as a whole; those of single rows stay in the table, where an exclusion may cover
        them.

    Returns
    -------
    Table or None
        None when there is no header or no row.
    """
    if not text.strip():
        faults.add("empty", None, "the file is empty; a header line and rows are expected")
        return None
    delimiter = delimiter or sniff_delimiter(text)
    reader = csv.reader(
        io.StringIO(text, newline=None), delimiter=DELIMITERS[delimiter], skipinitialspace=True, strict=True
    )
    header: tuple[str, ...] = ()
    rows: list[list[str]] = []
    lines: list[int] = []
    uneven: dict[int, tuple[str, str]] = {}
    blank = 0
    while True:
        line = reader.line_num + 1
        try:
            fields = next(reader)
        except StopIteration:
            break
        except csv.Error as error:
            if not header:
                faults.add("quotation marks", line, _plain_csv_fault(error))
                return None
            uneven[len(rows)] = ("quotation marks", _plain_csv_fault(error))
            rows.append([])
            lines.append(line)
            if "expected after" in str(error):
                continue  # the reader starts afresh with the next line
            break
        fields = [field.strip() for field in fields]
        if not any(fields):
            blank += 1
        elif not header:
            header = tuple(fields)
        else:
            if len(fields) != len(header):
                uneven[len(rows)] = ("number of fields", _uneven(len(fields), len(header), delimiter, decimal))
                fields = []
            rows.append(fields)
            lines.append(line)
    return _checked(Table(file, delimiter, header, rows, lines, blank, uneven), faults)


def _checked(table: Table, faults: Faults) -> Table | None:
    if not table.header:
        faults.add("empty", None, "the file holds no header line; a header line and rows are expected")
        return None
    repeated = sorted({name for name in table.header if name and table.header.count(name) > 1})
    for name in repeated:
        places = [str(place + 1) for place, other in enumerate(table.header) if other == name]
        faults.add(
            "repeated column", 1, f"column name {quoted(name)} occurs {len(places)} times (fields {', '.join(places)})"
        )
    if not table.rows:
        faults.add("empty", None, "the file holds a header line only; rows are expected")
        return None
    return table
