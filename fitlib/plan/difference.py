"""Why something is computed again: the difference between two plans in plain sentences."""

from __future__ import annotations

from collections.abc import Iterable, Mapping

from fitlib.plan.records import DatasetPlan, Plan

SHOWN = 5  # names in one sentence; the rest is counted
LINES = 10  # sentences about datasets; the rest is counted


def describe_changes(before: Plan | None, after: Plan) -> list[str]:
    """Return what differs between two plans of a study.

    Parameters
    ----------
    before : Plan or None
        The plan of the last run; None when there was none.
    after : Plan

    Returns
    -------
    list of str
        One sentence for each cause; empty when nothing differs.
    """
    if before is None:
        return ["first run of this study"]
    old = {each.id: each for each in before.datasets}
    new = {each.id: each for each in after.datasets}
    return [
        *_program_changes(before, after),
        *_named("added", (name for name in new if name not in old)),
        *_named("withdrawn", (name for name in old if name not in new)),
        *_dataset_changes([(old[name], new[name]) for name in new if name in old]),
    ]


def _program_changes(before: Plan, after: Plan) -> list[str]:
    lines = [
        f"{name} {before.versions.get(name, 'not installed')} → {version}"
        for name, version in after.versions.items()
        if before.versions.get(name) != version
    ]
    if before.code["numerics"] != after.code["numerics"]:
        lines.append("the program's numeric code has changed: every dataset is computed again")
    if before.code["drawing"] != after.code["drawing"]:
        lines.append("the program's drawing code has changed: every figure is drawn again")
    elif before.code["rendering"] != after.code["rendering"]:
        lines.append("the program's code for tables and report has changed")
    return lines


def _dataset_changes(pairs: Iterable[tuple[DatasetPlan, DatasetPlan]]) -> list[str]:
    """Datasets with the same causes share a sentence: a changed family is one cause, not one for each dataset."""
    causes: dict[str, list[str]] = {}
    for old, new in pairs:
        found = [*_file_changes(old.files, new.files), *_setting_changes(old, new)]
        if found:
            causes.setdefault("; ".join(found), []).append(new.id)
    lines = [line for cause, names in causes.items() for line in _named(cause, names)]
    rest = [f"and {len(lines) - LINES} more changes of this kind"] if len(lines) > LINES else []
    return [*lines[:LINES], *rest]


def _file_changes(old: Mapping[str, str], new: Mapping[str, str]) -> list[str]:
    changed = [f"{name} has other content" for name in new if name in old and old[name] != new[name]]
    added = [f"{name} added" for name in new if name not in old]
    return [*changed, *added, *(f"{name} withdrawn" for name in old if name not in new)]


def _setting_changes(old: DatasetPlan, new: DatasetPlan) -> list[str]:
    """A changed list of files is told by the files already."""
    before, after = old.settings, new.settings
    groups = [group for group in {**after, **before} if before.get(group) != after.get(group) and group != "files"]
    if any(group.startswith("validation ") for group in groups):
        groups = [group for group in groups if group != "validation"]  # the schemes by name say more
    return [f"{', '.join(group.replace('_', ' ') for group in groups)} changed"] if groups else []


def _named(cause: str, names: Iterable[str]) -> list[str]:
    known = list(names)
    if not known:
        return []
    rest = f" and {len(known) - SHOWN} more" if len(known) > SHOWN else ""
    return [f"{', '.join(known[:SHOWN])}{rest}: {cause}"]
