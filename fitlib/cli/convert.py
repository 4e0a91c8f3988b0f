"""``fitlib convert``: readings to values with their uncertainty, or a verdict that says why not."""

from __future__ import annotations

import sys

from fitlib.cli.arguments import add_command, number, positive_whole_number, require_file
from fitlib.cli.output import counted, refuse_existing, say, tell, write_new_file
from fitlib.errors import DecisionError, InputError, Problem


def add(commands) -> None:
    """Add the command to the parser."""
    parser = add_command(
        commands,
        "convert",
        execute,
        "convert readings with an issued function",
        "Convert readings with the function of a dataset. Outside the measuring interval there is a verdict and no\n"
        "value. Status 4 when the function is not adequate or when a reading gets no value.",
        "  fitlib convert results/level-sensors/rev-0001/functions/LS-101.json --response 12.4 --readings 3\n"
        "  fitlib convert LS-101.json --file readings.csv --column current_mA --output values.csv",
    )
    parser.add_argument("function", metavar="FUNCTION", help="functions/<dataset>.json of a revision")
    given = parser.add_mutually_exclusive_group(required=True)
    given.add_argument(
        "--response", metavar="Y", type=number, nargs="+", help="one or more responses, to be converted to the stimulus"
    )
    given.add_argument(
        "--stimulus", metavar="X", type=number, nargs="+", help="one or more stimuli: give the response expected there"
    )
    given.add_argument(
        "--file",
        metavar="FILE",
        help="a CSV file with one reading a row, - for standard input; responses, or stimuli for a function whose "
        "evaluation is direct",
    )
    parser.add_argument("--column", metavar="NAME", help="column of the readings (default: the only one with numbers)")
    parser.add_argument(
        "--delimiter", choices=("comma", "semicolon", "tab"), help="of the file (default: as its header)"
    )
    parser.add_argument("--decimal", choices=("point", "comma"), help="decimal mark of the file (default: point)")
    parser.add_argument(
        "--readings",
        metavar="M",
        type=positive_whole_number,
        default=1,
        help="how many readings were averaged in each number given (default: 1)",
    )
    parser.add_argument("--output", metavar="FILE", help="write a CSV table there; nothing is replaced")


def execute(arguments) -> int:
    """Convert; cautions go to standard error, values to standard output or to the file."""
    require_file(arguments.function, "the function of a dataset, functions/<dataset>.json")
    _refuse_without_effect(arguments)
    if arguments.output is not None:
        refuse_existing(arguments.output)
    from fitlib.conversion import load_function

    function = load_function(arguments.function)
    function.require_adequate()
    work = _convert_file if arguments.file is not None else _convert_numbers
    without, total = work(function, arguments)
    if without:
        raise DecisionError(f"{without} of {counted(total, 'reading')} without a value")
    return 0


def _refuse_without_effect(arguments) -> None:
    if arguments.file is not None:
        return
    problems = [
        Problem(file="fitlib convert", key=f"--{name}", message="has no effect without --file")
        for name in ("column", "delimiter", "decimal")
        if getattr(arguments, name) is not None
    ]
    if problems:
        raise InputError(problems)


def _tell_cautions(function) -> None:
    """Once with each conversion, where the person who uses the value reads them."""
    tell(f"{function.dataset}: {function.record['candidate']}, verdict {function.record['verdict']}")
    for caution in function.cautions:
        tell(f"caution: {caution}")
    if function.tie:
        tell("caution: the choice is a tie; the simplest of the candidates that could not be told apart was issued")


def _choice(function) -> str:
    return function.record["choice"] or ""


def _convert_numbers(function, arguments) -> tuple[int, int]:
    from fitlib.conversion import answers_table

    given_as = "response" if arguments.response is not None else "stimulus"
    convert = function.invert if given_as == "response" else function.evaluate
    answers = [convert(value, arguments.readings) for value in getattr(arguments, given_as)]
    _tell_cautions(function)
    if arguments.output is None:
        for answer in answers:
            say(sentence(answer, function.tie))
    else:
        _write(arguments.output, answers_table(answers, given_as, _choice(function)).text)
    return sum(answer.value is None for answer in answers), len(answers)


def sentence(answer, tie: bool) -> str:
    """Return one conversion as a line, rounded to its uncertainty.

    Parameters
    ----------
    answer : Conversion
    tie : bool
        Whether the function is one of several that could not be told apart.

    Returns
    -------
    str
    """
    from fitlib.conversion import rounded, with_unit

    given = with_unit(repr(answer.given), answer.given_unit)
    mark = " [tie]" if tie else ""
    if answer.value is None:
        return f"{given}: {answer.verdict}: {answer.note}{mark}"
    value, expanded = rounded(answer.value, answer.expanded_uncertainty)
    percent = f"{100 * answer.coverage_probability:g} %"
    read = "one reading" if answer.readings == 1 else f"mean of {answer.readings} readings"
    basis = f"k = {answer.coverage_factor:.2f}, {percent}, {read}"
    expanded = with_unit(expanded, answer.unit)
    return f"{given}: {with_unit(value, answer.unit)}, expanded uncertainty {expanded} ({basis}){mark}"


def _convert_file(function, arguments) -> tuple[int, int]:
    from fitlib.conversion import conversion_table, read_readings

    name, raw = _read_file(arguments.file)
    decimal = arguments.decimal or "point"
    readings = read_readings(raw, name, arguments.column, arguments.delimiter, decimal)
    table = conversion_table(readings, function.convert, arguments.readings, _choice(function))
    _tell_cautions(function)
    if arguments.output is None:
        sys.stdout.write(table.text)
    else:
        _write(arguments.output, table.text)
    total = len(readings.rows)
    counts = ", ".join(f"{count} {verdict}" for verdict, count in sorted(table.verdicts.items()))
    tell(f"{name}: column {readings.column}, {counted(total, 'reading')}: {counts}")
    _tell_faults(name, readings)
    return table.without_value, total


def _tell_faults(name: str, readings) -> None:
    """What could not be read, by row; of many the first, and how many there are."""
    faults = [(row.number, row.fault) for row in readings.rows if row.fault]
    for row, fault in faults[:10]:
        tell(f"{name}:{row}: {fault}")
    if len(faults) > 10:
        tell(f"{name}: {counted(len(faults) - 10, 'more row')} without a reading, see the column note")
    if readings.blank_lines:
        lines = ", ".join(map(str, readings.blank_lines[:10])) + (", …" if len(readings.blank_lines) > 10 else "")
        tell(f"{name}: {counted(len(readings.blank_lines), 'blank line')} passed over: line {lines}")


def _read_file(path: str) -> tuple[str, bytes]:
    if path == "-":
        return "standard input", sys.stdin.buffer.read()
    require_file(path, "a file of readings")
    with open(path, "rb") as file:
        return path, file.read()


def _write(path: str, text: str) -> None:
    write_new_file(path, text)
    tell(f"wrote {path}")
