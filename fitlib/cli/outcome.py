"""The outcome of a run, or of a dry run, in lines that a person can read; hundreds of datasets too."""

from __future__ import annotations

import os
from collections import Counter

from fitlib.cli.output import align, counted, shorten

LISTED = 40  # datasets shown one by one; of more, those that need a person come first
WARNED = 10  # warnings of the check that are told again
NAMED = 5  # datasets named where many have the same steps
HEADER = ("dataset", "candidate", "verdict", "choice", "loss", "outer_loss", "runner_up", "margin", "warnings")
NUMBERS = {"loss", "outer_loss", "margin", "warnings"}
LONGEST_REASON = 300
ABSENT = "-"


def needs_person(row) -> bool:
    """Whether somebody has to look at this dataset."""
    return row.verdict != "adequate" or row.choice == "tie" or row.target_met is False


def describe_run(summary) -> list[str]:
    """Return the lines that tell what a run came to.

    Parameters
    ----------
    summary : RunSummary

    Returns
    -------
    list of str
    """
    shown = _shown(summary.rows)
    lines = align(HEADER, [_cells(row) for row in shown], NUMBERS).splitlines()
    table = os.path.join(summary.path, "tables", "chosen.csv")
    if len(shown) < len(summary.rows):
        rest = counted(len(summary.rows) - len(shown), "more dataset")
        lines.append(f"and {rest}; all {len(summary.rows)} are in {table}")
    lines += [f"{shorten(row.dataset, 40)}: {reason}" for row in shown if (reason := _reason(row))]
    lines += ["", _counts(summary.rows)]
    return [*lines, *_warnings(summary.warnings), _work(summary), f"revision: {summary.path}"]


def _reason(row) -> str:
    """Why somebody has to look at this dataset, on one line; a tie stands in the table, and the report tells of it."""
    parts = [f"{row.verdict}: {row.reason}".rstrip(": ")] if row.verdict != "adequate" else []
    parts += ["the target uncertainty is not met"] if row.target_met is False else []
    return shorten(" ".join("; ".join(parts).split()), LONGEST_REASON)


def _warnings(warnings) -> list[str]:
    lines = [f"warning: {warning}" for warning in warnings[:WARNED]]
    rest = len(warnings) - len(lines)
    return lines + ([f"and {counted(rest, 'more warning')}: fitlib check tells them all"] if rest else [])


def _shown(rows) -> list:
    """All rows, or of many the ones that need a person and as many others as there is room for, in their order."""
    if len(rows) <= LISTED:
        return list(rows)
    first = sorted(range(len(rows)), key=lambda number: (not needs_person(rows[number]), number))[:LISTED]
    return [rows[number] for number in sorted(first)]


def _cells(row) -> tuple[str, ...]:
    return (
        shorten(row.dataset, 40),
        row.candidate or ABSENT,
        row.verdict,
        row.choice or ABSENT,
        _number(row.loss),
        _number(row.outer_loss),
        row.runner_up or ABSENT,
        _number(row.margin, 3),
        str(row.warnings),
    )


def _number(value: float | None, digits: int = 4) -> str:
    return ABSENT if value is None else f"{value:.{digits}g}"


def _counts(rows) -> str:
    verdicts = Counter(row.verdict for row in rows)
    parts = [f"{verdicts[name]} {name}" for name in ("adequate", "inadequate", "not_evaluated") if verdicts[name]]
    ties = sum(row.choice == "tie" for row in rows)
    parts += [counted(ties, "tie")] if ties else []
    missed = sum(row.target_met is False for row in rows)
    parts += [f"{missed} above the target uncertainty"] if missed else []
    return f"{counted(len(rows), 'dataset')}: {', '.join(parts)}"


def _work(summary) -> str:
    note = summary.note.rstrip(".")
    if not summary.computed and not summary.kept:
        return note
    return f"{note}: {counted(summary.computed, 'step')} computed, {summary.kept} kept"


def describe_dry_run(plan) -> list[str]:
    """Return the lines that tell what a run would do.

    Parameters
    ----------
    plan : DryRun

    Returns
    -------
    list of str
    """
    lines = _warnings(plan.warnings)
    if plan.unchanged:
        return [*lines, f"{plan.study}: nothing to do, {plan.revision} holds these results"]
    lines += [f"{plan.study}: {reason}" for reason in plan.reasons]
    if plan.blocked:
        return [*lines, f"{plan.study}: nothing else has changed"]
    if not plan.steps:
        return [*lines, f"{plan.study}: every step is stored; a run would publish them"]
    groups: dict[tuple[str, ...], list[str]] = {}
    for dataset, steps in plan.steps.items():
        groups.setdefault(tuple(steps), []).append(dataset)
    lines.append(f"{plan.study}: {counted(sum(map(len, plan.steps.values())), 'step')} would be computed")
    return lines + [_group(steps, datasets) for steps, datasets in groups.items()]


def _group(steps: tuple[str, ...], datasets: list[str]) -> str:
    named = ", ".join(shorten(dataset, 40) for dataset in datasets[:NAMED])
    more = f" and {len(datasets) - NAMED} more" if len(datasets) > NAMED else ""
    return f"  {counted(len(datasets), 'dataset')} ({named}{more}): {', '.join(steps)}"
