"""Reading a published revision: every file is checked against the manifest before it is used."""

from __future__ import annotations

import csv
import os
from collections.abc import Iterator, Mapping
from contextlib import contextmanager
from dataclasses import dataclass, field
from functools import cached_property
from pathlib import Path
from typing import TYPE_CHECKING

from fitlib.errors import InputError, Problem, VerificationError
from fitlib.revision.disk import load_json, read_regular, sha256
from fitlib.revision.frames import frame_of, rows_of
from fitlib.revision.manifest import MANIFEST, listed_files, load_manifest
from fitlib.revision.names import printable, revision_number, study_folder

if TYPE_CHECKING:
    import pandas

NOT_READ_HERE = "holds what this program does not read"
#: What content of another form than this program writes can raise.
UNREADABLE = (ValueError, KeyError, TypeError, AttributeError, IndexError, ArithmeticError, RecursionError, csv.Error)


@dataclass(frozen=True)
class Revision:
    """One published revision, read as it is asked for.

    Attributes
    ----------
    path : Path
        Its folder.
    name : str
        Name under which it was published, whatever the folder is called now.
    study : str
        Name of the study.
    manifest : dict
        What ``manifest.json`` holds.
    """

    path: Path
    name: str
    study: str
    manifest: dict = field(repr=False, compare=False)

    @cached_property
    def files(self) -> tuple[str, ...]:
        """Relative paths of all files that the manifest lists."""
        return tuple(sorted(self._listed))

    @cached_property
    def _listed(self) -> dict[str, dict]:
        return listed_files(self.manifest)

    @property
    def inputs(self) -> dict[str, str]:
        """SHA-256 of each input by its path relative to the study."""
        return {path.removeprefix("inputs/"): item["sha256"] for path, item in self.manifest["inputs"].items()}

    def read_bytes(self, path: str) -> bytes:
        """Bytes of one file of the revision.

        Parameters
        ----------
        path : str
            Relative path, as the manifest lists it.

        Returns
        -------
        bytes

        Raises
        ------
        VerificationError
            If the revision has no such file, or it is not what was published.
        """
        place = f"{self.path}/{printable(path)}"
        record = self._listed.get(path)
        if record is None:
            raise VerificationError(f"{place}: not part of the revision")
        try:
            data = read_regular(self._inside(path))
        except OSError as error:
            raise VerificationError(f"{place}: cannot be read: {error.strerror or error}") from None
        if sha256(data) != record["sha256"]:
            raise VerificationError(f"{place}: altered since it was published; fitlib verify tells all of it")
        return data

    def _inside(self, path: str) -> Path:
        """The file's place, provided that no folder on the way is a link."""
        place = self.path / path
        if os.path.realpath(place.parent) != os.path.join(os.path.realpath(self.path), *path.split("/")[:-1]):
            raise OSError("a link stands on the way")
        return place

    @contextmanager
    def _reading(self, path: str) -> Iterator[None]:
        """A file may have the digest that the manifest gives and still hold what nobody foresaw."""
        try:
            yield
        except UNREADABLE:
            raise VerificationError(f"{self.path}/{printable(path)}: {NOT_READ_HERE}") from None

    def read_json(self, path: str) -> object:
        """What a JSON file of the revision holds; raises like ``read_bytes``."""
        data = self.read_bytes(path)
        try:
            return load_json(data)
        except ValueError as error:
            raise VerificationError(f"{self.path}/{printable(path)}: not readable as JSON ({error})") from None

    @cached_property
    def resolved(self) -> dict:
        """The study with every default spelled out."""
        return self._object("resolved.json")

    def _object(self, path: str) -> dict:
        content = self.read_json(path)
        if not isinstance(content, dict):
            raise VerificationError(f"{self.path}/{printable(path)}: {NOT_READ_HERE}")
        return content

    @cached_property
    def table_names(self) -> tuple[str, ...]:
        """Names of the tables, without ``.csv``."""
        paths = (path for path in self.files if path.startswith("tables/") and path.endswith(".csv"))
        return tuple(path.removeprefix("tables/").removesuffix(".csv") for path in paths)

    def rows(self, name: str) -> Iterator[dict[str, str]]:
        """Rows of a table as text, with the guards of text cells taken off; cheaper than a frame.

        Parameters
        ----------
        name : str
            Name of the table, without ``.csv``.

        Returns
        -------
        iterator of dict
        """
        path = f"tables/{name}.csv"
        data, types = self.read_bytes(path), self._types(name)

        def guarded() -> Iterator[dict[str, str]]:
            with self._reading(path):
                yield from rows_of(data, types)

        return guarded()

    def table(self, name: str) -> pandas.DataFrame:
        """A table as a pandas frame, with the types that ``columns.csv`` gives.

        Parameters
        ----------
        name : str
            Name of the table, without ``.csv``.

        Returns
        -------
        pandas.DataFrame
            Text as text (an empty cell is an empty string), other empty cells as missing values.

        Raises
        ------
        VerificationError
            If there is no such table, or it was altered.
        """
        path = f"tables/{name}.csv"
        data, types = self.read_bytes(path), self._types(name)
        with self._reading(path):
            return frame_of(data, types)

    def _types(self, name: str) -> dict[str, str]:
        return self._column_types.get(f"{name}.csv", {})

    @cached_property
    def _column_types(self) -> dict[str, dict[str, str]]:
        types: dict[str, dict[str, str]] = {}
        path = "tables/columns.csv"
        data = self.read_bytes(path)
        with self._reading(path):
            for row in rows_of(data, {}):
                types.setdefault(row["table"], {})[row["column"]] = row["type"]
        return types

    @cached_property
    def chosen(self) -> pandas.DataFrame:
        """What was chosen for each dataset: the table ``chosen``."""
        return self.table("chosen")

    @cached_property
    def functions(self) -> Mapping[str, dict]:
        """The issued function of each dataset that has one, by dataset id."""
        paths = (path for path in self.files if path.startswith("functions/") and path.endswith(".json"))
        return {self._dataset(path, record): record for path in paths for record in [self._object(path)]}

    def _dataset(self, path: str, record: dict) -> str:
        if not isinstance(record.get("dataset"), str):
            raise VerificationError(f"{self.path}/{printable(path)}: {NOT_READ_HERE}")
        return record["dataset"]


