"""Which data files differ between two revisions, and by how many rows of which series."""

from __future__ import annotations

from collections import Counter
from collections.abc import Mapping
from dataclasses import dataclass

from fitlib.revision.read import Revision

STUDY_FILE = "study.yaml"
Counts = Mapping[tuple[str, str], Counter]


@dataclass(frozen=True)
class RowChange:
    """Rows that one dataset reads from one file, before and after.

    Attributes
    ----------
    dataset : str
    before, after : int
        Rows read.
    series : tuple of (str, int, int)
        Label, rows before, rows after, of each series whose number of rows differs.
    """

    dataset: str
    before: int
    after: int
    series: tuple[tuple[str, int, int], ...]


@dataclass(frozen=True)
class DataChange:
    """One data file that differs.

    Attributes
    ----------
    file : str
        Relative to the study.
    kind : {"added", "removed", "changed"}
    sha256_before, sha256_after : str or None
    rows : tuple of RowChange
        One for each dataset that reads the file.
    """

    file: str
    kind: str
    sha256_before: str | None
    sha256_after: str | None
    rows: tuple[RowChange, ...]


def data_changes(before: Revision, after: Revision) -> tuple[DataChange, ...]:
    """Data files that were added, removed or changed, by SHA-256.

    Parameters
    ----------
    before, after : Revision

    Returns
    -------
    tuple of DataChange
        Sorted by file.
    """
    old, new = _data(before), _data(after)
    differing = [file for file in sorted({*old, *new}) if old.get(file) != new.get(file)]
    if not differing:
        return ()
    counts = _row_counts(before), _row_counts(after)
    return tuple(_change(file, old.get(file), new.get(file), *counts) for file in differing)


def study_text_differs(before: Revision, after: Revision) -> bool:
    """Whether the study's text differs, be it only in a comment."""
    return before.inputs.get(STUDY_FILE) != after.inputs.get(STUDY_FILE)


def _data(revision: Revision) -> dict[str, str]:
    return {file: digest for file, digest in revision.inputs.items() if file != STUDY_FILE}


def _change(file: str, old: str | None, new: str | None, before: Counts, after: Counts) -> DataChange:
    kind = "added" if old is None else "removed" if new is None else "changed"
    datasets = sorted({dataset for dataset, name in [*before, *after] if name == file})
    rows = tuple(_row_change(dataset, before.get((dataset, file)), after.get((dataset, file))) for dataset in datasets)
    return DataChange(file, kind, old, new, rows)


def _row_change(dataset: str, before: Counter | None, after: Counter | None) -> RowChange:
    old, new = before or Counter(), after or Counter()
    labels = [label for label in sorted({*old, *new}) if label and old[label] != new[label]]
    series = tuple((label, old[label], new[label]) for label in labels)
    return RowChange(dataset, old.total(), new.total(), series)


def _row_counts(revision: Revision) -> dict[tuple[str, str], Counter]:
    """Rows read by dataset and file, counted by series; empty where the revision has no such table."""
    counts: dict[tuple[str, str], Counter] = {}
    if "observations" not in revision.table_names:
        return counts
    for row in revision.rows("observations"):
        counts.setdefault((row["dataset"], row["file"]), Counter())[row.get("series", "")] += 1
    return counts
