"""``fitlib schema``: the JSON Schema of a study, for editors."""

from __future__ import annotations

from fitlib.cli.arguments import add_command
from fitlib.cli.output import say


def add(commands) -> None:
    """Add the command to the parser."""
    add_command(
        commands,
        "schema",
        execute,
        "print the JSON Schema of a study",
        "Print the JSON Schema of a study; an editor completes and checks a study with it.",
        "  fitlib schema > study.schema.json",
    )


def execute(arguments) -> int:
    """Print the schema, made from the models that read a study."""
    from fitlib.study import schema_text

    say(schema_text().removesuffix("\n"))
    return 0
