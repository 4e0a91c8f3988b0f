"""Dataset ids and the names of their files."""

from __future__ import annotations

import hashlib

import pytest

from fitlib.study import file_name_of

ENTRY = "  - {{id: '{}', files: [data/fm-2.csv], columns: {{stimulus: a, response: b}}}}\nfamilies:"


@pytest.mark.parametrize("safe", ["LS-101", "a", "9", "A.b_c-d", "x" * 60, "com", "console", "lpt10"])
def test_a_safe_id_is_its_own_file_name(safe):
    assert file_name_of(safe) == safe


@pytest.mark.parametrize(
    "unsafe",
    ["", "a b", "a/b", "..", ".a", "-a", "_a", "a.", "x" * 61, "é", "con", "NUL", "com1.x", "Lpt9", "d~1"],
)
def test_any_other_id_is_named_by_its_digest(unsafe):
    assert file_name_of(unsafe) == "d~" + hashlib.sha256(unsafe.encode()).hexdigest()[:16]


@pytest.mark.parametrize(
    ("other", "word"),
    [("FM-1", "is taken by datasets[0];"), ("fm-1", "is taken by datasets[0], written 'FM-1'")],
)
def test_an_id_is_taken_once_without_regard_to_case(bench, valid, other, word):
    line, key, message = bench.only(valid, ("families:", ENTRY.format(other)))
    assert (line, key) == (10, "datasets[1].id") and word in message


def test_ids_that_differ_in_the_spelling_of_an_accent_are_one(bench, valid):
    text = valid.replace("id: FM-1", "id: caf\u00e9")
    assert "is taken by" in bench.only(text, ("families:", ENTRY.format("cafe\u0301")))[2]


def test_sharp_s_and_its_capitals_are_one(bench, valid):
    text = valid.replace("id: FM-1", "id: Maß")
    assert "is taken by" in bench.only(text, ("families:", ENTRY.format("MASS")))[2]


def test_an_id_from_a_file_is_compared_with_those_written(bench, valid):
    entry = "  - {ids_from: data/fm-*.csv, columns: {stimulus: a, response: b}}\nfamilies:"
    _, key, message = bench.only(valid, ("families:", entry))
    assert key == "datasets[1].ids_from" and "'fm-1' is taken by datasets[0], written 'FM-1'" in message


def test_an_id_of_a_hundred_characters_with_any_script_is_allowed(bench, valid):
    name = "水位計/" + "x" * 96
    dataset = bench.load(valid, ("id: FM-1", f"id: '{name}'")).datasets[0]
    assert dataset.id == name and dataset.file_name.startswith("d~")


def test_datasets_are_sorted_without_regard_to_case(bench, valid):
    rest = "".join(ENTRY.format(name).removesuffix("families:") for name in ("b", "C", "a"))
    study = bench.load(valid, ("families:", f"{rest}families:"))
    assert [dataset.id for dataset in study.datasets] == ["a", "b", "C", "FM-1"]
    assert [dataset.key for dataset in study.datasets] == ["datasets[3]", "datasets[1]", "datasets[2]", "datasets[0]"]
