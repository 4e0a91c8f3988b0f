"""Rules between the keys of one dataset, after `dataset_defaults` is merged in.

Each rule yields (dotted key, message) and may touch faulty values: it is given up there (`fitlib.study.unknown`).
"""

from __future__ import annotations

from collections.abc import Callable, Iterator

from fitlib.study.dataset_merge import Merged
from fitlib.study.kinds import is_day
from fitlib.study.models import ColumnsGroup
from fitlib.study.shown import shown
from fitlib.study.unknown import UNKNOWN, Finding

DAYS_IN_RECORD = ("date", "due")


def columns_named(merged: Merged) -> Iterator[Finding]:
    """The stimulus and the response need a column each."""
    for role in ("stimulus", "response"):
        if merged.value(f"columns.{role}") is None:
            yield f"{merged.key}.columns.{role}", "this key is missing here and in dataset_defaults"


def columns_differ(merged: Merged) -> Iterator[Finding]:
    """One column has one role."""
    taken: dict[str, str] = {}
    for role in ColumnsGroup.model_fields:
        name = merged.value(f"columns.{role}")
        if name is not None and taken.setdefault(name, role) != role:
            yield (
                merged.key_of(f"columns.{role}"),
                f"the column {shown(name)} is the {taken[name]} already; one role each",
            )


def level_once(merged: Merged) -> Iterator[Finding]:
    """A level column says which level a row belongs to, so that a tolerance has no effect."""
    if any(value is None or value is UNKNOWN for value in map(merged.value, ("columns.level", "level_tolerance"))):
        return
    name = "level_tolerance"
    if merged.is_default(name) and not merged.is_default("columns.level"):
        name = "columns.level"
    yield merged.key_of(name), "level_tolerance has no effect beside columns.level; keep one of them"


def delimiter_and_decimal(merged: Merged) -> Iterator[Finding]:
    """A comma cannot separate both columns and decimals."""
    if merged.value("delimiter") == "comma" and merged.value("decimal") == "comma":
        name = "delimiter" if not merged.is_default("delimiter") else "decimal"
        yield merged.key_of(name), "a comma cannot be both the delimiter and the decimal sign"


def days_in_record(merged: Merged) -> Iterator[Finding]:
    """Days in the technical record are written as everywhere else."""
    record = merged.value("record")
    for name in record:
        if (name in DAYS_IN_RECORD or name.endswith("_date")) and not is_day(record[name]):
            yield (
                merged.key_of(f"record.{name}"),
                f"{shown(record[name])} is not allowed; a day of the calendar as YYYY-MM-DD",
            )


def exclusions_once(merged: Merged) -> Iterator[Finding]:
    """An exclusion that repeats an earlier one has no effect."""
    exclusions = merged.value("exclusions")
    seen: list[dict] = []
    for place, exclusion in enumerate(exclusions if exclusions is not None else ()):
        if exclusion.where in seen:
            yield (
                f"{merged.key_of('exclusions')}[{place}].where",
                "an earlier exclusion says the same; this has no effect",
            )
        seen.append(exclusion.where)


def verification_not_excluded(merged: Merged) -> Iterator[Finding]:
    """A row has one state."""
    verification, exclusions = merged.value("verification_points"), merged.value("exclusions")
    if verification is None or exclusions is None:
        return
    for exclusion in exclusions:
        if exclusion.where == verification.where:
            yield (
                f"{merged.key_of('verification_points')}.where",
                "the same rows are in exclusions; a row has one state",
            )


DATASET_RULES: tuple[Callable[[Merged], Iterator[Finding]], ...] = (
    columns_named,
    columns_differ,
    level_once,
    delimiter_and_decimal,
    days_in_record,
    exclusions_once,
    verification_not_excluded,
)
