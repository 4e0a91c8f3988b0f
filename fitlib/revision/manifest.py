"""The manifest of a revision: what is in it, with SHA-256 and size, and what each part follows from.

``manifest.json`` has three parts: facts that follow from the inputs (plan digest, seed, versions), the files that do so
(``inputs``, ``outputs``), and under ``history`` what depends on earlier revisions, too. So the same inputs give the
same manifest, but for ``history``. ``run.json`` (who, when) differs at each run; its digest and that of the manifest
itself stand in ``run.sha256``, in the form that common checksum tools read.
"""

from __future__ import annotations

import re
from collections.abc import Mapping
from pathlib import Path

from fitlib.errors import VerificationError
from fitlib.revision.disk import dump_json, load_json, read_regular, sha256
from fitlib.revision.names import is_safe, printable

FORMAT = 1
MANIFEST, RUN, SEAL = "manifest.json", "run.json", "run.sha256"
#: Files whose content depends on earlier revisions.
HISTORY_FILES = frozenset({"CHANGES.md", "changes.json", "report.html"})
#: Names that a publisher may not hand in.
RESERVED_FILES = frozenset({MANIFEST, RUN, SEAL, "CHANGES.md"})
_RESERVED_KEYS = frozenset({"format", "study", "inputs", "outputs", "history"})
#: Entries that a comparison tells of in another way.
FACTS_APART = _RESERVED_KEYS | {"seed", "versions"}
_SECTIONS = ("inputs", "outputs")
_DIGEST = re.compile(r"[0-9a-f]{64}")
_SEAL = re.compile(rb"([0-9a-f]{64})  manifest\.json\n([0-9a-f]{64})  run\.json\n")


def make_manifest(study: str, facts: Mapping, inputs: Mapping[str, dict], outputs: Mapping[str, dict]) -> dict:
    """The part of a manifest that follows from the inputs.

    Parameters
    ----------
    study : str
        Name of the study.
    facts : mapping
        JSON-able; plan digest, seed, versions.
    inputs : mapping of str to dict
        Digest and size of study and data by path relative to the study.
    outputs : mapping of str to dict
        Digest and size of results by path relative to the revision.

    Returns
    -------
    dict

    Raises
    ------
    ValueError
        If a fact has a name that the manifest itself uses.
    """
    clash = _RESERVED_KEYS.intersection(facts)
    if clash:
        raise ValueError(f"facts may not be called {', '.join(sorted(clash))}")
    sections = {"inputs": {f"inputs/{path}": item for path, item in inputs.items()}, "outputs": dict(outputs)}
    manifest = {"content_digest": sha256(dump_json(sections).encode()), **facts}
    return {**manifest, **sections, "format": FORMAT, "study": study}


def with_history(manifest: Mapping, revision: str, previous: dict | None, files: Mapping[str, bytes]) -> dict:
    """The whole manifest, with what depends on earlier revisions.

    Parameters
    ----------
    manifest : mapping
        From ``make_manifest``.
    revision : str
        Name of the new revision.
    previous : dict or None
        ``revision`` and ``manifest_sha256`` of the one before.
    files : mapping of str to bytes
        Files that depend on history.

    Returns
    -------
    dict
    """
    listed = {path: entry(data) for path, data in files.items()}
    return {**manifest, "history": {"revision": revision, "previous": previous, "files": listed}}


def entry(data: bytes) -> dict:
    """Digest and size of one file."""
    return {"sha256": sha256(data), "size": len(data)}


def seal_text(manifest: bytes, run: bytes) -> str:
    """Text of ``run.sha256``."""
    return f"{sha256(manifest)}  {MANIFEST}\n{sha256(run)}  {RUN}\n"


def read_seal(data: bytes) -> dict[str, str] | None:
    """Digests in ``run.sha256`` by file name; None when it does not have exactly the form of ``seal_text``."""
    match = _SEAL.fullmatch(data)
    return {MANIFEST: match[1].decode(), RUN: match[2].decode()} if match else None


def load_manifest(folder: Path) -> dict:
    """The manifest of a revision, with its form checked.

    Parameters
    ----------
    folder : Path

    Returns
    -------
    dict

    Raises
    ------
    VerificationError
        If it is missing, damaged, of a later format, or names a file outside the revision.
    """
    place = folder / MANIFEST
    try:
        manifest = load_json(read_regular(place))
    except FileNotFoundError:
        raise VerificationError(f"{place}: missing; without it the folder is no revision") from None
    except OSError as error:
        raise VerificationError(f"{place}: cannot be read: {error.strerror or error}") from None
    except ValueError as error:  # UnicodeDecodeError, JSONDecodeError
        raise VerificationError(f"{place}: damaged: not readable as JSON ({printable(str(error))})") from None
    fault = _fault(manifest)
    if fault:
        raise VerificationError(f"{place}: {fault}")
    return manifest


def listed_files(manifest: Mapping) -> dict[str, dict]:
    """Every file that a manifest lists, with digest and size."""
    return {**manifest["inputs"], **manifest["outputs"], **manifest["history"]["files"]}


def _fault(manifest: object) -> str:
    """What is wrong with a manifest's form; empty when nothing is."""
    if not isinstance(manifest, dict) or not isinstance(manifest.get("format"), int):
        return "damaged: not a manifest of a revision"
    if manifest["format"] > FORMAT:
        return f"format {manifest['format']} is later than this program reads (up to {FORMAT})"
    history = manifest.get("history")
    sections = [manifest.get(name) for name in _SECTIONS]
    sections.append(history.get("files") if isinstance(history, dict) else None)
    if not all(isinstance(section, dict) for section in sections):
        return "damaged: inputs, outputs and history.files must each be a list of files"
    return next((fault for section in sections for item in section.items() if (fault := _entry_fault(*item))), "")


def _entry_fault(path: str, record: object) -> str:
    if not is_safe(path):
        return f"damaged: {printable(path)!r} does not stay inside the revision"
    sound = isinstance(record, dict) and isinstance(record.get("sha256"), str) and isinstance(record.get("size"), int)
    if not sound or not _DIGEST.fullmatch(record["sha256"]):
        return f"damaged: {printable(path)} has no SHA-256 and size"
    return ""
