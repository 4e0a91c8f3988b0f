"""Tables of a revision read back: text without its guards, frames with declared types."""

from __future__ import annotations

import csv
import io
import re
from collections.abc import Iterator, Mapping
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    import pandas

# What fitlib.collect guards with an apostrophe (it lies beside this package, not below; a test compares the two).
_GUARDED = re.compile("'+[=+\\-@\uff1d\uff0b\uff0d\uff20]")
_TYPES = {"whole_number": "Int64", "boolean": "boolean", "text": "str"}


def rows_of(data: bytes, types: Mapping[str, str]) -> Iterator[dict[str, str]]:
    """Rows of a CSV table as text.

    Parameters
    ----------
    data : bytes
        UTF-8.
    types : mapping of str to str
        Type by column; a column without one is text.

    Yields
    ------
    dict of str to str

    Raises
    ------
    ValueError
        If it is not UTF-8, or a row has more or fewer cells than the header.
    """
    reader = csv.DictReader(io.StringIO(data.decode("utf-8"), newline=""), strict=True)
    text = [name for name in reader.fieldnames or [] if types.get(name, "text") == "text"]
    for row in reader:
        if None in row or None in row.values():
            raise ValueError("a row has not as many cells as the header")
        row.update((name, unguarded(row[name])) for name in text)
        yield row


def unguarded(cell: str) -> str:
    """Text of a cell without the apostrophe that keeps a spreadsheet from acting upon it."""
    return cell[1:] if cell.startswith("'") and _GUARDED.match(cell) else cell


def frame_of(data: bytes, types: Mapping[str, str]) -> pandas.DataFrame:
    """A frame with the declared types.

    Parameters
    ----------
    data : bytes
        UTF-8.
    types : mapping of str to str
        Type by column.

    Returns
    -------
    pandas.DataFrame
        An empty cell is an empty string in a text column, a missing value in any other.
    """
    import pandas

    numbers = [name for name, kind in types.items() if kind == "number"]
    text = [name for name, kind in types.items() if kind == "text"]
    frame = pandas.read_csv(
        io.BytesIO(data),
        dtype={name: _TYPES.get(kind, "str") for name, kind in types.items() if name not in numbers},
        converters=dict.fromkeys(numbers, _number),  # exact in every version of pandas
        keep_default_na=False,  # a label may be "NA"
        na_values={name: [""] for name in types if name not in [*text, *numbers]},
    )
    for name in text:
        frame[name] = frame[name].map(unguarded)
    return frame.astype(dict.fromkeys(numbers, "float64"))


def _number(cell: str) -> float:
    return float(cell) if cell else float("nan")
