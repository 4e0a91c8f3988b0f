"""Reading files: delimiters, decimal marks, encodings, line ends, quotes, and files that cannot be read."""

from dataclasses import replace

import numpy as np
import pytest

from fitlib.errors import InputError
from fitlib.observations import check_observations, read_observations, sources
from fitlib.observations.tables import sniff_delimiter
from fitlib.study import load_study

PLAIN = "x,y\n0,4.1\n1,5.2\n2,6.3\n"


@pytest.mark.parametrize(
    ("text", "extra"),
    [
        (PLAIN, ""),
        (PLAIN.replace(",", ";"), ""),
        (PLAIN.replace(",", "\t"), ""),
        (PLAIN.replace(",", ";").replace(".", ","), "decimal: comma"),
        ('x,y\n0,"4,1"\n1,"5,2"\n2,"6,3"\n', "decimal: comma"),
        ("\ufeff" + PLAIN, ""),
        (PLAIN.replace("\n", "\r\n"), ""),
        (PLAIN.replace("\n", "\r"), ""),
        (PLAIN.rstrip("\n"), ""),
        ('"x", "y"\n 0, 4.1\n"1",5.2\n2,"6.3"\n', ""),
        ("note;x;y\na,b;0;4.1\n;1;5.2\nc;2;6.3\n", "delimiter: semicolon"),
        ("x,y\n0,41e-1\n+1,5.2\n2.,.63e1\n", ""),
    ],
)
def test_the_same_numbers_are_read_from_every_way_of_writing_them(read, text, extra):
    found = read({"a.csv": text}, extra)
    np.testing.assert_array_equal(found.stimulus, [0, 1, 2])
    np.testing.assert_array_equal(found.response, [4.1, 5.2, 6.3])
    assert found.row.tolist() == [2, 3, 4]


def test_digits_are_read_to_the_last_one(read):
    found = read({"a.csv": "x,y\n0.1,0.30000000000000004\n1e-7,-12345678.912345678\n"})
    assert found.response.tolist() == [0.30000000000000004, -12345678.912345678]


@pytest.mark.parametrize(
    ("header", "delimiter"),
    [
        ("x,y", "comma"),
        ("x;y", "semicolon"),
        ("x\ty", "tab"),
        ("level, m;current, mA", "semicolon"),
        ('"a;b;c",y', "comma"),
        ("x", "comma"),
        ("\n\nx;y", "semicolon"),
    ],
)
def test_the_delimiter_is_taken_from_the_header_line(header, delimiter):
    assert sniff_delimiter(header + "\n1,2;3\n") == delimiter


def test_blank_lines_are_counted_and_told_and_do_not_shift_the_rows(read):
    found = read({"a.csv": "\nx,y\n0,1\n\n1,2\n , \n2,3\n"})
    assert found.row.tolist() == [3, 5, 7]
    assert found.notes == ("a.csv: 3 blank lines passed over",)


def test_a_row_that_spans_lines_is_named_by_its_first_line(read):
    found = read({"a.csv": 'x,y,note\n0,1,"two\nlines"\n1,2,\n'})
    assert found.row.tolist() == [2, 4]


def test_raw_files_keep_their_bytes(read, tmp_path):
    data = b"\xef\xbb\xbfx;y\r\n\r\n0;1,5\r\n1;2,5\r\n"
    read({"a.csv": data}, "decimal: comma")
    assert (tmp_path / "bench" / "a.csv").read_bytes() == data


def test_several_files_are_read_in_the_order_of_the_study(read):
    found = read({"b.csv": "x,y\n0,1\n1,2\n", "a.csv": "y;x\n9;5\n"})
    assert found.file == ("b.csv", "b.csv", "a.csv")
    assert found.stimulus.tolist() == [0, 1, 5]
    assert [account.file for account in found.account] == ["b.csv", "a.csv"]


