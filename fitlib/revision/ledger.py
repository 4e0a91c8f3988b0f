"""The numbers of revisions that were ever published, so that none is used twice, even after a folder was removed."""

from __future__ import annotations

import os
import re
from collections.abc import Iterable, Mapping
from pathlib import Path

from fitlib.errors import FitlibError
from fitlib.revision.disk import digest_of, read_regular, sync_folder
from fitlib.revision.manifest import MANIFEST
from fitlib.revision.names import LAST_NUMBER, revision_name, revision_number

LEDGER = ".revisions"
_LINE = re.compile(r"(rev-\d{4,9})  ([0-9a-f]{64}|-)")


def read_ledger(folder: Path) -> dict[int, str]:
    """SHA-256 of the manifest (``-`` when unknown) by number; lines that are not understood do not count."""
    try:
        text = read_regular(folder / LEDGER).decode("utf-8", "replace")
    except OSError:
        return {}
    matches = filter(None, map(_LINE.fullmatch, text.splitlines()))
    return {revision_number(match[1]): match[2] for match in matches}


def write_ledger(folder: Path, entries: Mapping[int, str]) -> None:
    """Replace the ledger in one step.

    Raises
    ------
    OSError
        If it cannot be written.
    """
    temporary = folder / f"{LEDGER}.new"
    text = "".join(f"{revision_name(number)}  {digest}\n" for number, digest in sorted(entries.items()))
    with open(temporary, "w", encoding="utf-8", newline="\n") as file:
        file.write(text)
        file.flush()
        os.fsync(file.fileno())
    os.replace(temporary, folder / LEDGER)
    sync_folder(folder)


def next_number(folder: Path, taken: Iterable[int]) -> int:
    """The number after all those that are taken.

    Raises
    ------
    FitlibError
        If there is none that a revision's name can hold.
    """
    number = max(taken, default=0) + 1
    if number > LAST_NUMBER:
        message = f"no number is left for another revision: move {revision_name(LAST_NUMBER)} away"
        raise FitlibError(f"{folder}: {message}, and take its line out of {LEDGER} if it has one")
    return number


def differs_from_ledger(path: Path) -> bool:
    """Whether the ledger beside a revision gives another SHA-256 of its manifest.

    Parameters
    ----------
    path : Path
        Folder of the revision. A copy that stands elsewhere, or has another name, has no ledger to differ from.

    Returns
    -------
    bool
    """
    place = Path(os.path.abspath(path))
    number = revision_number(place.name)
    told = None if number is None else read_ledger(place.parent).get(number)
    try:
        return told not in (None, "-") and digest_of(place / MANIFEST)[0] != told
    except OSError:
        return True


def numbers_in(folder: Path) -> set[int]:
    """Numbers taken by any entry of a study's folder, be it a file or a link."""
    return {number for name in os.listdir(folder) if (number := revision_number(name)) is not None}
