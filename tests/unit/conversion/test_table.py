"""A file of readings becomes a table: every row is there, with a value or with the reason why not."""

import csv
import io

import pytest

from fitlib.conversion import answers_table, conversion_table, read_readings
from fitlib.conversion.readings import parse_number
from fitlib.conversion.table import COLUMNS, guard
from fitlib.errors import InputError


def read(text, **settings):
    """Read a file that holds this text."""
    raw = text if isinstance(text, bytes) else text.encode()
    return read_readings(raw, "readings.csv", **settings)


def convert(text, function, **settings):
    """Convert a file; the table as a list of dicts, and the table itself."""
    table = conversion_table(read(text, **settings), function.convert)
    return list(csv.DictReader(io.StringIO(table.text, newline=""))), table


@pytest.mark.parametrize(
    ("cell", "decimal", "value"),
    [
        ("12.5", "point", 12.5),
        (" -1e-6 ", "point", -1e-6),
        (".5", "point", 0.5),
        ("5.", "point", 5.0),
        ("+3", "point", 3.0),
        ("12,5", "comma", 12.5),
        ("12", "comma", 12.0),
        ("12,5", "point", None),
        ("12.5", "comma", None),
        ("1,234,5", "comma", None),
        ("1_000", "point", None),
        ("\u0661", "point", None),
        ("nan", "point", None),
        ("inf", "point", None),
        ("0x1F", "point", None),
        ("", "point", None),
        ("n/a", "point", None),
    ],
)
def test_only_plain_numbers_are_numbers(cell, decimal, value):
    assert parse_number(cell, decimal) == value


def test_every_row_has_its_line_its_cells_and_its_answer(records, load):
    function = load(records["rising"]())
    rows, table = convert("tank,current_mA\nnorth,12.0\nsouth,30\n", function)
    assert list(rows[0]) == ["row", "tank", "current_mA", *COLUMNS]
    assert [(row["row"], row["tank"], row["verdict"]) for row in rows] == [
        ("2", "north", "within_interval"),
        ("3", "south", "above_range"),
    ]
    answer = function.convert(12.0)
    assert float(rows[0]["value"]) == answer.value
    assert float(rows[0]["expanded_uncertainty"]) == answer.expanded_uncertainty
    assert (rows[0]["unit"], rows[0]["choice"], rows[1]["value"]) == ("m", "decided", "")
    assert (table.without_value, table.verdicts) == (1, {"within_interval": 1, "above_range": 1})


def test_text_blanks_and_ragged_rows_are_reported_and_kept(records, load):
    text = "id,current_mA\na,12.0\nb,broken\nc,\nd,12,5\ne\n\nf,1e999\n"
    readings = read(text)
    assert [(row.number, row.fault) for row in readings.rows] == [
        (2, ""),
        (3, "the cell holds 'broken', which is not a number"),
        (4, "the cell is empty"),
        (5, "the row has 3 cells, the header 2"),
        (6, "the row has 1 cells, the header 2"),
        (8, ""),
    ]
    assert readings.blank_lines == (7,)
    rows, table = convert(text, load(records["rising"]()))
    assert [row["verdict"] for row in rows] == ["within_interval", *["not_a_number"] * 5]
    assert [row["note"] for row in rows][1:4] == [row.fault for row in readings.rows[1:4]]
    assert rows[3]["current_mA"] == "12;5"
    assert table.without_value == 5


def test_a_row_number_is_the_line_in_the_file_also_after_a_cell_with_line_ends():
    readings = read('note,y\n"two\nlines",5\nlast,6\n')
    assert [row.number for row in readings.rows] == [2, 4]


def test_the_only_column_with_numbers_is_taken():
    assert read("when,y\n2026-04-03,5\n2026-04-04,bad\n").column == "y"
    assert read("name,y\n1,5\nb,6\nc,7\n").column == "y"


def test_several_columns_with_numbers_need_a_name():
    with pytest.raises(InputError, match=r"several columns hold numbers \(n, y\); name the readings with --column"):
        read("n,y\n1,5\n2,6\n")
    assert read("n,y\n1,5\n2,6\n", column="y").column == "y"


def test_a_column_that_is_not_there_is_told_with_those_that_are():
    with pytest.raises(InputError, match="there is no column 'z'; the columns are n, y"):
        read("n,y\n1,5\n", column="z")


def test_a_file_without_numbers_is_told():
    with pytest.raises(InputError, match="no column holds numbers"):
        read("n,y\na,b\n")


@pytest.mark.parametrize(
    ("content", "message"),
    [
        ("", "has no readings"),
        ("y\n", "has no readings"),
        ("y,y\n1,2\n", "line=1|the header has 'y' more than once"),
        (b"\xff\xfey\x00", "UTF-16"),
        ("y\n5\n\u00e9\n".encode("latin-1"), "readings.csv:3: is not UTF-8"),
        ('y\n"5\n', "cannot be read as CSV"),
    ],
)
def test_a_file_that_is_no_table_is_refused(content, message):
    with pytest.raises(InputError, match=message):
        read(content)


def test_a_byte_order_mark_and_windows_line_ends_are_no_trouble():
    readings = read(b"\xef\xbb\xbfy\r\n5\r\n")
    assert (readings.column, readings.rows[0].reading) == ("y", 5.0)


