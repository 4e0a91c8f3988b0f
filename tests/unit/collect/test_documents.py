"""JSON documents: the same bytes, no number that is none."""

import json

import pytest

from fitlib.collect import dump_json, function_files


def test_keys_are_sorted_and_numbers_keep_their_digits():
    assert (
        dump_json({"b": 0.1 + 0.2, "a": [1, None, True]})
        == json.dumps({"a": [1, None, True], "b": 0.30000000000000004}, indent=2) + "\n"
    )


def test_words_stay_readable():
    assert "23 °C" in dump_json({"conditions": "23 °C"})


def test_a_number_that_is_none_is_refused():
    with pytest.raises(ValueError):
        dump_json({"loss": float("nan")})


def test_each_issued_function_has_a_file(synthetic):
    bundle = synthetic.make_bundle([synthetic.make_result("=1+1", file_name="d~0123456789abcdef")])
    files = function_files(bundle)
    assert list(files) == ["functions/d~0123456789abcdef.json"]
    assert json.loads(files["functions/d~0123456789abcdef.json"])["dataset"] == "=1+1"


def test_a_dataset_without_function_has_no_file(synthetic):
    bundle = synthetic.make_bundle()
    bundle["results"][0]["function"] = None
    assert list(function_files(bundle)) == ["functions/TG-2.json"]


def test_two_datasets_never_share_a_file(synthetic):
    bundle = synthetic.make_bundle([synthetic.make_result("a"), synthetic.make_result("b", file_name="A")])
    with pytest.raises(ValueError, match="two datasets"):
        function_files(bundle)
