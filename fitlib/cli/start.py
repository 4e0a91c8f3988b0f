"""``fitlib start``: a commented study from a data file."""

from __future__ import annotations

import os
import sys

from fitlib.cli.arguments import add_command, require_file
from fitlib.cli.output import refuse_existing, say, write_new_file
from fitlib.errors import InputError, Problem


def add(commands) -> None:
    """Add the command to the parser."""
    parser = add_command(
        commands,
        "start",
        execute,
        "write a commented study for a data file",
        "Look at a data file and write a study for it, with comments on what was guessed. Nothing is replaced.",
        "  fitlib start data/LS-101-spring.csv --study level-sensors",
    )
    parser.add_argument("data", metavar="DATA.csv", help="the data file")
    parser.add_argument("--study", metavar="NAME", help="name of the study (default: made from the file's name)")
    parser.add_argument(
        "--output",
        metavar="FILE",
        help="where to write, in the folder of the data; - is standard output (default: DATA-study.yaml)",
    )


def execute(arguments) -> int:
    """Propose a study; write it beside the data and say where."""
    from fitlib.start import propose_study

    require_file(arguments.data, "a data file")
    target = arguments.output or f"{os.path.splitext(arguments.data)[0]}-study.yaml"
    if target != "-":
        refuse_existing(target)
        _require_same_folder(arguments.data, target)
    text = propose_study(arguments.data, arguments.study)
    if target == "-":
        sys.stdout.write(text)
        return 0
    write_new_file(target, text)
    say(f"wrote {target}: read it, answer what it asks, then: fitlib check {target}")
    return 0


def _require_same_folder(data: str, target: str) -> None:
    """A study names its files relative to its own folder."""
    folder = os.path.dirname(data) or "."
    if os.path.realpath(folder) != os.path.realpath(os.path.dirname(target) or "."):
        message = f"a study stands in the folder of its data, here {folder}; write it there, or to - (standard output)"
        raise InputError([Problem(file=target, key="--output", message=message)])
