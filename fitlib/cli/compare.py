"""``fitlib compare``: what differs between two revisions."""

from __future__ import annotations

from fitlib.cli.arguments import add_command, require_folder
from fitlib.cli.output import say


def add(commands) -> None:
    """Add the command to the parser."""
    parser = add_command(
        commands,
        "compare",
        execute,
        "tell what differs between two revisions",
        "Tell what differs between two revisions: data, settings, choices, verdicts, the functions themselves.",
        "  fitlib compare results/level-sensors/rev-0001 results/level-sensors/rev-0002",
    )
    parser.add_argument("earlier", metavar="REV", help="the earlier revision, a folder")
    parser.add_argument("later", metavar="REV", help="the later revision, a folder")


def execute(arguments) -> int:
    """Compare; print one line per difference."""
    from fitlib.revision import compare_revisions

    require_folder(arguments.earlier, "a revision")
    require_folder(arguments.later, "a revision")
    for line in compare_revisions(arguments.earlier, arguments.later).lines():
        say(line)
    return 0
