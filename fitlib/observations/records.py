"""The observations of one dataset, frozen, and the account of the rows of each file."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

STATES = ("used", "excluded", "verification")


@dataclass(frozen=True)
class FileAccount:
    """What became of the rows of one file; read = used + excluded + verification + rejected.

    Attributes
    ----------
    file : str
        The file as the study names it.
    read, used, excluded, verification, rejected : int
        Numbers of rows; the header and blank lines are no rows.

    Raises
    ------
    AssertionError
        When the account does not balance: a fault of the program, never of the user.
    """

    file: str
    read: int
    used: int
    excluded: int
    verification: int
    rejected: int

    def __post_init__(self) -> None:
        total = self.used + self.excluded + self.verification + self.rejected
        if self.read != total:  # not an assert statement, which `python -O` would drop
            raise AssertionError(f"{self.file}: {self.read} rows read, but {total} accounted for")


@dataclass(frozen=True)
class Observations:
    """Observations of one dataset, one entry per row read, rows in file order, files in the study's order.

    Attributes
    ----------
    file : tuple of str
        The file of each row, as the study names it.
    row : ndarray of int, shape (n_rows,)
        Line number in the file; the header is line 1.
    series, direction : tuple of str
        Empty text when the study declares no such column; directions are ``rising`` or ``falling``.
    level : ndarray of float, shape (n_rows,)
        In the unit of the stimulus: the declared level, else the mean stimulus of the group. NaN for a row that is
        not used and lies at no level.
    stimulus, response : ndarray of float, shape (n_rows,)
        NaN where an excluded row cannot be read.
    state : tuple of str
        ``used``, ``excluded`` or ``verification``.
    reason : tuple of str
        Of an excluded row: ``reason (person, date)``.
    account : tuple of FileAccount
    notes : tuple of str
        Warnings for the reader.
    level_index : ndarray of int, shape (n_rows,)
        0 to L - 1, ascending by level; -1 for a row that is not used.
    dataset : str
        The id of the dataset.
    advice : tuple of (str, str)
        What a person may want to change before a run: key below the dataset (``families`` is the study's own), message.
    """

    file: tuple[str, ...]
    row: np.ndarray
    series: tuple[str, ...]
    direction: tuple[str, ...]
    level: np.ndarray
    stimulus: np.ndarray
    response: np.ndarray
    state: tuple[str, ...]
    reason: tuple[str, ...]
    account: tuple[FileAccount, ...]
    notes: tuple[str, ...]
    level_index: np.ndarray
    dataset: str = ""
    advice: tuple[tuple[str, str], ...] = ()
