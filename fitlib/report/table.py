"""Tables as plain records; the template turns them into HTML."""

from __future__ import annotations

from dataclasses import dataclass, field

MOST_ROWS = 200  # of lists that grow with the data; the whole lists stand in the tables of the revision


@dataclass(frozen=True)
class Cell:
    """One cell: text, a second line in small type, a mark for its kind, a target inside the report."""

    text: str
    small: str = ""
    kind: str = ""
    target: str = ""


@dataclass(frozen=True)
class Column:
    """The head of a column; its kind is ``n`` for numbers, ``id`` for names that are not broken, or nothing."""

    text: str
    kind: str = ""
    small: str = ""


_KINDS = {"#": "n", "=": "id"}


def make_column(head: str | Column) -> Column:
    """A column from its head: ``#`` before it marks numbers, ``=`` marks names."""
    if isinstance(head, Column):
        return head
    kind = _KINDS.get(head[:1], "")
    return Column(head[1:] if kind else head, kind)


@dataclass(frozen=True)
class Table:
    """A table with a caption.

    Attributes
    ----------
    caption : str
    columns : tuple of Column
    rows : tuple of tuple of Cell
        The first cell of a row is its head.
    note : str
        A sentence below the table.
    """

    caption: str
    columns: tuple[Column, ...]
    rows: tuple[tuple[Cell, ...], ...]
    note: str = ""
    foot: tuple[Cell, ...] = field(default=())


def make_table(
    caption: str,
    columns: list[str | Column],
    rows: list[list[object]],
    note: str = "",
    foot: list[object] | None = None,
) -> Table | None:
    """Build a table; text becomes cells; no rows, no table.

    Parameters
    ----------
    caption, note : str
        See `Table`.
    columns : list of str or Column
        Heads, see `make_column`.
    rows : list of list
        Text or `Cell` for each column.
    foot : list, optional
        A last row with totals.

    Returns
    -------
    Table or None
    """
    if not rows:
        return None
    return Table(
        caption,
        tuple(make_column(head) for head in columns),
        tuple(_cells(row) for row in rows),
        note,
        _cells(foot or []),
    )


def _cells(row: list[object]) -> tuple[Cell, ...]:
    return tuple(cell if isinstance(cell, Cell) else Cell(str(cell)) for cell in row)


def limited(rows: list, file: str) -> tuple[list, str]:
    """The first rows of a long list, and a sentence that says where the others are."""
    if len(rows) <= MOST_ROWS:
        return rows, ""
    return rows[:MOST_ROWS], f"The first {MOST_ROWS} of {len(rows)} rows; all of them stand in tables/{file}."
