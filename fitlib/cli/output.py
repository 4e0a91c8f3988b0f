"""What a command writes: aligned tables, new files that replace nothing, CSV text."""

from __future__ import annotations

import os
import sys
import tempfile
from collections.abc import Iterable, Sequence

from fitlib.errors import FitlibError, InputError, Problem


def say(text: str = "") -> None:
    """Write one line to standard output."""
    print(text)


def tell(text: str) -> None:
    """Write one line to standard error, in the name of the program."""
    print(text, file=sys.stderr)


def counted(number: int, noun: str, plural: str = "") -> str:
    """Return ``1 dataset`` or ``2 datasets``."""
    return f"{number} {noun if number == 1 else plural or noun + 's'}"


def align(header: Sequence[str], rows: Iterable[Sequence[str]], right: frozenset[str] | set[str] = frozenset()) -> str:
    """Return a table with aligned columns, two spaces apart.

    Parameters
    ----------
    header : sequence of str
    rows : iterable of sequences of str
        Cells in the order of the header.
    right : set of str
        Columns whose cells are aligned to the right.

    Returns
    -------
    str
        Lines without trailing spaces, no line end after the last.
    """
    table = [tuple(header), *(tuple(row) for row in rows)]
    widths = [max(len(cell) for cell in column) for column in zip(*table, strict=True)]
    sides = [str.rjust if name in right else str.ljust for name in header]
    return "\n".join(
        "  ".join(side(cell, width) for side, cell, width in zip(sides, row, widths, strict=True)).rstrip()
        for row in table
    )


def shorten(text: str, width: int) -> str:
    """Return the text, cut with an ellipsis when longer than ``width``."""
    return text if len(text) <= width else text[: width - 1] + "…"


def refuse_existing(path: str) -> None:
    """Stop when something stands at ``path`` already: no command replaces a file.

    Parameters
    ----------
    path : str

    Raises
    ------
    InputError
    """
    if os.path.lexists(path):
        raise InputError([Problem(file=path, message="exists already and is not replaced; give another --output")])


def write_new_file(path: str, text: str) -> None:
    """Write a file in one step, whole or not at all, and never over another one.

    Parameters
    ----------
    path : str
        Where; its folder must exist.
    text : str
        Written as UTF-8 with ``\\n`` line ends.

    Raises
    ------
    InputError
        The file exists already, or its folder does not.
    FitlibError
        The file cannot be written.
    """
    refuse_existing(path)
    folder = os.path.dirname(path) or "."
    if not os.path.isdir(folder):
        raise InputError([Problem(file=path, message=f"the folder {folder} does not exist")])
    try:
        _write_beside_and_link(path, folder, text)
    except FileExistsError:
        refuse_existing(path)
        raise
    except OSError as error:
        raise FitlibError(f"{path}: cannot be written: {error.strerror or error}") from error


def _write_beside_and_link(path: str, folder: str, text: str) -> None:
    descriptor, temporary = tempfile.mkstemp(prefix=".fitlib-", dir=folder)
    try:
        with open(descriptor, "w", encoding="utf-8", newline="\n") as file:
            file.write(text)
            file.flush()
            os.fsync(file.fileno())
        os.chmod(temporary, 0o666 & ~_umask())
        _link_or_rename(temporary, path)
    finally:
        if os.path.lexists(temporary):
            os.unlink(temporary)


def _link_or_rename(temporary: str, path: str) -> None:
    """A hard link fails where a file stands already; a file system without links gets a checked rename."""
    try:
        os.link(temporary, path)
    except OSError:
        refuse_existing(path)
        os.replace(temporary, path)


def _umask() -> int:
    mask = os.umask(0)
    os.umask(mask)
    return mask
