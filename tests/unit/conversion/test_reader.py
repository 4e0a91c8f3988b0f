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


def refused(records, tmp_path, record):
    """The problems of a record whose digest fits."""
    return refusal(tmp_path, json.dumps(records["sealed"](record)))


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
    (problem,) = refused(records, tmp_path, record)
    assert problem.key == "format"


@pytest.mark.parametrize("key", sorted(CHECKS))
def test_every_key_is_required(key, records, tmp_path):
    record = records["rising"]()
    place(record, key, ...)
    assert [(problem.key, problem.message) for problem in refused(records, tmp_path, record)] == [(key, "is missing")]


@pytest.mark.parametrize("key", sorted(CHECKS))
def test_every_key_is_checked_for_its_kind(key, records, tmp_path):
    record = records["rising"]()
    place(record, key, {"neither": "text nor number"})
    (problem,) = refused(records, tmp_path, record)
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
    assert [problem.key for problem in refused(records, tmp_path, record)] == [key]


def test_a_number_too_large_for_a_float_is_refused(records, tmp_path):
    record = {**records["rising"](), "degrees_of_freedom": 10**400}
    assert [problem.key for problem in refused(records, tmp_path, record)] == ["degrees_of_freedom"]


def test_all_faults_are_told_at_once(records, tmp_path):
    record = records["rising"]()
    place(record, "verdict", "fine")
    place(record, "scaled.centre", "5")
    place(record, "cautions", ...)
    assert {problem.key for problem in refused(records, tmp_path, record)} == {
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
    (problem,) = refused(records, tmp_path, {**records["rising"](), "covariance": covariance})
    assert (problem.key, problem.message) == ("covariance", message)


def test_an_unknown_basis_is_told(records, tmp_path):
    record = records["rising"]()
    place(record, "scaled.basis", "splines")
    (problem,) = refused(records, tmp_path, record)
    assert problem.key == "scaled.basis"


@pytest.mark.parametrize("number", [0, 1, 2])
def test_one_changed_digit_of_a_coefficient_is_found(number, records, tmp_path):
    record = records["rising"]()
    record["scaled"]["coefficients"][number] *= 1 + 1e-4
    keys = {problem.key.split("[")[0] for problem in refused(records, tmp_path, record)}
    assert keys <= {"response_at_ends", "test_vectors"} and keys


def test_one_changed_digit_of_a_stored_response_is_found(records, tmp_path):
    record = records["rising"]()
    record["response_at_ends"][1] += 1e-5
    assert [problem.key for problem in refused(records, tmp_path, record)] == ["response_at_ends"]
    record = records["rising"]()
    record["test_vectors"][7]["response"] += 1e-5
    assert [problem.key for problem in refused(records, tmp_path, record)] == ["test_vectors[7]"]


def test_vectors_outside_the_interval_need_no_number(records, load):
    record = records["rising"]()
    record["test_vectors"].append({"stimulus": None, "response": 30.0, "verdict": "above_range"})
    assert load(record).convert(12.0).verdict == "within_interval"


def test_a_function_without_test_vectors_cannot_be_trusted(records, tmp_path):
    (problem,) = refused(records, tmp_path, {**records["rising"](), "test_vectors": []})
    assert problem.key == "test_vectors"


@pytest.mark.parametrize(
    ("key", "value"),
    [
        ("reading_standard_deviation", 1e308),
        ("level_standard_deviation", 1e61),
        ("level_standard_deviation", 1e-81),
        ("degrees_of_freedom", 1e-320),
        ("degrees_of_freedom", 0.49),
        ("weight_scale", 1e308),
        ("scaled.half_span", 1e-308),
        ("scaled.coefficients", [1e308, 1.0, 1.0]),
        ("covariance", [[1e308, 0, 0], [0, 1e308, 0], [0, 0, 1e308]]),
        ("response_at_ends", [0.0, -1e308]),
    ],
)
def test_sizes_with_which_nobody_can_compute_are_refused(key, value, records, tmp_path):
    record = records["rising"]()
    place(record, key, value)
    assert [problem.key for problem in refused(records, tmp_path, record)] == [key]


@pytest.mark.parametrize("value", [0, 0.0, 1e-70])
def test_a_standard_deviation_may_be_nothing_or_small(value, records, load):
    assert load(records["rising"](level_standard_deviation=value)).convert(12.0).verdict == "within_interval"


@pytest.mark.parametrize("key", ["candidate", "cautions", "verdict_reason", "level_standard_deviation", "record"])
def test_a_record_that_was_changed_is_refused(key, records, tmp_path):
    record = records["sealed"](records["rising"]())
    value = record[key]
    record[key] = {**value, "date": "2026-01-01"} if isinstance(value, dict) else value + value
    (problem,) = refusal(tmp_path, json.dumps(record))
    told = "the function was changed after it was issued; take it from its revision again"
    assert (problem.key, problem.message) == ("digest", told)


def test_a_record_without_its_digest_is_refused(records, tmp_path):
    (problem,) = refusal(tmp_path, json.dumps(records["rising"]()))
    assert (problem.key, problem.message) == ("digest", "is missing; take the function from its revision again")


@pytest.mark.parametrize("digest", ["", None, 7, "0" * 64, ["x"]])
def test_a_digest_of_another_kind_is_refused(digest, records, tmp_path):
    assert [each.key for each in refusal(tmp_path, json.dumps({**records["rising"](), "digest": digest}))] == ["digest"]


def test_a_text_that_cannot_be_encoded_is_a_changed_record(records, tmp_path):
    record = {**records["sealed"](records["rising"]()), "dataset": "\ud800"}
    assert [problem.key for problem in refusal(tmp_path, json.dumps(record))] == ["digest"]


def test_spaces_and_the_order_of_keys_do_not_count(records, tmp_path):
    record = records["sealed"](records["rising"]())
    path = tmp_path / "function.json"
    path.write_text(json.dumps(dict(reversed(record.items())), indent=3), encoding="utf-8")
    assert load_function(path).convert(12.0).verdict == "within_interval"


def test_a_change_is_told_beside_what_it_changed(records, tmp_path):
    record = {**records["sealed"](records["rising"]()), "degrees_of_freedom": 0}
    assert [problem.key for problem in refusal(tmp_path, json.dumps(record))] == ["digest", "degrees_of_freedom"]
