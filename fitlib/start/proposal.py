"""Proposes a study from a data file: reads it, guesses, counts, and writes a commented study."""

from __future__ import annotations

import re
import unicodedata
from os import PathLike, fspath
from pathlib import Path

import numpy as np

from fitlib.errors import InputError, Problem
from fitlib.observations import sources
from fitlib.observations.faults import Faults
from fitlib.observations.numbers import read_number
from fitlib.observations.tables import Table, read_table, sniff_delimiter
from fitlib.observations.wording import listed, quoted
from fitlib.start.counts import Counts, count
from fitlib.start.guess import Guess, guess_columns, profiles, sniff_decimal
from fitlib.start.writing import Proposal, write_study_text

LONGEST_NAME = 60


def study_name(text: str) -> str:
    """A name for the `study` key made from any text: small letters, digits and hyphens."""
    plain = unicodedata.normalize("NFKD", text).encode("ascii", "ignore").decode("ascii").lower()
    name = re.sub(r"[^a-z0-9]+", "-", plain).strip("-")[:LONGEST_NAME].rstrip("-")
    return name or "study"


def _dataset_id(stem: str) -> str:
    visible = "".join(mark for mark in stem if mark.isprintable()).strip()[:100].strip()
    return visible or "dataset"


def _fail(path: str, message: str, line: int | None = None) -> InputError:
    return InputError([Problem(path, message, line=line)])


def _read(path: str) -> tuple[Table, str]:
    """Table of the file and its decimal mark.

    Raises
    ------
    InputError
        When the file cannot be read as a table.
    """
    faults = Faults(path)
    size = sources.size_of(Path(path))
    if size > sources.BYTES_PER_DATASET:
        raise _fail(path, f"the file holds {size} bytes; at most {sources.BYTES_PER_DATASET} can be read")
    data = sources.read_bytes(Path(path), faults)
    text = None if data is None else sources.decode(data, faults)
    if text is not None and sources.count_rows(text) > sources.ROWS_PER_DATASET:
        raise _fail(path, f"the file holds more than {sources.ROWS_PER_DATASET} rows; no more can be read")
    table = None if text is None else read_table(text, Path(path).name, sniff_delimiter(text), "point", faults)
    if len(faults):
        raise InputError(faults.problems())
    if all(any(read_number(name, mark) is not None for mark in ("point", "comma")) for name in table.header if name):
        raise _fail(path, "the first row holds numbers and no names; a header row is expected", line=1)
    return table, sniff_decimal(table)


def _check_names(path: str, guesses: dict[str, Guess]) -> None:
    for guess in guesses.values():
        if not guess.column.isprintable() or len(guess.column) > 100:
            found = quoted(guess.column)
            raise _fail(path, f"column name {found} must be printable and at most 100 characters long", line=1)


def _counted(path: str, table: Table, decimal: str, guesses: dict[str, Guess]) -> Counts:
    numbers = {column.name: column.numbers for column in profiles(table, decimal)}
    series = table.column(guesses["series"].column) if "series" in guesses else [""] * len(table.rows)
    label = numbers[guesses["level"].column] if "level" in guesses else None
    counts = count(numbers[guesses["stimulus"].column], numbers[guesses["response"].column], label, series)
    if counts is None or counts.levels < 2:
        column = quoted(guesses["stimulus"].column)
        raise _fail(path, f"column {column}, taken for the stimulus, has fewer than two levels; a study needs more")
    return counts


def propose_study(csv_path: str | PathLike[str], name: str | None = None) -> str:
    """Propose a study for one data file. Nothing is written.

    Parameters
    ----------
    csv_path : str or path-like
        The data file. The study is meant to stand in the same folder.
    name : str, optional
        For the `study` key; made from the file's name when left out. Other characters than small letters, digits and
        hyphens are replaced.

    Returns
    -------
    str
        The text of a study file, with comments that say what was guessed and how sure that is.

    Raises
    ------
    InputError
        When the file cannot be read as a table, or holds no two columns of numbers or no two levels.
    """
    path = str(fspath(csv_path))
    table, decimal = _read(path)
    columns = profiles(table, decimal)
    guesses = guess_columns(columns)
    if not guesses:
        numeric = [quoted(column.name) for column in columns if column.numeric]
        found = f"only {listed(numeric)}" if numeric else "none"
        raise _fail(path, f"two columns of numbers are needed, stimulus and response; {found} found in the file")
    _check_names(path, guesses)
    counts = _counted(path, table, decimal, guesses)
    known = {column.name: column.numbers for column in columns}
    return write_study_text(
        Proposal(
            name=study_name(name or Path(path).stem),
            dataset=_dataset_id(Path(path).stem),
            file=Path(path).name,
            delimiter=table.delimiter,
            decimal=decimal,
            guesses=guesses,
            counts=counts,
            others=tuple(
                column for column in table.header if column and column not in {g.column for g in guesses.values()}
            ),
            falling=_is_falling(known[guesses["stimulus"].column], known[guesses["response"].column]),
        )
    )


def _is_falling(stimulus: np.ndarray, response: np.ndarray) -> bool:
    known = np.isfinite(stimulus) & np.isfinite(response)
    centred = stimulus[known] - stimulus[known].mean()
    return bool(np.dot(centred, response[known] - response[known].mean()) < 0)


def write_new(text: str, path: str | PathLike[str]) -> Path:
    """Write a study to a file that does not exist yet.

    Parameters
    ----------
    text : str
    path : str or path-like

    Returns
    -------
    pathlib.Path

    Raises
    ------
    InputError
        When the file exists (it is left as it is) or cannot be written.
    """
    target = Path(path)
    try:
        with target.open("x", encoding="utf-8", newline="\n") as stream:
            stream.write(text)
    except FileExistsError:
        raise _fail(str(fspath(path)), "the file exists already and is left as it is; name another one") from None
    except OSError as error:
        raise _fail(str(fspath(path)), f"cannot be written: {error.strerror or error}") from None
    return target
