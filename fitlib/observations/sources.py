"""From a file on disk to its text: size limits, byte order mark, encoding. Files are only ever read."""

from __future__ import annotations

import codecs
from pathlib import Path

from fitlib.observations.faults import Faults

BYTES_PER_DATASET = 200_000_000
ROWS_PER_DATASET = 1_000_000

_OTHER_MARKS = ((codecs.BOM_UTF16_LE, "UTF-16"), (codecs.BOM_UTF16_BE, "UTF-16"))


def read_bytes(path: Path, faults: Faults) -> bytes | None:
    """The bytes of a file, or None and one fault when it cannot be read."""
    try:
        return path.read_bytes()
    except FileNotFoundError:
        faults.add("file", None, "there is no such file")
    except IsADirectoryError:
        faults.add("file", None, "is a folder; a CSV file is expected")
    except OSError as error:
        faults.add("file", None, f"cannot be read: {error.strerror or error}")
    return None


def size_of(path: Path) -> int:
    """Bytes of a file; 0 when it cannot be asked (reading it will tell why)."""
    try:
        return path.stat().st_size
    except OSError:
        return 0


def decode(data: bytes, faults: Faults) -> str | None:
    """Text of a UTF-8 file, with or without byte order mark; None and one fault for another encoding."""
    for mark, name in _OTHER_MARKS:
        if data.startswith(mark):
            faults.add("encoding", 1, f"is encoded as {name} (byte order mark at byte 0); save it as UTF-8")
            return None
    try:
        return data.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        # The decoder counts from behind a byte order mark, the user from the start of the file.
        offset = error.start + (len(codecs.BOM_UTF8) if data.startswith(codecs.BOM_UTF8) else 0)
        line = _line_at(data, offset)
        message = f"byte {offset} (0x{data[offset]:02x}) is not UTF-8 text; save the file as UTF-8"
        faults.add("encoding", line, message)
        return None


def _line_at(data: bytes, offset: int) -> int:
    before = data[:offset].replace(b"\r\n", b"\n").replace(b"\r", b"\n")
    return before.count(b"\n") + 1


def count_rows(text: str) -> int:
    """Upper bound of the rows of a text without parsing it; exact counting only when it may matter."""
    ends = max(text.count("\n"), text.count("\r"))
    if ends <= ROWS_PER_DATASET:
        return ends
    lines = text.replace("\r\n", "\n").replace("\r", "\n").split("\n")
    return sum(1 for line in lines if line.strip()) - 1
