"""Faults of one file, collected in order and kept from flooding the reader."""

from __future__ import annotations

from fitlib.errors import Problem

SHOWN_PER_KIND = 20


class Faults:
    """Collects the faults of one data file.

    Parameters
    ----------
    file : str
        The file as the user would type it.
    key : str
        Dotted key of the dataset in the study.
    """

    def __init__(self, file: str, key: str = ""):
        self.file = file
        self.key = key
        self._found: list[tuple[str, int | None, str]] = []

    def __len__(self) -> int:
        return len(self._found)

    def add(self, kind: str, line: int | None, message: str) -> None:
        """Note one fault; `kind` groups the faults of which only the first twenty are shown."""
        self._found.append((kind, line, message))

    def problems(self) -> list[Problem]:
        """The faults by line; after twenty of one kind, one line says how many more there are."""
        shown: dict[str, int] = {}
        listed = []
        for kind, line, message in sorted(self._found, key=lambda fault: fault[1] or 0):
            shown[kind] = shown.get(kind, 0) + 1
            if shown[kind] <= SHOWN_PER_KIND:
                listed.append(Problem(self.file, message, line=line, key=self.key))
        for kind, count in shown.items():
            if count > SHOWN_PER_KIND:
                more = count - SHOWN_PER_KIND
                listed.append(Problem(self.file, f"{more} more of the same kind ({kind}), not listed", key=self.key))
        return listed
