"""Do two sets of results say the same, but for rounding?"""

from __future__ import annotations

import sys
from collections.abc import Iterator, Mapping
from pathlib import Path

from fitlib.errors import VerificationError
from fitlib.revision.disk import load_json
from fitlib.revision.frames import rows_of
from fitlib.revision.read import UNREADABLE, read_revision

#: Rounding of a difference of two numbers of magnitude 1.
_ROUNDING = 64 * sys.float_info.epsilon
#: Numbers that measure rounding, so that rounding may change all of their digits.
_ROUNDING_ITSELF = frozenset({"power_shift", "condition_number", "digest"})
_COLUMNS = "tables/columns.csv"
Types = dict[str, dict[str, tuple[str, str]]]


def same_results(path: str | Path, files: Mapping[str, bytes], rtol: float = 1e-8) -> bool:
    """Whether new results hold the same words and, but for rounding, the same numbers as a published revision.

    Tables, functions and the resolved study count; figures, report and history do not.

    Parameters
    ----------
    path : str or Path
        Folder of the revision.
    files : mapping of str to bytes
        New results by path relative to the revision.
    rtol : float, default 1e-8
        Relative tolerance. A difference of 64 times the machine epsilon of the largest number with the same unit, in
        the same table and dataset, counts as rounding, too: a residual is a small difference of large numbers.

    Returns
    -------
    bool
        False, too, when the revision was altered, or holds what this program does not read.

    Raises
    ------
    InputError
        If there is no such folder.
    """
    try:
        revision = read_revision(path)
        names = [name for name in revision.files if _counts(name)]
        if names != sorted(name for name in files if _counts(name)):
            return False
        pairs = {name: (revision.read_bytes(name), bytes(files[name])) for name in names}
    except VerificationError:
        return False
    differing = {name: pair for name, pair in pairs.items() if pair[0] != pair[1]}
    if not differing:
        return True
    types = _types(pairs[_COLUMNS][1]) if _COLUMNS in pairs else {}
    try:
        return all(_same_file(name, *pair, types, rtol) for name, pair in differing.items())
    except UNREADABLE:
        return False


def _counts(name: str) -> bool:
    return name == "resolved.json" or name.startswith(("tables/", "functions/"))


def _types(data: bytes) -> Types:
    """Type and unit of each column of each table."""
    types: Types = {}
    for row in rows_of(data, {}):
        types.setdefault(row["table"], {})[row["column"]] = (row["type"], row["unit"])
    return types


def _same_file(name: str, old: bytes, new: bytes, types: Types, rtol: float) -> bool:
    if name.startswith("functions/"):
        return same_values(load_json(old), load_json(new), rtol)
    table = types.get(name.removeprefix("tables/"))
    return table is not None and name != _COLUMNS and _same_table(old, new, table, rtol)


def _same_table(old: bytes, new: bytes, columns: dict[str, tuple[str, str]], rtol: float) -> bool:
    before, after = list(rows_of(old, {})), list(rows_of(new, {}))
    if len(before) != len(after) or (before and list(before[0]) != list(after[0])):
        return False
    units = {name: unit for name, (kind, unit) in columns.items() if kind == "number"}
    largest = _largest(after, units)
    return all(_same_row(*pair, units, largest, rtol) for pair in zip(before, after, strict=True))


def _largest(rows: list[dict[str, str]], units: Mapping[str, str]) -> dict[tuple[str, str], float]:
    """Largest magnitude by dataset and unit."""
    largest: dict[tuple[str, str], float] = {}
    for row in rows:
        for name, unit in units.items():
            if row[name]:
                key = row["dataset"], unit
                largest[key] = max(largest.get(key, 0.0), abs(float(row[name])))
    return largest


def _same_row(old: dict, new: dict, units: Mapping[str, str], largest: Mapping, rtol: float) -> bool:
    for name, cell in old.items():
        other = new[name]
        if cell == other or name in _ROUNDING_ITSELF:
            continue
        if name not in units or not cell or not other:
            return False
        rounding = _ROUNDING**2 if "²" in units[name] else _ROUNDING
        floor = rounding * largest.get((new["dataset"], units[name]), 0.0)
        if not _close(float(cell), float(other), rtol, floor):
            return False
    return True


def same_values(old: object, new: object, rtol: float, floor: float = 0.0) -> bool:
    """Whether two JSON values hold the same words and, but for rounding, the same numbers.

    Parameters
    ----------
    old, new : object
        JSON-able.
    rtol : float
        Relative tolerance.
    floor : float, default 0
        Difference that counts as rounding; within a list of numbers it follows from the largest of them.

    Returns
    -------
    bool
    """
    if isinstance(old, dict) and isinstance(new, dict):
        keys = old.keys() - _ROUNDING_ITSELF
        return old.keys() == new.keys() and all(same_values(old[key], new[key], rtol) for key in keys)
    if isinstance(old, list) and isinstance(new, list):
        largest = max([floor, *(_ROUNDING * abs(number) for number in _numbers(new))])
        return len(old) == len(new) and all(same_values(*pair, rtol, largest) for pair in zip(old, new, strict=True))
    if _is_number(old) and _is_number(new):
        return _close(float(old), float(new), rtol, floor)
    return type(old) is type(new) and old == new


def _numbers(value: object) -> Iterator[float]:
    """Numbers of a list of numbers, or of a list of such lists."""
    if isinstance(value, list):
        for item in value:
            yield from _numbers(item)
    elif _is_number(value):
        yield float(value)


def _is_number(value: object) -> bool:
    return isinstance(value, int | float) and not isinstance(value, bool)


def _close(old: float, new: float, rtol: float, floor: float) -> bool:
    return abs(old - new) <= max(rtol * max(abs(old), abs(new)), floor)
