"""The entry point: reads the command line, calls one command, turns every failure into one exit status.

0 done; 1 failure; 2 the user's input; 3 verification failed; 4 a verdict needs a person; 130 interrupted.
"""

from __future__ import annotations

import argparse
import os
import sys

from fitlib.cli import check, compare, convert, run, schema, start, verify
from fitlib.cli.arguments import protect_negative_numbers
from fitlib.cli.output import tell
from fitlib.errors import FitlibError, InputError

INTERRUPTED = 130  # 128 + SIGINT, as shells have it
CLOSED_PIPE = 141  # 128 + SIGPIPE

EXAMPLES = """\
examples:
  fitlib start readings.csv                     write a commented study beside the data
  fitlib check study.yaml                       every fault at once, before any work
  fitlib run study.yaml                         results/<study>/rev-0001
  fitlib convert results/<study>/rev-0001/functions/LS-101.json --response 12.4

exit status:
  0 done   1 failure   2 fault in your input   3 verification failed   4 a verdict needs a person
"""


class _ShowVersion(argparse.Action):
    """Print the version; the package's metadata are read only then."""

    def __init__(self, option_strings, dest, **settings):
        super().__init__(option_strings, dest, nargs=0, **settings)

    def __call__(self, parser, namespace, values, option_string=None):
        from importlib.metadata import version

        print(f"fitlib {version('fitlib')}")
        parser.exit()


class _Parser(argparse.ArgumentParser):
    """A parser that does not hide that its help could not be written."""

    def print_help(self, file=None):
        print(self.format_help(), end="", file=file or sys.stdout)


def build_parser() -> argparse.ArgumentParser:
    """Return the parser of the whole command line."""
    parser = _Parser(
        prog="fitlib",
        description="Choose, defend and hand over calibration functions fitted to reference and reading.",
        epilog=EXAMPLES,
        formatter_class=argparse.RawDescriptionHelpFormatter,
        allow_abbrev=False,
    )
    parser.add_argument("--version", action=_ShowVersion, help="print the version and stop")
    commands = parser.add_subparsers(title="commands", metavar="COMMAND", required=True)
    for command in (start, check, run, compare, verify, convert, schema):
        command.add(commands)
    return parser


def _engine_command(argv: list[str]) -> int | None:
    """Call what the workflow's jobs call; None when this is a command for people."""
    if argv[:1] == ["_batch"]:
        from fitlib.engine import batch_main

        return batch_main(argv[1:]) or 0
    if argv[:1] == ["_publish"]:
        from fitlib.engine import publish_main

        return publish_main(argv[1:]) or 0
    return None


def _execute(argv: list[str]) -> int:
    status = _engine_command(argv)
    if status is None:
        arguments = _parse(argv)
        status = arguments if isinstance(arguments, int) else arguments.execute(arguments)
    sys.stdout.flush()
    return status


def _parse(argv: list[str]) -> argparse.Namespace | int:
    """What was asked for; a status when help or the version was, or when the arguments have a fault."""
    try:
        return build_parser().parse_args(protect_negative_numbers(argv))
    except SystemExit as stop:
        return int(stop.code or 0)


def _tell_error(error: FitlibError) -> int:
    if isinstance(error, InputError):
        for problem in error.problems:
            tell(str(problem))
    else:
        tell(f"fitlib: {error}")
    return error.exit_status


def _close_pipe() -> int:
    """Nobody reads standard output any more: send what is left nowhere, so that the interpreter does not complain."""
    try:
        nowhere = os.open(os.devnull, os.O_WRONLY)
        os.dup2(nowhere, sys.stdout.fileno())
    except (OSError, ValueError):
        pass
    return CLOSED_PIPE


def _tell_unexpected(error: Exception, is_job: bool = False) -> int:
    """One line, and the details in a file; with FITLIB_DEBUG=1, and in the log of a job, before that line."""
    import traceback

    details = "".join(traceback.format_exception(error))
    line = f"fitlib: unexpected failure: {' '.join(f'{type(error).__name__}: {error}'.split())[:300]}"
    if is_job or os.environ.get("FITLIB_DEBUG") == "1":
        print(details, file=sys.stderr, end="")
    else:
        line = f"{line}; {_keep_details(details)}"
    tell(line)
    return 1


def _keep_details(details: str) -> str:
    import tempfile

    try:
        with tempfile.NamedTemporaryFile(
            "w", prefix="fitlib-failure-", suffix=".txt", delete=False, encoding="utf-8"
        ) as file:
            file.write(details)
    except OSError:
        return "set FITLIB_DEBUG=1 to see the details"
    return f"details in {file.name}"


def _tell_system(error: OSError) -> int:
    """A file or disk that failed while in use."""
    if os.environ.get("FITLIB_DEBUG") == "1":
        return _tell_unexpected(error)
    place = f"{error.filename}: " if error.filename else "while reading or writing: "
    tell(f"fitlib: {place}{error.strerror or error}")
    return 1


def main(argv: list[str] | None = None) -> int:
    """Run one command and return its exit status.

    Parameters
    ----------
    argv : list of str, optional
        The words after ``fitlib``; by default those of this process.

    Returns
    -------
    int
        0 done; 1 failure; 2 the user's input; 3 verification failed; 4 a verdict needs a person;
        130 interrupted; 141 nobody reads the output.
    """
    if argv is None:
        argv = sys.argv[1:]
        if hasattr(sys.stdout, "reconfigure"):
            sys.stdout.reconfigure(errors="backslashreplace")  # a unit such as °C never ends in a traceback
    try:
        return _execute(list(argv))
    except KeyboardInterrupt:
        tell("fitlib: interrupted")
        return INTERRUPTED
    except BrokenPipeError:
        return _close_pipe()
    except FitlibError as error:
        return _tell_error(error)
    except OSError as error:
        return _tell_system(error)
    except Exception as error:
        return _tell_unexpected(error, is_job=argv[:1] in (["_batch"], ["_publish"]))
