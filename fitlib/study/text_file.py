"""Reads the study file: its bytes, and its text where it is UTF-8."""

from __future__ import annotations

import re
from pathlib import Path

from fitlib.errors import InputError, Problem

LARGEST = 1_000_000  # bytes
BOM = b"\xef\xbb\xbf"
NOT_TEXT = re.compile(
    "[^\t\n\r\x20-\x7e\x85\xa0-\ud7ff\ue000-\ufffd\U00010000-\U0010ffff]"
)  # YAML 1.2.2, rule c-printable


def read_bytes(path: str) -> bytes:
    """Return the bytes of the study file.

    Raises
    ------
    InputError
        The file is not there, is not a file, cannot be read or is larger than 1 MB.
    """
    try:
        place = Path(path)
        if place.is_dir():
            raise _refused(path, "this is a folder; name the study file in it")
        if place.exists() and not place.is_file():
            raise _refused(path, "this is not an ordinary file")
        with place.open("rb") as stream:
            text = stream.read(LARGEST + 1)
    except (FileNotFoundError, NotADirectoryError):
        raise _refused(path, "there is no such file") from None
    except (OSError, ValueError) as fault:
        raise _refused(path, f"the file cannot be read: {getattr(fault, 'strerror', None) or fault}") from None
    if len(text) > LARGEST:
        raise _refused(path, "the study is larger than 1 MB; list many datasets with ids_from")
    return text


def decode(path: str, data: bytes) -> str:
    """Return the text of the study, without a byte order mark.

    Raises
    ------
    InputError
        The bytes are not UTF-8, or hold a control character.
    """
    data = data.removeprefix(BOM)
    try:
        text = data.decode("utf-8")
    except UnicodeDecodeError as fault:
        line = data.count(b"\n", 0, fault.start) + 1
        found = f"byte 0x{data[fault.start]:02x} is not UTF-8 text; save the file as UTF-8"
        raise _refused(path, found, line) from None
    odd = NOT_TEXT.search(text)
    if odd:
        line = text.count("\n", 0, odd.start()) + 1
        raise _refused(path, f"the control character U+{ord(odd[0]):04X} is not allowed; remove it", line)
    return text


def _refused(path: str, message: str, line: int | None = None) -> InputError:
    return InputError([Problem(path, message, line)])
