"""From entries of `datasets` to datasets: their ids and files, with `ids_from` expanded."""

from __future__ import annotations

from collections.abc import Iterable, Iterator
from dataclasses import dataclass
from pathlib import PurePosixPath
from typing import Any

from fitlib.study.models import DatasetPattern
from fitlib.study.names import id_fault, same_name
from fitlib.study.paths import PathFault, StudyFolder
from fitlib.study.shown import shown
from fitlib.study.unknown import UNKNOWN, Finding, UnknownValue


@dataclass(frozen=True)
class Found:
    """One dataset: its id, its files (relative names), the entry it comes from and the key that gave the id."""

    id: str
    files: tuple[str, ...]
    entry: int
    id_key: str


def expand(entries: Iterable[Any], folder: StudyFolder) -> tuple[list[Found], list[Finding]]:
    """Return the datasets that can be used, and what is wrong with the others."""
    found: list[Found] = []
    findings: list[Finding] = []
    for number, entry in enumerate(entries):
        if entry is UNKNOWN:
            continue
        reader = _from_pattern if isinstance(entry, DatasetPattern) else _named
        datasets, faults = reader(entry, number, folder)
        found += datasets
        findings += faults
    return found, findings + list(repeated_ids(found))


def repeated_ids(found: Iterable[Found]) -> Iterator[Finding]:
    """Yield each id that an earlier dataset has already, without regard to case."""
    first: dict[str, Found] = {}
    for dataset in found:
        earlier = first.setdefault(same_name(dataset.id), dataset)
        if earlier is not dataset:
            case = "" if earlier.id == dataset.id else f", written {shown(earlier.id)}"
            yield (
                dataset.id_key,
                f"the id {shown(dataset.id)} is taken by datasets[{earlier.entry}]{case}; ids differ by more than case",
            )


def _named(entry: Any, number: int, folder: StudyFolder) -> tuple[list[Found], list[Finding]]:
    key = f"datasets[{number}]"
    files, findings = [], []
    if entry.files is not UNKNOWN:
        files, findings = _usable_files(entry.files, f"{key}.files", folder)
    known = entry.id is not UNKNOWN
    return ([Found(entry.id, tuple(files), number, f"{key}.id")] if known else []), findings


def _usable_files(names: Iterable[str], key: str, folder: StudyFolder) -> tuple[list[str], list[Finding]]:
    files: list[str] = []
    findings: list[Finding] = []
    seen: set[str] = set()
    for place, text in enumerate(names):
        try:
            name = folder.file(text)
        except PathFault as fault:
            findings.append((f"{key}[{place}]", str(fault)))
            continue
        same = folder.same_file(name)
        if same in seen:
            findings.append((f"{key}[{place}]", f"{shown(text)} is listed twice; its rows would count double"))
        seen.add(same)
        files.append(name)
    return files, findings


def _from_pattern(entry: Any, number: int, folder: StudyFolder) -> tuple[list[Found], list[Finding]]:
    key = f"datasets[{number}].ids_from"
    try:
        names = folder.matches(entry.ids_from)
    except PathFault as fault:
        return [], [(key, str(fault))]
    except UnknownValue:
        return [], []
    found, findings = [], []
    for name in names:
        fault = _pattern_fault(name, folder)
        if fault:
            findings.append((key, fault))
        else:
            found.append(Found(PurePosixPath(name).stem, (name,), number, key))
    return found, findings


def _pattern_fault(name: str, folder: StudyFolder) -> str | None:
    wrong = id_fault(PurePosixPath(name).stem)
    if wrong:
        return f"the file {shown(name)} gives an id that is not allowed; {wrong}"
    try:
        folder.file(name)
    except PathFault as fault:
        return str(fault)
    return None
