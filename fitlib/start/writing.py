"""The text of a proposed study: YAML with comments."""

from __future__ import annotations

import json
import re
from collections.abc import Mapping
from dataclasses import dataclass

from fitlib.observations.wording import listed, number, plural, quoted
from fitlib.start.counts import Counts
from fitlib.start.guess import SURE, Guess
from fitlib.start.headers import split_unit

HIGHEST_DEGREE = 6
LEVELS_TO_DECIDE = 5
LEVELS_TO_DRAW = 8
_PLAIN = re.compile(r"[A-Za-z][A-Za-z0-9_-]*")
_WORDS_OF_YAML = {"true", "false", "null", "yes", "no", "on", "off", "y", "n"}


@dataclass(frozen=True)
class Proposal:
    """Everything that the text is written from."""

    name: str
    dataset: str
    file: str
    delimiter: str
    decimal: str
    guesses: Mapping[str, Guess]
    counts: Counts
    others: tuple[str, ...]
    falling: bool


def scalar(text: str) -> str:
    """A text as a YAML scalar: plain when nothing can be mistaken, else in double quotes."""
    if _PLAIN.fullmatch(text) and text.lower() not in _WORDS_OF_YAML:
        return text
    return json.dumps(text, ensure_ascii=False)


def support(levels: int) -> tuple[int, int]:
    """Highest degree and least degrees of freedom (levels less parameters) for a number of levels.

    Three degrees of freedom are kept for up to degree 6; four levels allow a straight line with two.
    """
    if levels < 5:
        return 1, 2
    return min(HIGHEST_DEGREE, levels - 4), 3


def _head(proposal: Proposal) -> list[str]:
    counts = proposal.counts
    lines = [
        f"# Proposed from {quoted(proposal.file)}; keep this file in the folder of the data file.",
        "# Read every line that says CHECK, fill in what is missing, then run `fitlib check` on it.",
        f"# Found: {plural(counts.rows, 'row')}, {plural(counts.levels, 'level')} from {number(counts.low)} to "
        f"{number(counts.high)}, {counts.series} series, "
        f"at most {plural(counts.replicates, 'observation')} at one level in one series.",
    ]
    if counts.unreadable:
        lines += [
            f"# CHECK: {plural(counts.unreadable, 'row')} cannot be read as numbers; `fitlib check` names them.",
            "# Supply the values, or exclude the rows with a reason.",
        ]
    return lines


def _quantity(role: str, column: str) -> list[str]:
    name, unit = split_unit(column)
    note = "unit taken from the column's name" if unit else "CHECK: unit to be filled in"
    return [
        f"{role}: {{quantity: {scalar(name[:100])}, unit: {json.dumps(unit or '1', ensure_ascii=False)}}}  # {note}"
    ]


def _columns(proposal: Proposal) -> list[str]:
    lines = ["    columns:"]
    for role in ("stimulus", "response", "series", "direction", "level"):
        guess = proposal.guesses.get(role)
        if guess is not None:
            mark = "" if guess.confidence == SURE else "CHECK: "
            lines.append(f"      {role}: {scalar(guess.column)}  # {mark}{guess.reason} ({guess.confidence})")
    if "series" not in proposal.guesses:
        lines.append("      # series: no column was taken for the series (one pass through the levels)")
    if proposal.others:
        lines.append(f"      # not used: {listed([quoted(name) for name in proposal.others])}")
    return lines


def _tolerance(proposal: Proposal) -> list[str]:
    counts = proposal.counts
    if counts.tolerance is None:
        how = "named by the level column" if "level" in proposal.guesses else "taken where stimulus values are equal"
        return [f"    # level_tolerance: not needed; levels are {how}"]
    found = counts.clusters
    if found.tolerance is None:
        return [
            f"    # CHECK: the {found.distinct} distinct stimulus values hardly repeat, and no tolerance keeps groups",
            "    # apart. With the value below each of them is a level of its own; held-out losses are then too small",
            "    # if several of them are visits to one level. A column with the level of each row is the better way.",
            f"    level_tolerance: {counts.tolerance!r}",
        ]
    if found.sign == "strays":
        return [
            f"    # CHECK: {plural(len(found.strays), 'row')} set beside a level that other rows meet exactly, at most "
            f"{number(found.width)} off ({found.groups} levels).",
            "    # Values within this tolerance (in the unit of the stimulus) are one level:",
            f"    level_tolerance: {counts.tolerance!r}",
        ]
    return [
        f"    # CHECK: {found.distinct} distinct stimulus values form {found.groups} groups, each at most "
        f"{number(found.width)} wide and {number(found.gap)} or",
        "    # more apart. Values within this tolerance (in the unit of the stimulus) are one level:",
        f"    level_tolerance: {counts.tolerance!r}",
    ]