@pytest.mark.parametrize(
    ("content", "line", "message"),
    [
        (b"", None, "the file is empty; a header line and rows are expected"),
        (b"\n\n", None, "the file is empty; a header line and rows are expected"),
        (b"x,y\n", None, "the file holds a header line only; rows are expected"),
        (b"x,y\n0,1\n1,2\xb0\n", 3, "byte 11 (0xb0) is not UTF-8 text; save the file as UTF-8"),
        (b"\xef\xbb\xbfx,y\r\n0,\xe4\r\n", 2, "byte 10 (0xe4) is not UTF-8 text; save the file as UTF-8"),
        ("x,y\n0,1\n".encode("utf-16"), 1, "is encoded as UTF-16 (byte order mark at byte 0); save it as UTF-8"),
        (b"x,y,x\n0,1,2\n", 1, 'column name "x" occurs 2 times (fields 1, 3)'),
        (b'x,y\n0,1\n1,"2\n2,3\n', 3, "a quotation mark opened in this row is not closed"),
    ],
)
def test_a_file_that_cannot_be_read_gives_one_plain_message(problems, content, line, message):
    found = [problem for problem in problems({"a.csv": content}) if problem.severity == "error"]
    assert [(p.file, p.line, p.key, p.message) for p in found] == [("bench/a.csv", line, "datasets[0]", message)]


def test_a_missing_column_is_blamed_on_the_key_that_names_it(problems):
    (found,) = problems({"a.csv": "x,yy\n0,1\n"})
    assert str(found) == (
        "bench/study.yaml:9: datasets[0].columns.response: "
        'column "y" is not in a.csv; its columns are "x", "yy"; did you mean "yy"?'
    )


def test_a_missing_column_is_blamed_on_the_defaults_where_they_name_it(load, tmp_path):
    load({"a.csv": PLAIN})
    path = tmp_path / "bench" / "study.yaml"
    text = path.read_text().replace("    columns: {stimulus: x, response: y}\n", "")
    path.write_text(text.replace("datasets:", "dataset_defaults:\n  columns: {stimulus: x, response: Y2}\ndatasets:"))
    (found,), _ = check_observations(load_study("bench/study.yaml"))
    assert (found.line, found.key) == (7, "dataset_defaults.columns.response")
    assert found.message.startswith('column "Y2" is not in a.csv; its columns are')


def test_missing_columns_are_all_named_at_once_with_the_delimiter_hint(problems):
    found = problems({"a.csv": "x;y\n0;1\n"}, "delimiter: comma")
    assert [problem.key for problem in found] == ["datasets[0].columns.stimulus", "datasets[0].columns.response"]
    assert all("declare the delimiter" in problem.message for problem in found)


def test_a_file_removed_after_the_study_was_loaded_is_told(load, tmp_path):
    study = load({"a.csv": PLAIN})
    (tmp_path / "bench" / "a.csv").unlink()
    found, readable = check_observations(study)
    assert [str(problem) for problem in found] == ["bench/a.csv: datasets[0]: there is no such file"]
    assert readable == []


def test_a_copy_of_a_file_is_refused(problems):
    found = problems({"a.csv": PLAIN, "b.csv": PLAIN})
    assert [str(problem) for problem in found] == [
        "bench/b.csv: datasets[0]: the file holds the same bytes as a.csv; its rows would count twice"
    ]


def test_a_file_given_twice_is_refused(load):
    study = load({"a.csv": PLAIN})
    with pytest.raises(InputError) as caught:
        read_observations(study, replace(study.datasets[0], files=("a.csv", "a.csv")))
    assert str(caught.value) == "bench/a.csv: datasets[0]: the file is given twice; its rows would count twice"


def test_too_many_rows_and_too_many_bytes_are_refused_before_reading(problems, monkeypatch):
    monkeypatch.setattr(sources, "ROWS_PER_DATASET", 2)
    (found,) = problems({"a.csv": PLAIN})
    assert (found.file, found.key) == ("bench/study.yaml", "datasets[0].files")
    assert found.message == 'dataset "A-1": its files hold 3 rows; at most 2 per dataset can be read'
    monkeypatch.setattr(sources, "BYTES_PER_DATASET", 21)
    (found,) = problems({"a.csv": PLAIN})
    assert found.message == 'dataset "A-1": its files hold 22 bytes; at most 21 per dataset can be read'


def test_exactly_the_largest_number_of_rows_is_read_blank_lines_aside(read, monkeypatch):
    monkeypatch.setattr(sources, "ROWS_PER_DATASET", 3)
    assert read({"a.csv": PLAIN + "\n\n"}).row.size == 3


def test_the_limits_are_those_of_the_study_format():
    assert (sources.ROWS_PER_DATASET, sources.BYTES_PER_DATASET) == (1_000_000, 200_000_000)
