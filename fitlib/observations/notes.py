"""Things that are no faults but that a reader should know: blank lines, repeated rows, series shared by files."""

from __future__ import annotations

from collections.abc import Sequence

from fitlib.observations.columns import FileRows
from fitlib.observations.wording import listed, plural, quoted

SHOWN_PAIRS = 20


def blank_line_notes(files: Sequence[FileRows]) -> list[str]:
    """One note for each file that has blank lines."""
    counted = [(rows.table.file, rows.table.blank_lines) for rows in files]
    return [f"{file}: {plural(count, 'blank line')} passed over" for file, count in counted if count]


def repeated_row_notes(files: Sequence[FileRows]) -> list[str]:
    """One note with all rows that repeat an earlier row of the dataset in every column."""
    first: dict[tuple, str] = {}
    pairs = []
    for rows in files:
        table = rows.table
        for fields, line in zip(table.rows, table.lines, strict=True):
            if not fields:
                continue
            here = f"{table.file} row {line}"
            earlier = first.setdefault((table.header, tuple(fields)), here)
            if earlier is not here:
                pairs.append(f"{here} = {earlier}")
    if not pairs:
        return []
    verb = "repeats an earlier row" if len(pairs) == 1 else "repeat an earlier row each"
    return [f"{plural(len(pairs), 'row')} {verb} in every column; entered twice? {listed(pairs, SHOWN_PAIRS)}"]


def shared_series_notes(files: Sequence[FileRows]) -> list[str]:
    """One note when files use the same names of series: they are taken as the same series."""
    holders: dict[str, list[str]] = {}
    for rows in files:
        for word in dict.fromkeys(rows.series):
            if word:
                holders.setdefault(word, []).append(rows.table.file)
    shared = [word for word, names in holders.items() if len(names) > 1]
    if not shared:
        return []
    names = list(dict.fromkeys(name for word in shared for name in holders[word]))
    return [
        f"series {listed([quoted(word) for word in shared])} occur in several files ({listed(names)}) and are taken as "
        "the same series; name them apart if they are not"
    ]