def _dataset(proposal: Proposal) -> list[str]:
    lines = [
        "datasets:",
        f"  - id: {json.dumps(proposal.dataset, ensure_ascii=False)}",
        f"    files: [{json.dumps(proposal.file, ensure_ascii=False)}]",
        *_columns(proposal),
    ]
    if not (proposal.delimiter == "comma" and proposal.decimal == "comma"):  # quoted decimal commas: leave it open
        lines.append(f"    delimiter: {proposal.delimiter}")
    lines.append(f"    decimal: {proposal.decimal}")
    lines += _tolerance(proposal)
    low, high = within(proposal.counts.low, proposal.counts.high)
    return [
        *lines,
        f"    # measuring_interval: [{low}, {high}]  # the default: from the first to the last level; never wider",
        "    evaluation: inverse  # CHECK: stimulus from response; or direct: response from stimulus",
        "    # record: {serial_number: ..., date: ..., reference_standard: ..., certificate: ...}",
    ]


def within(low: float, high: float) -> tuple[str, str]:
    """Two ends in six significant digits where that is exact or lies between them; in full where it does not."""
    short = number(low), number(high)
    return (short[0] if float(short[0]) >= low else repr(low)), (short[1] if float(short[1]) <= high else repr(high))


def _families(proposal: Proposal) -> list[str]:
    highest, freedom = support(proposal.counts.levels)
    degrees = "[1]" if highest == 1 else f"1..{highest}"
    levels = plural(proposal.counts.levels, "level")
    lines = [f"# {levels} less the parameters must leave {freedom} degrees of freedom or more."]
    if proposal.counts.levels < 4:
        lines = [f"# CHECK: with {levels} no candidate can be eligible; observe at least four levels, better seven."]
    return [*lines, "families:", f"  - {{family: polynomial, degree: {degrees}}}"]


def _validation(proposal: Proposal) -> list[str]:
    counts = proposal.counts
    lines = ["validation:"]
    if counts.levels < LEVELS_TO_DECIDE:
        lines.append(f"  # CHECK: {counts.levels} levels are too few for a scheme to decide; five are needed.")
    lines.append("  - {scheme: leave_one_level_out}  # all observations of a level together; this one decides")
    if counts.series > 1:
        lines.append("  - {scheme: leave_one_series_out}  # run to run; never decides alone")
    else:
        lines.append("  # leave_one_series_out does not apply: there is one series")
    lines.append("  - {scheme: leave_one_out}  # row by row, for comparison")
    if counts.levels >= LEVELS_TO_DRAW:
        lines.append("  - {scheme: bootstrap, draws: 2000}  # levels drawn with replacement")
    else:
        lines.append(f"  # bootstrap does not apply: fewer than {LEVELS_TO_DRAW} levels")
    return lines


def _selection(proposal: Proposal) -> list[str]:
    freedom = support(proposal.counts.levels)[1]
    trend = "falls" if proposal.falling else "rises"
    return [
        "selection:",
        "  loss: leave_one_level_out",
        "  rule: supported_gain  # the simplest candidate over which no gain of one with more parameters is supported",
        f"  # inverse evaluation needs a strictly monotone function; here the response {trend} with it overall",
        f"  require: {{monotone: true, degrees_of_freedom: {freedom}}}",
        "  # target_uncertainty: {expanded: ..., coverage_factor: 2}  # what you need, in the unit of the stimulus",
    ]


def write_study_text(proposal: Proposal) -> str:
    """Write the study.

    Parameters
    ----------
    proposal : Proposal

    Returns
    -------
    str
        YAML text that `fitlib.study.load_study` accepts, one newline at its end.
    """
    title = f"Calibration from {proposal.dataset}"
    draws = proposal.counts.levels >= LEVELS_TO_DRAW
    seed = (
        ["random_seed: 1  # any whole number; the bootstrap draws from it, and the same seed repeats it"]
        if draws
        else []
    )
    parts = [
        _head(proposal),
        [
            "format: 1",
            f"study: {json.dumps(proposal.name)}  # names the results folder",
            f"title: {json.dumps(title, ensure_ascii=False)}",
            'purpose: "to be filled in: what the function is for"  # CHECK',
            *seed,
        ],
        _quantity("stimulus", proposal.guesses["stimulus"].column)
        + _quantity("response", proposal.guesses["response"].column),
        _dataset(proposal),
        _families(proposal),
        ["weighting: none"],
        _validation(proposal),
        _selection(proposal),
    ]
    return "\n\n".join("\n".join(part) for part in parts) + "\n"
