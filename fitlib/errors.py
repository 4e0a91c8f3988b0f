"""The errors that fitlib shows to its user, and the exit status that goes with each."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass


class FitlibError(Exception):
    """A failure that is told in plain words; the base of all errors raised on purpose."""

    exit_status = 1


@dataclass(frozen=True)
class Problem:
    """One fault of the user's input, and where it stands.

    Attributes
    ----------
    file : str
        The file as the user named it.
    message : str
        What was found and what is allowed.
    line, column : int or None
        Position in the file, counted from 1.
    key : str
        Dotted key in the study, for example ``validation[2].folds``.
    severity : {"error", "warning"}
    """

    file: str
    message: str
    line: int | None = None
    column: int | None = None
    key: str = ""
    severity: str = "error"

    def __str__(self) -> str:
        place = ":".join(str(part) for part in (self.file, self.line, self.column) if part is not None)
        return ": ".join(part for part in (place, self.key, self.message) if part)


class InputError(FitlibError):
    """The user's input cannot be used; carries every problem found, not only the first."""

    exit_status = 2

    def __init__(self, problems: Iterable[Problem]):
        self.problems = tuple(problems)
        super().__init__("\n".join(str(problem) for problem in self.problems))


class VerificationError(FitlibError):
    """A revision is not what its manifest says."""

    exit_status = 3


class DecisionError(FitlibError):
    """A verdict needs a person before work can go on."""

    exit_status = 4
