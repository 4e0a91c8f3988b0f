"""Which settings differ between two resolved studies."""

from __future__ import annotations

import re
from collections.abc import Iterator, Mapping
from dataclasses import dataclass, replace

_ABSENT = object()
# What follows from other settings of the same item.
_DERIVED = re.compile(r"families\[.*\]\.candidates", re.DOTALL)


@dataclass(frozen=True)
class SettingChange:
    """One setting that differs.

    Attributes
    ----------
    key : str
        Dotted key; an item of a list is named by its id: ``datasets[LS-101].measuring_interval``.
    kind : {"added", "removed", "changed"}
    before, after : object
        JSON-able; None on the side where the setting is absent.
    dataset : str
        Id of the dataset that the setting belongs to; empty for any other.
    """

    key: str
    kind: str
    before: object
    after: object
    dataset: str = ""

    @property
    def is_dataset(self) -> bool:
        """Whether a whole dataset was added to the study or taken out."""
        return self.key == f"datasets[{self.dataset}]" and self.kind != "changed"

    @property
    def general_key(self) -> str:
        """The key without the id of the dataset: ``datasets[*].measuring_interval``."""
        return f"datasets[*]{self.key.removeprefix(f'datasets[{self.dataset}]')}" if self.dataset else self.key


def settings_changes(before: Mapping, after: Mapping) -> tuple[SettingChange, ...]:
    """Settings that differ, in the order of their keys.

    Parameters
    ----------
    before, after : mapping
        Resolved studies.

    Returns
    -------
    tuple of SettingChange
    """
    changes = _in_mapping("", before, after)
    return tuple(change for change in changes if not _DERIVED.fullmatch(change.key))


def _in_mapping(prefix: str, before: Mapping, after: Mapping) -> Iterator[SettingChange]:
    for key in sorted({*before, *after}):
        yield from _at(f"{prefix}.{key}" if prefix else key, before.get(key, _ABSENT), after.get(key, _ABSENT))


def _at(key: str, before: object, after: object) -> Iterator[SettingChange]:
    if after is _ABSENT:
        yield SettingChange(key, "removed", before, None)
    elif before is _ABSENT:
        yield SettingChange(key, "added", None, after)
    else:
        yield from _value(key, before, after)


def _value(key: str, before: object, after: object) -> Iterator[SettingChange]:
    if isinstance(before, dict) and isinstance(after, dict):
        yield from _in_mapping(key, before, after)
    elif isinstance(before, list) and isinstance(after, list):
        yield from _in_list(key, before, after)
    elif before != after or isinstance(before, bool) != isinstance(after, bool):
        yield SettingChange(key, "changed", before, after)


def _in_list(key: str, before: list, after: list) -> Iterator[SettingChange]:
    """Items are matched by what identifies them; a list of plain values counts as one value."""
    old, new = _identified(before), _identified(after)
    if old is None or new is None:
        yield from _in_plain_list(key, before, after)
        return
    for name in sorted({*old, *new}):
        changes = _at(f"{key}[{name}]", old.get(name, _ABSENT), new.get(name, _ABSENT))
        yield from (replace(change, dataset=name) for change in changes) if key == "datasets" else changes
    common = [name for name in old if name in new], [name for name in new if name in old]
    if common[0] != common[1]:
        yield SettingChange(f"order of {key}", "changed", *common)


def _in_plain_list(key: str, before: list, after: list) -> Iterator[SettingChange]:
    gone = [item for item in before if item not in after]
    fresh = [item for item in after if item not in before]
    if (gone or fresh) and all(isinstance(item, dict) for item in before + after):
        yield from (SettingChange(key, "removed", item, None) for item in gone)
        yield from (SettingChange(key, "added", None, item) for item in fresh)
    elif before != after:
        yield SettingChange(key, "changed", before, after)


def _identified(items: list) -> dict[str, dict] | None:
    """Items by their id; None when they have none, or share one."""
    if not items or not all(isinstance(item, dict) for item in items):
        return {} if not items else None
    named = {_identity(item): item for item in items}
    return named if len(named) == len(items) and None not in named else None


def _identity(item: dict) -> str | None:
    """What tells an item of a list from its neighbours."""
    if isinstance(item.get("id"), str):
        return item["id"]
    if isinstance(item.get("family"), str):
        return item["family"] + ("-fixed" if item.get("fixed_points") else "")
    return item["scheme"] if isinstance(item.get("scheme"), str) else None
