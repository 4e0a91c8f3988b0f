"""Argument types, the parser class and the checks of paths that several commands share."""

from __future__ import annotations

import argparse
import os
import stat

from fitlib.errors import InputError, Problem


def positive_whole_number(text: str) -> int:
    """Argument type: a whole number of 1 or more."""
    if text.strip().isascii() and text.strip().isdigit() and int(text) >= 1:
        return int(text)
    raise argparse.ArgumentTypeError(f"{text.strip()!r} is not allowed; a whole number of 1 or more")


def number(text: str) -> float:
    """Argument type: a number; what is not finite is left to the verdict of the conversion."""
    try:
        return float(text)
    except ValueError:
        hint = " (write a decimal point)" if "," in text else ""
        raise argparse.ArgumentTypeError(f"{text.strip()!r} is not a number{hint}") from None


def protect_negative_numbers(argv: list[str]) -> list[str]:
    """Put a space before ``-1e-3`` and its like, which argparse would take for options."""
    return [f" {word}" if word.startswith("-") and _is_number(word) else word for word in argv]


def _is_number(word: str) -> bool:
    try:
        float(word)
    except ValueError:
        return False
    return True


def available_cores() -> int:
    """Return how many processor cores this process may use."""
    if hasattr(os, "sched_getaffinity"):
        return len(os.sched_getaffinity(0))
    return os.cpu_count() or 1


def add_command(commands, name: str, execute, summary: str, details: str, example: str) -> argparse.ArgumentParser:
    """Add one command with its help text and its example to the parser, and return its own parser."""
    parser = commands.add_parser(
        name,
        help=summary,
        description=details,
        epilog=f"example:\n{example}",
        formatter_class=argparse.RawDescriptionHelpFormatter,
        allow_abbrev=False,
    )
    parser.set_defaults(execute=execute)
    return parser


def require_file(path: str, what: str) -> None:
    """Stop with a plain message unless ``path`` is a file that can be opened.

    Parameters
    ----------
    path : str
        As the user wrote it.
    what : str
        What the file is, for the message: ``the study``.

    Raises
    ------
    InputError
        The path is missing, a folder, something else than a file, or not readable.
    """
    mode = _mode(path, what)
    if stat.S_ISDIR(mode):
        raise _bad_path(path, f"is a folder; expected {what}")
    if not (stat.S_ISREG(mode) or stat.S_ISFIFO(mode)):
        raise _bad_path(path, f"is not a file; expected {what}")
    if not os.access(path, os.R_OK):
        raise _bad_path(path, "cannot be read: permission denied")


def require_folder(path: str, what: str) -> None:
    """Stop with a plain message unless ``path`` is a folder that can be listed.

    Parameters
    ----------
    path : str
        As the user wrote it.
    what : str
        What the folder is, for the message: ``a revision``.

    Raises
    ------
    InputError
        The path is missing, not a folder, or not readable.
    """
    if not stat.S_ISDIR(_mode(path, what)):
        raise _bad_path(path, f"is not a folder; expected {what}")
    if not os.access(path, os.R_OK | os.X_OK):
        raise _bad_path(path, "cannot be read: permission denied")


def _mode(path: str, what: str) -> int:
    try:
        return os.stat(path).st_mode
    except FileNotFoundError:
        raise _bad_path(path, f"does not exist; expected {what}") from None
    except (OSError, ValueError) as error:
        raise _bad_path(path, f"cannot be read: {getattr(error, 'strerror', None) or error}") from None


def _bad_path(path: str, message: str) -> InputError:
    return InputError([Problem(file=path or "''", message=message)])
