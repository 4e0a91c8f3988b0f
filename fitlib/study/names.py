"""Names for files and folders that hold for any dataset id, on any file system."""

from __future__ import annotations

import hashlib
import re
import unicodedata

SAFE = re.compile(r"[A-Za-z0-9][A-Za-z0-9._-]{0,59}")
DEVICES = frozenset({"con", "prn", "aux", "nul"} | {f"{port}{n}" for port in ("com", "lpt") for n in range(10)})


def file_name_of(dataset_id: str) -> str:
    """Return the name under which the files of a dataset stand.

    Parameters
    ----------
    dataset_id : str

    Returns
    -------
    str
        The id where it is a safe file name (`SAFE`, no name of a device, no point at its end), else ``d~`` and 16
        hexadecimal digits of its SHA-256.
    """
    device = dataset_id.split(".")[0].lower() in DEVICES
    if SAFE.fullmatch(dataset_id) and not device and not dataset_id.endswith("."):
        return dataset_id
    return f"d~{hashlib.sha256(dataset_id.encode('utf-8')).hexdigest()[:16]}"


def same_name(dataset_id: str) -> str:
    """Return the form in which two ids are compared: without case, and with one spelling of accented letters."""
    return unicodedata.normalize("NFC", unicodedata.normalize("NFC", dataset_id).casefold())


def id_fault(dataset_id: str) -> str | None:
    """Return what is wrong with a dataset id, or None."""
    if not dataset_id or dataset_id != dataset_id.strip():
        return "printable text without spaces at its ends"
    if not dataset_id.isprintable():
        return "printable text (no line breaks or hidden characters)"
    if len(dataset_id) > 100:
        return f"at most 100 characters (this has {len(dataset_id)})"
    return None
