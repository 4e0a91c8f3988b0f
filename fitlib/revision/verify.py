"""Is a revision still what its manifest says?"""

from __future__ import annotations

import os
from collections.abc import Iterator
from dataclasses import dataclass
from pathlib import Path

from fitlib.errors import FitlibError, InputError, Problem, VerificationError
from fitlib.revision.disk import digest_of, read_regular, sha256, walk
from fitlib.revision.ledger import LEDGER, differs_from_ledger
from fitlib.revision.manifest import MANIFEST, RUN, SEAL, listed_files, load_manifest, read_seal
from fitlib.revision.names import printable


@dataclass(frozen=True)
class Difference:
    """One file that is not as the manifest says.

    Attributes
    ----------
    kind : {"altered", "missing", "extra", "link", "damaged"}
    path : str
        Relative to the revision.
    message : str
    """

    kind: str
    path: str
    message: str

    def __str__(self) -> str:
        return f"{printable(self.path)}: {self.message}"


def verify_revision(path: str | Path) -> list[Difference]:
    """Compare every file of a revision with its manifest.

    It tells of accidents and of careless edits. Whoever rewrites the manifest and ``run.sha256`` too is found out by
    the study's list of revisions (``.revisions``), while the revision stands where it was published; whoever rewrites
    that as well leaves no trace here: keep the manifest's SHA-256 elsewhere if that matters.

    Parameters
    ----------
    path : str or Path
        Folder of the revision; a copy anywhere will do.

    Returns
    -------
    list of Difference
        Empty when every file is as it was published; sorted by path.

    Raises
    ------
    InputError
        If there is no such folder.
    FitlibError
        If a folder in it cannot be read.
    """
    folder = Path(path)
    if not folder.is_dir():
        raise InputError([Problem(str(path), "no such folder; the folder of a revision is wanted")])
    try:
        found = dict(walk(folder))
    except OSError as error:
        raise FitlibError(f"{printable(str(error.filename))}: cannot be read: {error.strerror or error}") from error
    try:
        manifest = load_manifest(folder)
    except VerificationError as error:
        message = str(error).removeprefix(f"{folder / MANIFEST}: ")
        return [Difference("missing" if MANIFEST not in found else "damaged", MANIFEST, message)]
    listed = {name: record["sha256"] for name, record in listed_files(manifest).items()}
    listed |= _sealed(folder, found)
    differences = [*_missing(listed, found), *_present(listed, found)]
    if MANIFEST not in {difference.path for difference in differences} and differs_from_ledger(folder):
        differences.append(Difference("altered", MANIFEST, f"altered: its SHA-256 is not the one in {LEDGER}"))
    return sorted(differences, key=lambda difference: difference.path)


def _sealed(folder: Path, found: dict[str, os.DirEntry]) -> dict[str, str | None]:
    """Digests that ``run.sha256`` gives, and under its own name None where it has not the form it was published in."""
    unknown = {SEAL: None, MANIFEST: None, RUN: None}
    if SEAL not in found or not found[SEAL].is_file(follow_symlinks=False):
        return unknown
    try:
        data = read_regular(folder / SEAL)
    except OSError:
        return unknown
    digests = read_seal(data)
    return unknown if digests is None else {SEAL: sha256(data), **digests}


def _missing(listed: dict, found: dict) -> Iterator[Difference]:
    for path in listed:
        if path not in found:
            yield Difference("missing", path, "missing")


def _present(listed: dict, found: dict[str, os.DirEntry]) -> Iterator[Difference]:
    folders = {path[:end] for path in listed for end, char in enumerate(path) if char == "/"}
    for path, item in found.items():
        if item.is_symlink():
            yield Difference("link", path, "a link, which a revision never holds; not followed")
        elif item.is_dir(follow_symlinks=False):
            if path in listed:
                yield Difference("altered", path, "altered: a folder stands where a file was")
            elif path not in folders:
                yield Difference("extra", path, "extra: a folder that is not part of the revision")
        elif not item.is_file(follow_symlinks=False):
            kind = "altered" if path in listed else "extra"
            yield Difference(kind, path, f"{kind}: neither a file nor a folder")
        elif path not in listed:
            yield Difference("extra", path, "extra: not part of the revision")
        else:
            yield from _altered(path, item, listed[path])


def _altered(path: str, item: os.DirEntry, digest: str | None) -> Iterator[Difference]:
    if digest is None:
        message = "altered: not two digests" if path == SEAL else f"cannot be checked: {SEAL} gives no SHA-256 of it"
        yield Difference("altered" if path == SEAL else "damaged", path, message)
        return
    try:
        same = digest_of(Path(item.path))[0] == digest
    except OSError as error:
        yield Difference("damaged", path, f"cannot be read: {error.strerror or error}")
        return
    if not same:
        yield Difference("altered", path, "altered: its SHA-256 is not the one published")
