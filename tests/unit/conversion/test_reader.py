"""A damaged function file is refused in plain words, with every fault at once."""

import json

import pytest

from fitlib.conversion import load_function
from fitlib.conversion.reader import CHECKS
from fitlib.errors import InputError


def refusal(tmp_path, content):
    """The problems of a file with this content."""
    path = tmp_path / "LS-101.json"
    path.write_bytes(content if isinstance(content, bytes) else content.encode())
    with pytest.raises(InputError) as caught:
        load_function(path)
    assert all(problem.file == str(path) for problem in caught.value.problems)
    return caught.value.problems


def place(record, key, value):
    """Put a value at a dotted key; remove the key when the value is Ellipsis."""
    *parents, last = key.split(".")
    for parent in parents:
        record = record[parent]
    if value is ...:
        del record[last]
    else:
        record[last] = value


@pytest.mark.parametrize(
    ("content", "message"),
    [
        ("", "not JSON"),
        ('{"format": 1', "not JSON"),
        (b"\xff\xfe{", "byte 1 is not UTF-8"),
        ('{"format": 1, "format": 1}', "'format' stands twice"),
        ('{"format": 1, "power_shift": NaN}', "NaN is not a number"),
        ('{"format": 1, "power_shift": ' + "9" * 5000 + "}", "a number too long"),
        ("[" * 100_000, "nested too deeply"),
        ("[]", "not a function that fitlib issued"),
        ('{"dataset": "LS-101"}', "the key format is missing"),
        ('{"format": 2}', "2 is not known; this version of fitlib reads format 1"),
        ('{"format": "1"}', '"1" is not known'),
        ('{"format": true}', "true is not known"),
    ],
)
def test_what_is_no_function_file_is_refused(content, message, tmp_path):
    (problem,) = refusal(tmp_path, content)
    assert message in str(problem)


def test_broken_json_names_line_and_column(tmp_path):
    (problem,) = refusal(tmp_path, '{\n "format": 1,\n oops\n}')
    assert (problem.line, problem.column) == (3, 2)


def test_a_folder_is_not_a_function(tmp_path):
    with pytest.raises(InputError, match="is a folder"):
        load_function(tmp_path)


def test_the_format_comes_first(records, tmp_path):
    record = {**records["rising"](), "format": 7, "covariance": "gone"}
    (problem,) = refusal(tmp_path, json.dumps(record))
    assert problem.key == "format"


@pytest.mark.parametrize("key", sorted(CHECKS))
def test_every_key_is_required(key, records, tmp_path):
    record = records["rising"]()
    place(record, key, ...)
    assert [(problem.key, problem.message) for problem in refusal(tmp_path, json.dumps(record))] == [
        (key, "is missing")
    ]


@pytest.mark.parametrize("key", sorted(CHECKS))
def test_every_key_is_checked_for_its_kind(key, records, tmp_path):
    record = records["rising"]()
    place(record, key, {"neither": "text nor number"})
    (problem,) = refusal(tmp_path, json.dumps(record))
    assert problem.key == key
    assert "is not allowed; " in problem.message


@pytest.mark.parametrize(
    ("key", "value"),
    [
        ("measuring_interval", [10.0, 0.0]),
        ("measuring_interval", [0.0, 0.0]),
        ("measuring_interval", [0.0, True]),
        ("degrees_of_freedom", 0),
        ("reading_standard_deviation", -1e-9),
        ("scaled.half_span", 0.0),
        ("scaled.coefficients", []),
        ("scaled.coefficients", [1.0, None, 2.0]),
        ("scaled.fixed_points", [[1.0]]),
        ("covariance", [[1.0, 0.0], [0.0]]),
        ("covariance", []),
        ("verdict", "fine"),
        ("choice", "lucky"),
        ("cautions", "none"),
        ("test_vectors", [{"stimulus": 1.0}]),
        ("test_vectors", [{"stimulus": None, "response": 1.0, "verdict": "within_interval"}]),
    ],
)
def test_values_that_cannot_be_are_refused(key, value, records, tmp_path):
    record = records["rising"]()
    place(record, key, value)
    assert [problem.key for problem in refusal(tmp_path, json.dumps(record))] == [key]


def test_a_number_too_large_for_a_float_is_refused(records, tmp_path):
    record = {**records["rising"](), "degrees_of_freedom": 10**400}
    assert [problem.key for problem in refusal(tmp_path, json.dumps(record))] == ["degrees_of_freedom"]


def test_all_faults_are_told_at_once(records, tmp_path):
    record = records["rising"]()
    place(record, "verdict", "fine")
    place(record, "scaled.centre", "5")
    place(record, "cautions", ...)
    assert {problem.key for problem in refusal(tmp_path, json.dumps(record))} == {
        "verdict",
        "scaled.centre",
        "cautions",
    }


@pytest.mark.parametrize(
    ("covariance", "message"),
    [
        ([[1.0]], "has 1 rows; one for each of the 3 coefficients"),
        ([[1.0, 0, 0], [0, -1.0, 0], [0, 0, 1.0]], "has a negative variance"),
        ([[1.0, 0.5, 0], [0, 1.0, 0], [0, 0, 1.0]], "is not symmetric"),
    ],
)
def test_a_covariance_that_cannot_be_is_refused(covariance, message, records, tmp_path):
    (problem,) = refusal(tmp_path, json.dumps({**records["rising"](), "covariance": covariance}))
    assert (problem.key, problem.message) == ("covariance", message)


def test_an_unknown_basis_is_told(records, tmp_path):
    record = records["rising"]()
    place(record, "scaled.basis", "splines")
    (problem,) = refusal(tmp_path, json.dumps(record))
    assert problem.key == "scaled.basis"


@pytest.mark.parametrize("number", [0, 1, 2])
def test_one_changed_digit_of_a_coefficient_is_found(number, records, tmp_path):
    record = records["rising"]()
    record["scaled"]["coefficients"][number] *= 1 + 1e-4
    keys = {problem.key.split("[")[0] for problem in refusal(tmp_path, json.dumps(record))}
    assert keys <= {"response_at_ends", "test_vectors"} and keys


def test_one_changed_digit_of_a_stored_response_is_found(records, tmp_path):
    record = records["rising"]()
    record["response_at_ends"][1] += 1e-5
    assert [problem.key for problem in refusal(tmp_path, json.dumps(record))] == ["response_at_ends"]
    record = records["rising"]()
    record["test_vectors"][7]["response"] += 1e-5
    assert [problem.key for problem in refusal(tmp_path, json.dumps(record))] == ["test_vectors[7]"]


def test_vectors_outside_the_interval_need_no_number(records, load):
    record = records["rising"]()
    record["test_vectors"].append({"stimulus": None, "response": 30.0, "verdict": "above_range"})
    assert load(record).convert(12.0).verdict == "within_interval"


def test_a_function_without_test_vectors_cannot_be_trusted(records, tmp_path):
    (problem,) = refusal(tmp_path, json.dumps({**records["rising"](), "test_vectors": []}))
    assert problem.key == "test_vectors"
