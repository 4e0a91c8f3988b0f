"""``fitlib convert``: values with their uncertainty, verdicts, cautions, and status 4 when a value is missing."""

import csv
import io
import sys
from pathlib import Path

import pytest

from fitlib.conversion import load_function


def test_a_reading_becomes_a_line_rounded_to_its_uncertainty(issue, fitlib):
    record = issue()
    status, out, err = fitlib("convert", "LS-101.json", "--response", "12.4", "--readings", "3")
    assert status == 0
    answer = load_function("LS-101.json").convert(12.4, 3)
    value, expanded = f"{answer.value:.4f}", f"{answer.expanded_uncertainty:.4f}"
    assert out == f"12.4 mA: {value} m, expanded uncertainty {expanded} m (k = 2.23, 95 %, mean of 3 readings)\n"
    assert err.splitlines() == [
        "LS-101: polynomial-2, verdict adequate",
        *(f"caution: {caution}" for caution in record["cautions"]),
        f"caution: {record['uncertainty_statement']}",
    ]


def test_several_readings_and_negative_ones(issue, fitlib):
    issue()
    status, out, err = fitlib("convert", "LS-101.json", "--response", "12.4", "-1e-3", "-5", "30")
    assert status == 4
    verdicts = [line.split(": ")[1] for line in out.splitlines()]
    assert verdicts[1:] == ["below_range", "below_range", "above_range"]
    assert err.splitlines()[-1] == "fitlib: 3 of 4 readings without a value"
    assert err.count("Not a substitute") == 1


def test_not_a_number_is_a_verdict_and_text_a_fault_of_the_arguments(issue, fitlib):
    issue()
    status, out, _ = fitlib("convert", "LS-101.json", "--response", "nan")
    assert (status, out) == (4, "nan mA: not_a_number: the response is not a number\n")
    status, out, err = fitlib("convert", "LS-101.json", "--response", "12,4")
    assert (status, out) == (2, "")
    assert "'12,4' is not a number (write a decimal point)" in err


@pytest.mark.parametrize("verdict", ["inadequate", "not_evaluated"])
def test_a_function_that_is_not_adequate_is_refused(verdict, issue, fitlib):
    issue(verdict=verdict, verdict_reason="smooth misfit")
    status, out, err = fitlib("convert", "LS-101.json", "--response", "12.4")
    assert (status, out) == (4, "")
    expected = f"converts nothing, the verdict on this function is {verdict}: smooth misfit"
    assert err == f"fitlib: LS-101.json: {expected}\n"
    assert fitlib("convert", "LS-101.json", "--file", "nowhere.csv") == (status, out, err)


def test_a_tie_is_marked(issue, fitlib):
    issue(choice="tie")
    status, out, err = fitlib("convert", "LS-101.json", "--response", "12.4")
    assert status == 0 and out.endswith(" [tie]\n") and "the choice is a tie" in err


def test_direct_evaluation_and_its_inverse(issue, fitlib):
    issue("pump")
    status, out, _ = fitlib("convert", "LS-101.json", "--stimulus", "80")
    assert status == 0 and out.startswith("80.0 m3/h: 38.568 m, expanded uncertainty 0.012 m")
    status, out, _ = fitlib("convert", "LS-101.json", "--response", "48.2", "48.6")
    assert status == 4
    first, second = out.splitlines()
    assert first.startswith("48.2 m: not_unique: response 48.2 m belongs to ") and "the function turns at " in first
    assert second.startswith("48.6 m: not_evaluated: ")
    assert fitlib("convert", "LS-101.json", "--stimulus", "120.1")[:2] == (
        4,
        "120.1 m3/h: above_range: stimulus 120.1 m3/h lies above the upper end of the measuring interval, 120 m3/h\n",
    )


def test_the_file_of_a_direct_function_holds_stimuli(issue, fitlib):
    issue("pump")
    Path("flows.csv").write_text("flow\n80\n")
    status, out, _ = fitlib("convert", "LS-101.json", "--file", "flows.csv")
    (row,) = csv.DictReader(io.StringIO(out))
    assert status == 0
    assert (row["unit"], float(row["value"])) == ("m", pytest.approx(38.568, abs=1e-9))


def test_a_file_becomes_a_table_and_what_is_wrong_is_told_by_row(issue, fitlib):
    issue()
    Path("readings.csv").write_text("tank,current_mA\nnorth,12.4\nsouth,\n=west,broken\n\neast,30\n")
    status, out, err = fitlib("convert", "LS-101.json", "--file", "readings.csv", "--column", "current_mA")
    rows = list(csv.DictReader(io.StringIO(out)))
    assert status == 4
    assert [(row["row"], row["tank"], row["verdict"]) for row in rows] == [
        ("2", "north", "within_interval"),
        ("3", "south", "not_a_number"),
        ("4", "'=west", "not_a_number"),
        ("6", "east", "above_range"),
    ]
    assert err.splitlines()[-5:] == [
        "readings.csv: column current_mA, 4 readings: 1 above_range, 2 not_a_number, 1 within_interval",
        "readings.csv:3: the cell is empty",
        "readings.csv:4: the cell holds 'broken', which is not a number",
        "readings.csv: 1 blank line passed over: line 5",
        "fitlib: 3 of 4 readings without a value",
    ]


