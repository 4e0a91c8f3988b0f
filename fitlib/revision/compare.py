"""Comparing two revisions: causes (program, data, settings) and effects (choices, verdicts, functions)."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from contextlib import contextmanager
from pathlib import Path

from fitlib.errors import VerificationError
from fitlib.revision.comparison import Choice, Comparison, DatasetChange, FactChange, same_number
from fitlib.revision.curves import Shift, largest_shift
from fitlib.revision.data import data_changes, study_text_differs
from fitlib.revision.manifest import FACTS_APART
from fitlib.revision.read import NOT_READ_HERE, UNREADABLE, Revision, read_revision
from fitlib.revision.settings import settings_changes

_RTOL = 1e-8


def compare_revisions(before: Revision | str | Path, after: Revision | str | Path) -> Comparison:
    """Tell what differs between two revisions.

    Parameters
    ----------
    before, after : Revision, str or Path
        The earlier and the later one; a path is that of a revision's folder.

    Returns
    -------
    Comparison
        Numbers that agree to 1e-8 relative count as the same.

    Raises
    ------
    InputError
        If there is no such folder.
    VerificationError
        If a file that is read was altered since it was published, or is none that this program reads.
    """
    old, new = _opened(before), _opened(after)
    choices = tuple(map(_choices, (old, new)))
    with _readable(old, new):
        comparison = _compare(old, new, choices)
        comparison.lines()  # what cannot be told was not read rightly
    return comparison


@contextmanager
def _readable(*revisions: Revision) -> Iterator[None]:
    """A file may have the digest that the manifest gives and still hold what nobody foresaw."""
    try:
        yield
    except UNREADABLE as error:
        places = " or ".join(str(revision.path) for revision in revisions)
        raise VerificationError(f"{places}: {NOT_READ_HERE} ({type(error).__name__})") from None


def _compare(old: Revision, new: Revision, choices: tuple[Mapping[str, Choice], ...]) -> Comparison:
    datasets = tuple(_dataset_changes(old, new, *choices))
    both = set(choices[0]).intersection(choices[1])
    return Comparison(
        old.name,
        new.name,
        tuple(_fact_changes(old.manifest.get("versions") or {}, new.manifest.get("versions") or {})),
        tuple(_fact_changes(_other_facts(old), _other_facts(new))),
        data_changes(old, new),
        settings_changes(old.resolved, new.resolved),
        study_text_differs(old, new),
        datasets,
        len(both) - sum(change.kind == "changed" for change in datasets),
    )


def _opened(revision: Revision | str | Path) -> Revision:
    return revision if isinstance(revision, Revision) else read_revision(revision)


def _fact_changes(before: Mapping, after: Mapping) -> Iterator[FactChange]:
    for name in sorted({*before, *after}):
        if before.get(name) != after.get(name):
            yield FactChange(name, before.get(name), after.get(name))


def _other_facts(revision: Revision) -> dict[str, object]:
    """Facts that no other part of the comparison tells, one level deep: ``code.numerics``; no digests of facts."""
    flat: dict[str, object] = {}
    for name, value in revision.manifest.items():
        if name in FACTS_APART or name.endswith("_digest"):
            continue
        flat |= {f"{name}.{key}": item for key, item in value.items()} if isinstance(value, dict) else {name: value}
    return flat


def _choices(revision: Revision) -> dict[str, Choice]:
    functions = revision.functions
    with _readable(revision):
        facts = {row["dataset"]: row for row in revision.rows("datasets")}
        rows = {row["dataset"]: row for row in revision.rows("chosen")}
        return {name: _choice(row, facts.get(name, {}), functions.get(name, {})) for name, row in rows.items()}


def _choice(row: Mapping[str, str], facts: Mapping[str, str], function: Mapping) -> Choice:
    lower, upper = _number(facts.get("interval_lower")), _number(facts.get("interval_upper"))
    return Choice(
        row.get("candidate", ""),
        row.get("runner_up", ""),
        row.get("verdict", ""),
        row.get("choice", ""),
        facts.get("loss_scheme", ""),
        _number(row.get("loss")),
        None if lower is None or upper is None else (lower, upper),
        function.get("reading_standard_deviation"),
        function.get("level_standard_deviation"),
        facts.get("fitted_unit", ""),
        facts.get("stimulus_unit", ""),
        ", ".join(filter(None, (facts.get("function"), facts.get("evaluation")))),
    )


def _number(cell: str | None) -> float | None:
    return float(cell) if cell else None


def _dataset_changes(
    old: Revision, new: Revision, before: Mapping[str, Choice], after: Mapping[str, Choice]
) -> Iterator[DatasetChange]:
    for name in sorted({*before, *after}, key=lambda item: (item.casefold(), item)):
        if name not in before:
            yield DatasetChange(name, "added", None, after[name], None)
        elif name not in after:
            yield DatasetChange(name, "removed", before[name], None, None)
        else:
            shift = _shift(old.functions.get(name), new.functions.get(name))
            if shift is not None or not _same_choice(before[name], after[name]):
                yield DatasetChange(name, "changed", before[name], after[name], shift)


def _shift(before: dict | None, after: dict | None) -> Shift | None:
    """The largest shift, unless it is only a matter of rounding."""
    if before is None or after is None:
        return None
    shift = largest_shift(before, after)
    return shift if shift is not None and shift.amount > _RTOL * shift.scale else None


def _same_choice(before: Choice, after: Choice) -> bool:
    words = ("candidate", "verdict", "choice", "scheme", "interval", "unit", "stimulus_unit", "use")
    numbers = ("loss", "reading_standard_deviation", "level_standard_deviation")
    return all(getattr(before, name) == getattr(after, name) for name in words) and all(
        same_number(getattr(before, name), getattr(after, name)) for name in numbers
    )
