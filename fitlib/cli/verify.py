"""``fitlib verify``: is a revision still what its manifest says?"""

from __future__ import annotations

from fitlib.cli.arguments import add_command, require_folder
from fitlib.cli.output import counted, say, tell
from fitlib.errors import VerificationError


def add(commands) -> None:
    """Add the command to the parser."""
    parser = add_command(
        commands,
        "verify",
        execute,
        "tell whether a revision was altered",
        "Compare every file of a revision with its manifest. Status 3 when anything was altered, added or removed.",
        "  fitlib verify results/level-sensors/rev-0001",
    )
    parser.add_argument("revision", metavar="REV", help="the revision, a folder")


def execute(arguments) -> int:
    """Verify; print one line per difference, or that there is none."""
    from fitlib.revision import verify_revision

    require_folder(arguments.revision, "a revision")
    differences = list(verify_revision(arguments.revision))
    for difference in differences:
        tell(str(difference))
    if differences:
        count = counted(len(differences), "difference")
        raise VerificationError(f"{arguments.revision} is not what its manifest says: {count}")
    say(f"{arguments.revision}: every file is as its manifest says")
    return 0
