"""Cells, columns and tables: how a value becomes CSV text that is exact, tidy and harmless."""

from __future__ import annotations

import csv
import functools
import io
import math
import re
import unicodedata
from collections.abc import Iterable, Iterator, Mapping
from dataclasses import dataclass
from numbers import Real

TYPES = ("text", "number", "whole_number", "boolean")

# A spreadsheet takes such a cell for a formula; the wide forms count in some locales. Apostrophes before the sign count
# too, so that a cell can be turned back into its text without doubt.
_FORMULA = re.compile("'*[=+\\-@\t\r\n\uff1d\uff0b\uff0d\uff20]")
# Marks that reorder or hide the text around them.
_INVISIBLE = frozenset("\u200b\u200e\u200f\u202a\u202b\u202c\u202d\u202e\u2060\u2066\u2067\u2068\u2069\ufeff")
_HARMFUL_CATEGORIES = frozenset({"Cc", "Cs", "Zl", "Zp"})


@dataclass(frozen=True)
class Column:
    """One column of a table.

    Attributes
    ----------
    name : str
        Header.
    type : {"text", "number", "whole_number", "boolean"}
    unit : str
        Kind of unit (see ``units.Units.words``); empty for words, ``1`` for pure numbers.
    meaning : str
        One sentence for ``columns.csv``.
    """

    name: str
    type: str
    unit: str
    meaning: str


@dataclass(frozen=True)
class Table:
    """One CSV file: its name, its columns and its rows."""

    name: str
    columns: tuple[Column, ...]
    rows: Iterable[Mapping[str, object]]

    def text(self) -> str:
        """CSV text with one header row; an entry that a row does not have is an empty cell.

        Returns
        -------
        str

        Raises
        ------
        ValueError
            If a row has an entry that no column declares, or a value does not suit its column: a fault of the program.
        """
        out = io.StringIO()
        writer = csv.writer(out, lineterminator="\n")
        names = [column.name for column in self.columns]
        writer.writerow(names)
        writer.writerows(map(self._line, self._checked_rows(frozenset(names))))
        return out.getvalue()

    def _checked_rows(self, known: frozenset[str]) -> Iterator[Mapping[str, object]]:
        seen: set[tuple[str, ...]] = set()
        for row in self.rows:
            shape = tuple(row)
            if shape not in seen:
                unknown = sorted(set(shape).difference(known))
                if unknown:
                    raise ValueError(f"{self.name}: no column is declared for {', '.join(unknown)}")
                seen.add(shape)
            yield row

    def _line(self, row: Mapping[str, object]) -> list[str]:
        line = []
        for column in self.columns:
            value = row.get(column.name)
            if value is None:
                line.append("")
            elif type(value) is str and column.type == "text":
                line.append(_safe_text(value))
            elif type(value) is float and column.type == "number" and math.isfinite(value):
                line.append(repr(value))
            else:
                line.append(self._cell(column, value))
        return line

    def _cell(self, column: Column, value: object) -> str:
        try:
            return cell(value, column.type)
        except (TypeError, ValueError) as error:
            raise ValueError(f"{self.name}: {column.name}: {value!r} is not {column.type}: {error}") from error


def cell(value: object, kind: str) -> str:
    """Text of one cell.

    Parameters
    ----------
    value : object
        None gives an empty cell.
    kind : {"text", "number", "whole_number", "boolean"}
        Type of the column.

    Returns
    -------
    str
        Numbers as ``repr`` writes them, so that no digit is lost.

    Raises
    ------
    ValueError, TypeError
        If the value does not suit the column, or is not a finite number.
    """
    if value is None:
        return ""
    if kind == "text":
        return safe_text(value)
    if kind == "boolean":
        return {True: "true", False: "false"}[_checked(value, bool)]
    if isinstance(value, bool):
        raise TypeError("a truth value")
    number = float(_checked(value, Real))
    if not math.isfinite(number):
        raise ValueError("not finite")
    if kind == "number":
        return repr(number)
    if number != int(number):
        raise ValueError("a fraction")
    return str(int(value))


def safe_text(text: str) -> str:
    r"""Text that neither a spreadsheet nor a terminal acts upon.

    Parameters
    ----------
    text : str

    Returns
    -------
    str
        With a leading ``'`` where the text starts with ``= + - @``, tab or return; control characters, line separators
        and marks that reorder text are written as ``\u001b``.
    """
    return _safe_text(_checked(text, str))


@functools.lru_cache(maxsize=1 << 16)
def _safe_text(text: str) -> str:
    guarded = f"'{text}" if _FORMULA.match(text) else text
    if guarded.isascii() and guarded.isprintable():
        return guarded
    return "".join(f"\\u{ord(char):04x}" if _harmful(char) else char for char in guarded)


def _harmful(char: str) -> bool:
    return char in _INVISIBLE or unicodedata.category(char) in _HARMFUL_CATEGORIES


def _checked(value: object, kind: type):
    if not isinstance(value, kind):
        raise TypeError(f"{kind.__name__} is wanted")
    return value
