"""File names in a study: relative to its folder, and never outside it."""

from __future__ import annotations

import os
import re
from dataclasses import dataclass
from fnmatch import fnmatchcase
from functools import cached_property
from pathlib import Path

from fitlib.study.shown import shown

DRIVE = re.compile(r"[A-Za-z]:")
STUDY_COPY = "study.yaml"  # the name of the study's copy in the inputs of a revision


class PathFault(ValueError):
    """A file name that cannot be used; the message says why."""


def relative_name(text: str) -> str:
    """Return a file name with forward slashes and without ``.`` parts.

    Raises
    ------
    PathFault
        For an absolute name, a backslash, a drive letter or a ``..`` part.
    """
    if "\\" in text:
        raise PathFault(f"{shown(text)} has a backslash; write folders with /")
    if text.startswith("/") or DRIVE.match(text):
        raise PathFault(f"{shown(text)} is absolute; write it relative to the study's folder")
    parts = [part for part in text.split("/") if part not in ("", ".")]
    if ".." in parts:
        raise PathFault(f"{shown(text)} leaves the study's folder by ..; put the file inside it")
    if not parts:
        raise PathFault(f"{shown(text)} names no file")
    return "/".join(parts)


@dataclass(frozen=True)
class StudyFolder:
    """The folder of a study and the study file in it."""

    folder: Path
    study_file: Path

    @cached_property
    def root(self) -> str:
        """The folder with all links followed."""
        return os.path.realpath(self.folder)

    @cached_property
    def _study(self) -> str:
        return os.path.realpath(self.study_file)

    def file(self, text: str) -> str:
        """Return the relative name of a data file that can be used.

        Raises
        ------
        PathFault
            The name is refused, leads out of the folder through a link, is not there, is no file, or is the study.
        """
        name = relative_name(text)
        if name.casefold() == STUDY_COPY:
            raise PathFault(f"{shown(text)} is the name kept for the study; give the data file another")
        place = os.path.join(self.folder, name)
        try:
            real = os.path.realpath(place)
            inside = os.path.commonpath([real, self.root]) == self.root
            known, is_file = os.path.lexists(place), os.path.isfile(place)
        except (OSError, ValueError):
            raise PathFault(f"{shown(text)} cannot be a file name") from None
        if not inside:
            raise PathFault(f"{shown(text)} leaves the study's folder through a link; put the file inside it")
        if not known:
            raise PathFault(f"there is no file {shown(text)} in the study's folder")
        if not is_file:
            raise PathFault(f"{shown(text)} is not an ordinary file")
        if real == self._study:
            raise PathFault(f"{shown(text)} is the study itself, not a data file")
        return name

    def same_file(self, name: str) -> str:
        """Return the file that a relative name leads to, for finding one file under two names."""
        return os.path.realpath(os.path.join(self.folder, name))

    def matches(self, pattern: str) -> list[str]:
        """Return the relative names of the files that a pattern matches, sorted.

        ``*``, ``?`` and ``[abc]`` match within one folder. Names that start with a point
        match only a pattern that does.

        Raises
        ------
        PathFault
            The pattern is refused, or matches no file.
        """
        parts = relative_name(pattern).split("/")
        if any("**" in part for part in parts):
            raise PathFault(f"{shown(pattern)} has **; a star matches within one folder")
        found = [""]
        for part in parts:
            found = [name for start in found for name in self._entries(start, part)]
        files = sorted(name for name in found if not os.path.isdir(os.path.join(self.folder, name)))
        if not files:
            raise PathFault(f"{shown(pattern)} matches no file in the study's folder")
        return files

    def _entries(self, start: str, part: str) -> list[str]:
        try:
            names = os.listdir(os.path.join(self.folder, start))
        except (OSError, ValueError):
            return []
        visible = (name for name in names if part.startswith(".") or not name.startswith("."))
        return [f"{start}/{name}" if start else name for name in visible if fnmatchcase(name, part)]
