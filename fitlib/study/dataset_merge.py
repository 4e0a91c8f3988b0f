"""Merges `dataset_defaults` into one entry of `datasets`.

Merged key by key: a key that the entry has is the entry's, a key that it lacks is the default's. Inside `columns` and
`record` the same holds for each of their keys; every other value, lists too, is replaced as a whole.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

from fitlib.study.models import ColumnsGroup, DatasetDefaults, DatasetKeys
from fitlib.study.unknown import UNKNOWN

DEFAULTS = "dataset_defaults"
MERGED_INSIDE = ("columns", "record")


@dataclass(frozen=True)
class Merged:
    """The values of one entry with defaults merged in, and the dotted key where each one is written.

    Columns stand under ``columns.stimulus`` and so on. A value may be `UNKNOWN`.
    """

    key: str
    values: dict[str, Any]
    origin: dict[str, str]

    def value(self, name: str) -> Any:
        """Return a value."""
        return self.values[name]

    def key_of(self, name: str) -> str:
        """Return the dotted key where the value is written, or where it would be written."""
        return self.origin.get(name, f"{self.key}.{name}")

    def is_default(self, name: str) -> bool:
        """Tell whether the value is written in `dataset_defaults`."""
        return self.key_of(name).startswith(f"{DEFAULTS}.")


def merge(defaults: DatasetDefaults, entry: DatasetKeys, key: str) -> Merged:
    """Return an entry with the defaults merged in.

    Parameters
    ----------
    defaults : DatasetDefaults
        Or `UNKNOWN`; then each value that the entry lacks is unknown.
    entry : DatasetKeys
        The entry as written.
    key : str
        Its dotted key, for example ``datasets[0]``.
    """
    merged = Merged(key, {}, {})
    for name in DatasetKeys.model_fields:
        if name not in MERGED_INSIDE:
            merged.values[name], origin = _pick(defaults, entry, key, name)
            merged.origin[name] = f"{origin}.{name}"
    _merge_columns(merged, defaults, entry)
    merged.values["record"] = _merge_records(merged, defaults, entry)
    return merged


def _pick(defaults: Any, entry: Any, key: str, name: str) -> tuple[Any, str]:
    if name in entry.model_fields_set:
        return getattr(entry, name), key
    if defaults is UNKNOWN:
        return UNKNOWN, key
    return getattr(defaults, name), DEFAULTS if name in defaults.model_fields_set else key


def _group(owner: Any, name: str) -> Any:
    return UNKNOWN if owner is UNKNOWN else getattr(owner, name)


def _merge_columns(merged: Merged, defaults: Any, entry: Any) -> None:
    own, general = _group(entry, "columns"), _group(defaults, "columns")
    for name in ColumnsGroup.model_fields:
        value, origin = None, f"{merged.key}.columns"
        for group, place in ((own, merged.key), (general, DEFAULTS)):
            if group is UNKNOWN:
                value = UNKNOWN
                break
            if group is not None and name in group.model_fields_set:
                value, origin = getattr(group, name), f"{place}.columns"
                break
        merged.values[f"columns.{name}"] = value
        merged.origin[f"columns.{name}"] = f"{origin}.{name}"


def _merge_records(merged: Merged, defaults: Any, entry: Any) -> Any:
    own, general = _group(entry, "record"), _group(defaults, "record")
    if own is UNKNOWN or general is UNKNOWN:
        return UNKNOWN
    record = (general or {}) | (own or {})
    for name in record:
        place = merged.key if name in (own or {}) else DEFAULTS
        merged.origin[f"record.{name}"] = f"{place}.record.{name}"
    return {name: record[name] for name in sorted(record)}
