"""``fitlib check``: every fault of a study and its data at once, before any work."""

from __future__ import annotations

from fitlib.cli.arguments import add_command, require_file
from fitlib.cli.checking import CheckSummary, DatasetSummary, check
from fitlib.cli.output import align, counted, say, shorten

LISTED = 25  # datasets shown one by one; more are summed up
COUNTS = ("levels", "series", "used", "excluded", "verification")


def add(commands) -> None:
    """Add the command to the parser."""
    parser = add_command(
        commands,
        "check",
        execute,
        "check a study and its data",
        "Check a study and every data file of it. Every fault is told at once, as path:line: key: message.",
        "  fitlib check configs/level-sensors/study.yaml",
    )
    parser.add_argument("study", metavar="STUDY", help="the study, a YAML file")


def execute(arguments) -> int:
    """Check; print what a run would work on."""
    require_file(arguments.study, "the study")
    summary = check(arguments.study)
    for line in describe(summary, arguments.study):
        say(line)
    return 0


def describe(summary: CheckSummary, path: str) -> list[str]:
    """Return the lines that tell what was read."""
    study = summary.study
    candidates = [name for family in study.families for name in family.candidate_ids]
    lines = [
        f"{path}: no faults found",
        f"study       {study.name}" + (f": {study.title}" if study.title else ""),
        f"stimulus    {_quantity(study.stimulus)}",
        f"response    {_quantity(study.response)}",
        f"candidates  {len(candidates)}: {', '.join(candidates)}",
        f"schemes     {len(study.validation)}: {', '.join(scheme.id for scheme in study.validation)}",
        f"selection   {_selection(study.selection)}",
        f"datasets    {len(summary.datasets)}",
        *_datasets(summary.datasets),
    ]
    if not summary.warnings:
        return [*lines, "warnings    none"]
    return [*lines, f"warnings    {len(summary.warnings)}", *(f"  {warning}" for warning in summary.warnings)]


def _quantity(quantity) -> str:
    return f"{quantity.quantity}, {quantity.unit}" if quantity.unit else quantity.quantity


def _selection(selection) -> str:
    return f"{selection.rule}, decided by {selection.loss}" if selection.loss else selection.rule


def _datasets(datasets: tuple[DatasetSummary, ...]) -> list[str]:
    shown = datasets if len(datasets) <= LISTED else datasets[:LISTED]
    rows = [(shorten(each.dataset, 40), *(str(getattr(each, name)) for name in COUNTS)) for each in shown]
    lines = [f"  {line}" for line in align(("dataset", *COUNTS), rows, set(COUNTS)).splitlines()]
    if len(datasets) == 1:
        return lines
    if len(shown) < len(datasets):
        lines.append(f"  and {counted(len(datasets) - len(shown), 'more dataset')}")
    ranges = ", ".join(f"{name} {_range([getattr(each, name) for each in datasets])}" for name in ("levels", "series"))
    sums = ", ".join(f"{sum(getattr(each, name) for each in datasets)} {name}" for name in COUNTS[2:])
    return [*lines, f"  all         {ranges}; observations: {sums}"]


def _range(values: list[int]) -> str:
    low, high = min(values), max(values)
    return str(low) if low == high else f"{low} to {high}"