def read_revision(path: str | Path) -> Revision:
    """Open a published revision.

    Parameters
    ----------
    path : str or Path
        Its folder; a copy anywhere will do.

    Returns
    -------
    Revision

    Raises
    ------
    InputError
        If there is no such folder.
    VerificationError
        If its manifest is missing or damaged.
    """
    folder = Path(path)
    if not folder.is_dir():
        raise InputError([Problem(str(path), "no such folder; the folder of a revision is wanted")])
    manifest = load_manifest(folder)
    name, study = manifest["history"].get("revision"), manifest.get("study")
    if not isinstance(name, str) or revision_number(name) is None or not isinstance(study, str):
        raise VerificationError(f"{folder / MANIFEST}: damaged: it names no revision or no study")
    return Revision(folder, name, study, manifest)


def latest_revision(results_dir: str | Path, study_name: str) -> Path | None:
    """Folder of the latest revision of a study.

    Parameters
    ----------
    results_dir : str or Path
        Folder of all results.
    study_name : str

    Returns
    -------
    Path or None
        None when there is no revision yet.
    """
    folder = study_folder(results_dir, study_name)
    numbers = revision_folders(folder)
    return folder / numbers[max(numbers)] if numbers else None


def revision_folders(folder: Path) -> dict[int, str]:
    """Names of the revisions in a study's folder by number; links do not count."""
    if not folder.is_dir():
        return {}
    with os.scandir(folder) as entries:
        names = [entry.name for entry in entries if entry.is_dir(follow_symlinks=False)]
    return {number: name for name in names if (number := revision_number(name)) is not None}
