"""Names of revisions and of files inside one: nothing read from a file is trusted."""

from __future__ import annotations

import re
import unicodedata
from pathlib import Path

from fitlib.errors import FitlibError

_REVISION = re.compile(r"rev-(\d{4,9})")
LAST_NUMBER = 999_999_999
_STUDY = re.compile(r"[a-z0-9][a-z0-9-]{0,59}")
# Marks that reorder or hide the text around them.
_INVISIBLE = frozenset("\u200b\u200e\u200f\u202a\u202b\u202c\u202d\u202e\u2060\u2066\u2067\u2068\u2069\ufeff")


def revision_name(number: int) -> str:
    """Name of a revision's folder: ``rev-0001``."""
    return f"rev-{number:04d}"


def revision_number(name: str) -> int | None:
    """Number in a revision's name; None for any other name."""
    match = _REVISION.fullmatch(name)
    return int(match.group(1)) if match else None


def study_folder(results_dir: str | Path, study_name: str) -> Path:
    """Folder of a study's revisions.

    Raises
    ------
    FitlibError
        If the name could lead elsewhere.
    """
    if not _STUDY.fullmatch(study_name):
        raise FitlibError(f"{printable(study_name)!r} cannot name a folder of results")
    return Path(results_dir) / study_name


def is_safe(path: object) -> bool:
    """Whether a relative path with ``/`` stays inside the folder that it is relative to."""
    if not isinstance(path, str) or not path or "\\" in path or "\0" in path:
        return False
    parts = path.split("/")
    return not any(part in ("", ".", "..") for part in parts) and not re.match(r"[A-Za-z]:", path)


def printable(text: str) -> str:
    r"""Text that no terminal acts upon: control characters and the like are written as ``\u001b``."""
    return "".join(f"\\u{ord(char):04x}" if _harmful(char) else char for char in text)


def _harmful(char: str) -> bool:
    return char in _INVISIBLE or unicodedata.category(char) in ("Cc", "Cs", "Zl", "Zp")