def test_semicolons_and_decimal_commas():
    readings = read("tank;y\nnorth;12,5\n", decimal="comma")
    assert readings.rows[0].reading == 12.5
    (row,) = read("tank;y\nnorth;12,5\n", column="y").rows
    assert row.fault == "the cell holds '12,5', which is not a number; for a decimal comma give --decimal comma"
    (zero,) = read("tank;y\nnorth;0,0\n", column="y").rows
    assert "--decimal comma" in zero.fault
    with pytest.raises(InputError, match="another delimiter than comma"):
        read("y\n1,5\n", decimal="comma")


def test_a_delimiter_can_be_given():
    assert read("a,b\ty\n1\t5\n", delimiter="tab", column="y").header == ("a,b", "y")


@pytest.mark.parametrize("sign", ["=", "+", "-", "@", "\t", "\r"])
def test_text_that_a_spreadsheet_would_take_for_a_formula_is_guarded(sign, records, load):
    assert guard(f"{sign}SUM(A1)") == f"'{sign}SUM(A1)"
    rows, _ = convert(f'"{sign}name",y\n"{sign}cmd",5\n', load(records["rising"]()), column="y")
    (heading, cell) = list(rows[0].items())[1]
    assert cell == f"'{sign}cmd"
    assert heading == (f"'{sign}name" if sign not in "\t\r" else "name")  # names are stripped of white space


def test_numbers_are_not_guarded():
    assert [guard(cell) for cell in ("-3.2", "+1e-6", "-3,2", "plain")] == ["-3.2", "+1e-6", "-3,2", "plain"]


def test_columns_of_the_file_keep_apart_from_those_of_the_table(records, load):
    rows, _ = convert("value,y\nold,12\n", load(records["rising"]()))
    assert (rows[0]["value_in_file"], rows[0]["unit"]) == ("old", "m")


def test_a_tie_is_marked_in_every_row(records, load):
    function = load(records["rising"](choice="tie"))
    table = conversion_table(read("y\n5\n50\n"), function.convert, choice="tie")
    assert [row["choice"] for row in csv.DictReader(io.StringIO(table.text))] == ["tie", "tie"]


def test_single_numbers_make_a_table_too(records, load):
    function = load(records["rising"]())
    table = answers_table([function.convert(12.0), function.convert(99.0)], "response")
    rows = list(csv.DictReader(io.StringIO(table.text)))
    assert [row["response"] for row in rows] == ["12.0", "99.0"]
    assert (rows[0]["response_unit"], table.without_value) == ("mA", 1)


SIGNS = ["=", "+", "-", "@", "\t", " =", "'=", "\uff1d"]


def test_every_cell_that_is_carried_through_is_guarded(records, load):
    names = [f"{sign}n{place}" for place, sign in enumerate(SIGNS)]
    cells = [f"{sign}cmd" for sign in SIGNS]
    text = "\n".join([",".join([*names, "y"]), ",".join([*cells, "12.0"]), ",".join([*cells, "bad"])]) + "\n"
    rows, _ = convert(text, load(records["rising"]()), column="y")
    for row in rows:
        assert list(row.values())[1 : len(cells) + 1] == [f"'{cell}" for cell in cells]
        # names are stripped of white space before they are guarded
        assert list(row)[1 : len(cells) + 1] == ["'=n0", "'+n1", "'-n2", "'@n3", "n4", "'=n5", "''=n6", "'\uff1dn7"]


def test_units_are_guarded_in_every_column(records, load):
    record = records["rising"](
        response={"quantity": "current", "unit": "=A1"}, stimulus={"quantity": "l", "unit": "@m"}
    )
    table = answers_table([load(record).convert(12.0)], "response")
    (row,) = csv.DictReader(io.StringIO(table.text))
    assert (row["response_unit"], row["unit"]) == ("'=A1", "'@m")


@pytest.mark.parametrize("response", [-12.0, 99.0, 12.0, float("nan")])
def test_no_note_begins_with_a_sign(response, records, load):
    function = load(records["rising"]())
    for answer in (function.invert(response), function.evaluate(response)):
        assert answer.note == guard(answer.note)
    refused = function.invert(-12.0).note
    assert refused.startswith("response -12 mA lies beyond 4 mA, the response at 0 m")
    assert function.evaluate(-12.0).note.startswith("stimulus -12 m lies below the lower end")


def test_no_fault_of_a_row_begins_with_a_sign_or_an_apostrophe():
    faults = [row.fault for row in read("id,y\na,=1\nb,-x\nc,\nd,1,2\n", column="y").rows]
    assert all(fault[0].isalpha() and fault == guard(fault) for fault in faults)
    assert faults[0] == "the cell holds '=1', which is not a number"


@pytest.mark.parametrize(
    ("text", "decimal"), [("12.3\n12.4\n", "point"), ("1;2;12,3\n2;2;12,4\n", "comma"), ("\n-1e3,4\n5,6\n", "point")]
)
def test_a_file_without_a_header_row_is_refused(text, decimal):
    line = 2 if text.startswith("\n") else 1
    with pytest.raises(InputError, match=f"readings.csv:{line}: the first row holds numbers and no names"):
        read(text, decimal=decimal)


def test_one_name_makes_a_header():
    assert read("2026,y\n5,6\n", column="y").header == ("2026", "y")
