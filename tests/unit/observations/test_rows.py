"""Faults of single rows, exclusions, verification points, the account, and notes."""

import numpy as np
import pytest

from fitlib.errors import InputError
from fitlib.observations import FileAccount, check_observations, read_observations
from fitlib.observations.numbers import explain, read_number
from fitlib.study import load_study

FAULTS = """\
x,y,run,way
0,1,1,rising
1,,1,rising
2,NA,1,rising
3,inf,1,rising
4,abc,1,rising
5,12.5 mA,1,rising
6,"1,234.5",1,rising
7,"2,5",1,rising
8,1e999,1,rising
9,\u22123,1,rising
10,1,1
11,1,1,rising,extra
12,1,,rising
13,1,1,sideways
14,"a"b,1,rising
nan,1,1,Up
15,2,1,DOWN
"""
EXPECTED = {
    3: "missing value (the field is empty)",
    4: 'missing value ("NA")',
    5: '"inf" is infinite',
    6: '"abc" is not a number',
    7: '"12.5 mA" is a number with text behind it',
    8: '"1,234.5" has a thousands sign',
    9: "if it is the decimal mark, declare `decimal: comma`",
    10: "beyond the sizes fitlib computes with",
    11: "typographic minus sign",
    12: "3 fields where the header has 4",
    13: "5 fields where the header has 4",
    14: 'column "run": missing value',
    15: '"sideways" is not a direction; rising, falling, up or down are allowed',
    16: "a closing quotation mark is followed by text",
    17: 'column "x": missing value ("nan")',
}
ALL = "stimulus: x, response: y, series: run, direction: way"


def test_every_fault_of_one_file_gives_exactly_one_message_with_its_row(problems):
    found = problems({"a.csv": FAULTS}, columns=ALL)
    errors = [problem for problem in found if problem.severity == "error"]
    assert [problem.line for problem in errors] == list(EXPECTED)
    for problem in errors:
        assert EXPECTED[problem.line] in problem.message
        assert (problem.file, problem.key) == ("bench/a.csv", "datasets[0]")
        if problem.line not in (12, 13, 16):
            assert problem.message.startswith('column "')


def test_rejected_rows_are_counted_in_the_account(problems):
    (account,) = [problem for problem in problems({"a.csv": FAULTS}, columns=ALL) if problem.severity == "warning"]
    assert account.message == ("17 rows read: 2 used, 0 excluded, 0 for verification, 15 rejected by the faults above")


def test_after_twenty_faults_of_one_kind_one_line_says_how_many_more(problems):
    rows = "".join(f"{n},\n" for n in range(30)) + "31,abc\n"
    found = [p for p in problems({"a.csv": "x,y\n" + rows}) if p.severity == "error"]
    assert len(found) == 22
    assert [p.line for p in found[:21]] == [*range(2, 22), 32]
    assert found[21].message == "10 more of the same kind (missing value), not listed"


@pytest.mark.parametrize(
    ("text", "decimal", "number"),
    [
        ("12.5", "point", 12.5),
        ("12,5", "comma", 12.5),
        ("12,5", "point", None),
        ("12.5", "comma", None),
        ("1_000", "point", None),
        ("٣", "point", None),
        ("1e-400", "point", None),
        ("0e-400", "point", 0.0),
        ("infinity", "point", None),
        ("1e5", "comma", 1e5),
        ("0x10", "point", None),
        (".", "point", None),
    ],
)
def test_only_plain_finite_numbers_with_the_declared_mark_are_numbers(text, decimal, number):
    assert read_number(text, decimal) == number


@pytest.mark.parametrize(
    ("text", "decimal", "kind"),
    [
        ("12.5", "comma", "decimal point"),
        ("1 234", "point", "thousands sign"),
        ("1'234'567", "point", "thousands sign"),
        ("1.234,5", "comma", "thousands sign"),
        ("-INF", "point", "infinite value"),
        ("n/a", "point", "missing value"),
        ("0.5V", "comma", "text behind a number"),
        ("1e-400", "point", "range of numbers"),
    ],
)
def test_what_is_no_number_is_called_by_its_kind(text, decimal, kind):
    assert explain(text, decimal)[0] == kind


def test_control_characters_of_a_field_do_not_reach_the_terminal(problems):
    (found, _) = problems({"a.csv": "x,y\n0,1\n1,\x1b[31mred\n"})
    assert "\x1b" not in found.message and "\\x1b[31mred" in found.message


