"""The command ``fitlib``: arguments, exit statuses, what is printed."""

from fitlib.cli.dispatch import main

__all__ = ["main"]
