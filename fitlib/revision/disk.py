"""Reading and writing files so that nothing is half written and no link is followed."""

from __future__ import annotations

import hashlib
import json
import os
import stat
from collections.abc import Iterator
from contextlib import suppress
from pathlib import Path

from fitlib.revision.names import is_safe

_NOFOLLOW = getattr(os, "O_NOFOLLOW", 0)
_BINARY = getattr(os, "O_BINARY", 0)
_CHUNK = 1 << 20


def sha256(data: bytes) -> str:
    """SHA-256 in hexadecimal."""
    return hashlib.sha256(data).hexdigest()


def dump_json(obj: object) -> str:
    """JSON text, the same bytes for the same content (as in ``fitlib.collect``, which lies beside, not below)."""
    return json.dumps(obj, sort_keys=True, allow_nan=False, ensure_ascii=False, indent=2) + "\n"


def load_json(data: bytes) -> object:
    """What a JSON text holds.

    Raises
    ------
    ValueError
        If it is not JSON, a key appears twice, or it nests too deep.
    """
    try:
        return json.loads(data.decode("utf-8"), object_pairs_hook=_once)
    except RecursionError:
        raise ValueError("nested too deep") from None


def _once(pairs: list[tuple[str, object]]) -> dict:
    keys = [key for key, _ in pairs]
    repeated = {key for key in keys if keys.count(key) > 1} if len(set(keys)) < len(keys) else set()
    if repeated:
        raise ValueError(f"a key appears twice: {', '.join(sorted(repeated))}")
    return dict(pairs)


def read_regular(path: Path) -> bytes:
    """Bytes of a regular file.

    Raises
    ------
    OSError
        If it cannot be read, or is a link or no regular file.
    """
    descriptor = os.open(path, os.O_RDONLY | _NOFOLLOW | _BINARY | getattr(os, "O_NONBLOCK", 0))
    with os.fdopen(descriptor, "rb") as file:
        if not stat.S_ISREG(os.fstat(descriptor).st_mode):
            raise OSError(f"{path} is not a regular file")
        return file.read()


def digest_of(path: Path) -> tuple[str, int]:
    """SHA-256 and size of a regular file, read in pieces."""
    total, size = hashlib.sha256(), 0
    descriptor = os.open(path, os.O_RDONLY | _NOFOLLOW | _BINARY)
    with os.fdopen(descriptor, "rb") as file:
        while piece := file.read(_CHUNK):
            total.update(piece)
            size += len(piece)
    return total.hexdigest(), size


def write_new(folder: Path, relative: str, data: bytes) -> None:
    """Write a file that is not there yet and take away the right to write; ``sync_tree`` brings it to the disk.

    Raises
    ------
    ValueError
        If the path leaves the folder: a fault of the program.
    OSError
        If it cannot be written, or is there already.
    """
    _write(folder, relative, iter([data]))


def copy_new(source: Path, folder: Path, relative: str) -> dict:
    """Copy a file as ``write_new`` writes one; return digest and size of what was copied.

    Raises
    ------
    OSError
        If it cannot be read or written.
    """
    total, size = hashlib.sha256(), 0

    def pieces() -> Iterator[bytes]:
        nonlocal size
        with open(source, "rb") as file:
            while piece := file.read(_CHUNK):
                total.update(piece)
                size += len(piece)
                yield piece

    _write(folder, relative, pieces())
    return {"sha256": total.hexdigest(), "size": size}


def _write(folder: Path, relative: str, pieces: Iterator[bytes]) -> None:
    if not is_safe(relative):
        raise ValueError(f"{relative!r} does not stay inside the revision")
    path = folder / relative
    path.parent.mkdir(parents=True, exist_ok=True)
    descriptor = os.open(path, os.O_WRONLY | os.O_CREAT | os.O_EXCL | _NOFOLLOW | _BINARY, 0o666)
    with os.fdopen(descriptor, "wb") as file:
        for piece in pieces:
            file.write(piece)
    with suppress(OSError):  # some shares know no rights; the digests still tell what was altered
        os.chmod(path, stat.S_IMODE(os.stat(path).st_mode) & ~0o222)


def sync_tree(folder: Path) -> None:
    """Bring every file and folder below a folder to the disk.

    All at once at the end, since then the first call carries most of the work of the others.

    Raises
    ------
    OSError
        If the content of a file cannot be brought to the disk.
    """
    for relative, entry in walk(folder):
        if entry.is_file(follow_symlinks=False):
            descriptor = os.open(folder / relative, os.O_RDONLY | _NOFOLLOW | _BINARY)
            try:
                os.fsync(descriptor)
            finally:
                os.close(descriptor)
    for inner in [folder, *(entry for entry in folder.rglob("*") if entry.is_dir())]:
        sync_folder(inner)


def sync_folder(folder: Path) -> None:
    """Bring the entries of one folder to the disk, where the system can."""
    with suppress(OSError):
        descriptor = os.open(folder, os.O_RDONLY)
        try:
            os.fsync(descriptor)
        finally:
            os.close(descriptor)


def walk(folder: Path, prefix: str = "") -> Iterator[tuple[str, os.DirEntry]]:
    """Every entry below a folder with its relative path, sorted; links are named and not followed."""
    with os.scandir(folder) as entries:
        for entry in sorted(entries, key=lambda item: item.name):
            relative = prefix + entry.name
            yield relative, entry
            if entry.is_dir(follow_symlinks=False):
                yield from walk(Path(entry.path), f"{relative}/")