EXCLUDE = "exclusions:\n  - {where: {%s}, reason: cable moved, person: shift lead, date: 2026-04-03}"


def test_an_excluded_row_keeps_its_numbers_and_carries_its_reason(read):
    found = read({"a.csv": "x,y,run\n0,1,1\n1,2,1\n1,7,2\n2,3,1\n"}, EXCLUDE % "run: 2, x: 1.0")
    assert found.state == ("used", "used", "excluded", "used")
    assert found.reason == ("", "", "cable moved (shift lead, 2026-04-03)", "")
    assert found.response[2] == 7 and found.level[2] == 1 and found.level_index.tolist() == [0, 1, -1, 2]


@pytest.mark.parametrize("where", ["run: 2", "row: 4", "run: 2, x: 1", "file: a.csv, row: 4", 'run: "2"', "y: bad"])
def test_an_unreadable_row_that_an_exclusion_covers_is_excluded_with_nan(read, where):
    found = read({"a.csv": "x,y,run\n0,1,1\n1,2,1\n1,bad,2\n2,3,1\n"}, EXCLUDE % where)
    assert found.state[2] == "excluded"
    assert np.isnan(found.response[2]) and found.stimulus[2] == 1
    assert found.account == (FileAccount("a.csv", 4, 3, 1, 0, 0),)


def test_a_row_with_too_few_fields_can_be_excluded_by_its_line(read):
    found = read({"a.csv": "x,y\n0,1\n1\n2,3\n"}, EXCLUDE % "row: 3")
    assert found.state == ("used", "excluded", "used")
    assert np.isnan(found.stimulus[1]) and np.isnan(found.level[1])


def test_an_unreadable_row_among_verification_points_stays_a_fault(problems):
    found = problems({"a.csv": "x,y,run\n0,1,1\n1,2,1\n1,NA,9\n"}, "verification_points: {where: {run: 9}}")
    assert found[0].line == 4 and found[1].message.endswith("0 for verification, 1 rejected by the faults above")


def test_the_account_balances_over_files_with_every_state(read):
    files = {"a.csv": "x,y,run\n0,1,1\n1,2,1\n2,3,9\n", "b.csv": "x,y,run\n0,1,2\n1,NA,3\n2,3,9\n"}
    found = read(
        files, EXCLUDE % "run: 3" + "\nverification_points: {where: {run: 9}}", "stimulus: x, response: y, series: run"
    )
    assert found.account == (FileAccount("a.csv", 3, 2, 0, 1, 0), FileAccount("b.csv", 3, 1, 1, 1, 0))
    assert found.state == ("used", "used", "verification", "used", "excluded", "verification")
    assert np.isnan(found.level[[2, 5]]).all(), "no used row lies at level 2"


def test_an_account_that_does_not_balance_is_a_fault_of_the_program():
    with pytest.raises(AssertionError, match="5 rows read, but 4 accounted for"):
        FileAccount("a.csv", 5, 1, 1, 1, 1)


def test_a_file_own_column_named_row_comes_before_the_line_number(read):
    found = read({"a.csv": "x,y,row\n0,1,7\n1,2,8\n2,3,9\n"}, EXCLUDE % "row: 8")
    assert found.state == ("used", "excluded", "used")


def test_numbers_are_compared_as_numbers_and_text_as_text(read):
    data = "x,y,run\n0,1,02\n1,2,2\n2,3,2.0\n3,4,b\n4,5,B\n"
    assert read({"a.csv": data}, EXCLUDE % "run: 2").state.count("excluded") == 3
    assert read({"a.csv": data}, EXCLUDE % 'run: "2"').state.count("excluded") == 1
    assert read({"a.csv": data}, EXCLUDE % "run: b").state.count("excluded") == 1


def test_a_number_is_matched_with_the_declared_decimal_mark(read):
    found = read({"a.csv": "x;y\n0,5;1\n1,5;2\n2,5;3\n"}, "decimal: comma\n" + EXCLUDE % "x: 1.5")
    assert found.state == ("used", "excluded", "used")