def test_of_many_faults_the_first_are_told_and_all_are_counted(issue, fitlib):
    issue()
    Path("readings.csv").write_text("y\n12\n" + "x\n" * 30)
    status, out, err = fitlib("convert", "LS-101.json", "--file", "readings.csv", "--column", "y")
    assert status == 4 and out.count("\n") == 32
    assert err.count("is not a number") == 10
    assert "readings.csv: 20 more rows without a reading, see the column note" in err


def test_readings_can_come_from_standard_input(issue, fitlib, monkeypatch):
    issue()
    monkeypatch.setattr(sys, "stdin", io.TextIOWrapper(io.BytesIO(b"y;name\n12,4;a\n")))
    status, out, err = fitlib("convert", "LS-101.json", "--file", "-", "--decimal", "comma")
    assert status == 0 and "standard input: column y, 1 reading: 1 within_interval" in err
    assert float(next(csv.DictReader(io.StringIO(out)))["value"]) == load_function("LS-101.json").convert(12.4).value


def test_the_table_can_go_to_a_file_that_does_not_exist_yet(issue, fitlib):
    issue()
    words = ("convert", "LS-101.json", "--response", "12.4", "99", "--output", "values.csv")
    status, out, err = fitlib(*words)
    assert (status, out) == (4, "") and "wrote values.csv" in err
    rows = list(csv.DictReader(Path("values.csv").read_text(encoding="utf-8").splitlines()))
    assert [row["verdict"] for row in rows] == ["within_interval", "above_range"]
    written = Path("values.csv").read_bytes()
    status, _, err = fitlib(*words)
    assert (status, err) == (2, "values.csv: exists already and is not replaced; give another --output\n")
    assert Path("values.csv").read_bytes() == written


def test_options_of_the_file_without_a_file_are_refused(issue, fitlib):
    issue()
    status, _, err = fitlib("convert", "LS-101.json", "--response", "1", "--column", "y", "--decimal", "comma")
    assert status == 2
    assert err.splitlines() == [
        "fitlib convert: --column: has no effect without --file",
        "fitlib convert: --decimal: has no effect without --file",
    ]


@pytest.mark.parametrize("words", [(), ("--response", "1", "--file", "x.csv"), ("--response",), ("--readings", "0")])
def test_one_way_to_give_readings_is_needed(words, issue, fitlib):
    issue()
    assert fitlib("convert", "LS-101.json", *words)[0] == 2


@pytest.mark.parametrize(
    ("place", "message"),
    [("nowhere.csv", "does not exist; expected a file of readings"), (".", "is a folder; expected a file of readings")],
)
def test_a_wrong_readings_file_is_told(place, message, issue, fitlib):
    issue()
    status, out, err = fitlib("convert", "LS-101.json", "--file", place)
    assert (status, out, err) == (2, "", f"{place}: {message}\n")


def test_a_damaged_function_is_told_with_every_fault(issue, fitlib):
    issue(choice="lucky", verdict="fine")
    status, out, err = fitlib("convert", "LS-101.json", "--response", "1")
    assert (status, out) == (2, "")
    assert err.splitlines() == [
        'LS-101.json: verdict: "fine" is not allowed; adequate or inadequate or not_evaluated',
        'LS-101.json: choice: "lucky" is not allowed; decided or tie',
    ]


def test_one_reading_is_not_called_a_mean(issue, fitlib):
    issue()
    _, out, _ = fitlib("convert", "LS-101.json", "--response", "12.4")
    assert "95 %, one reading)" in out
    _, out, _ = fitlib("convert", "LS-101.json", "--response", "12.4", "--readings", "3")
    assert "95 %, mean of 3 readings)" in out


def test_a_function_edited_by_hand_is_refused(issue, fitlib):
    issue()
    path = Path("LS-101.json")
    path.write_text(
        path.read_text().replace('"reading_standard_deviation": 0.004', '"reading_standard_deviation": 1e308')
    )
    status, out, err = fitlib("convert", "LS-101.json", "--response", "12.4")
    assert (status, out) == (2, "")
    assert "LS-101.json: digest: the function was changed after it was issued" in err
    assert "LS-101.json: reading_standard_deviation: 1e+308 is not allowed" in err