@pytest.mark.parametrize(
    ("where", "told"),
    [
        ("run: 7", '"run" holds "1", "2"'),
        ("rum: 1", 'there is no column "rum"; did you mean "run"?'),
        ("run: 2, x: 0", "each key agrees with some rows, but no row agrees with all of them"),
        ("row: 99", "rows are on lines 2 to 4 (a.csv)"),
        ("file: b.csv", '"file" holds "a.csv"'),
    ],
)
def test_a_where_that_matches_nothing_is_an_error_that_says_what_is_there(problems, where, told):
    (found,) = problems({"a.csv": "x,y,run\n0,1,1\n1,2,1\n1,3,2\n"}, EXCLUDE % where)
    assert found.key == "datasets[0].exclusions[0].where"
    assert found.file == "bench/study.yaml" and found.line == 11
    assert 'dataset "A-1"' in found.message and told in found.message


def test_a_number_that_matches_nothing_among_many_names_the_nearest(problems):
    rows = "".join(f"{n}.25,{n}\n" for n in range(12))
    (found,) = problems({"a.csv": "x,y\n" + rows}, EXCLUDE % "x: 4.2")
    assert 'the nearest number in "x" is 4.25' in found.message


def test_a_row_claimed_by_exclusion_and_verification_is_an_error(problems):
    (found,) = problems(
        {"a.csv": "x,y,run\n0,1,1\n1,2,1\n2,3,2\n"}, EXCLUDE % "x: 2" + "\nverification_points: {where: {run: 2}}"
    )
    assert "a.csv, row 4: claimed by exclusions and by verification points" in found.message


def test_a_row_number_that_stands_in_two_files_needs_the_file(problems, read):
    files = {"a.csv": "x,y\n0,1\n1,2\n", "b.csv": "x,y\n0,1\n1,3\n"}
    (found,) = problems(files, EXCLUDE % "row: 3")
    assert "row 3 stands in several files (a.csv, b.csv); add the key `file`" in found.message
    assert read(files, EXCLUDE % "row: 3, file: b.csv").state == ("used", "used", "used", "excluded")


def test_rows_that_repeat_an_earlier_row_are_noted_with_both_rows(read):
    found = read({"a.csv": "x,y\n0,1\n1,2\n0,1\n", "b.csv": "x,y\n1,2\n"})
    assert found.notes == (
        "2 rows repeat an earlier row each in every column; entered twice? "
        "a.csv row 4 = a.csv row 2, b.csv row 2 = a.csv row 3",
    )


def test_a_row_that_differs_in_any_column_is_not_called_a_repeat(read):
    assert read({"a.csv": "x,y,t\n0,1,1\n1,2,2\n0,1,3\n"}).notes == ()


def test_series_with_one_name_in_two_files_are_noted(read):
    files = {"a.csv": "x,y,run\n0,1,1\n1,2,1\n", "b.csv": "x,y,run\n0,1.1,1\n1,2.1,2\n"}
    (note,) = read(files, columns="stimulus: x, response: y, series: run").notes
    assert note.startswith('series "1" occur in several files (a.csv, b.csv) and are taken as the same series')


def test_directions_are_read_in_their_four_words(read):
    found = read(
        {"a.csv": "x,y,way\n0,1,up\n1,2,Rising\n1,3,DOWN\n0,1,falling\n"},
        columns="stimulus: x, response: y, direction: way",
    )
    assert found.direction == ("rising", "rising", "falling", "falling")


def test_weights_by_the_stimulus_name_the_rows_without_weight(problems):
    found = problems({"a.csv": "x,y\n0,1\n1,2\n-1,3\n"}, weighting="inverse_stimulus")
    assert [problem.line for problem in found] == [2, 4]
    assert "the stimulus -1 has no weight under `weighting: inverse_stimulus`" in found[1].message


def test_all_datasets_are_checked_at_once(load, tmp_path):
    load({"a.csv": "x,y\n0,1\n1,2\n"})
    text = (tmp_path / "bench" / "study.yaml").read_text()
    more = "datasets:\n  - {id: B-2, files: [b.csv], columns: {stimulus: x, response: y}}\n"
    more += "  - {id: C-3, files: [c.csv], columns: {stimulus: x, response: y}}\n"
    (tmp_path / "bench" / "study.yaml").write_text(text.replace("datasets:\n", more))
    (tmp_path / "bench" / "b.csv").write_text("x,y\n0,\n1,2\n")
    (tmp_path / "bench" / "c.csv").write_text("x,y\n0,a\n1,2\n")
    study = load_study("bench/study.yaml")
    found, readable = check_observations(study)
    assert [p.file for p in found if p.severity == "error"] == ["bench/b.csv", "bench/c.csv"]
    assert [observations.dataset for observations in readable] == ["A-1"]
    with pytest.raises(InputError):
        read_observations(study, study.datasets[1])
