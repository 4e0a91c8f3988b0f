"""Unknown, missing and misplaced keys are named with the nearest one that is known."""

from __future__ import annotations

import pytest

from fitlib.study.keys import keys_by_place, study_keys


@pytest.mark.parametrize(
    ("old", "new", "line", "key", "word"),
    [
        ("title:", "purpos: x\ntitle:", 3, "purpos", "did you mean 'purpose'?"),
        ("families:", "familes:", 10, "familes", "did you mean 'families'?"),
        ("    columns:", "    colums:", 9, "datasets[0].colums", "did you mean 'columns'?"),
        ("unit: Hz", "units: Hz", 5, "response.units", "did you mean 'unit'?"),
        ("  rule:", "  requires: {monotone: true}\n  rule:", 14, "selection.requires", "did you mean 'require'?"),
        ("title:", "folds: 3\ntitle:", 3, "folds", "it belongs in validation[]"),
        ("title:", "monotone: true\ntitle:", 3, "monotone", "it belongs in selection.require"),
        ("title:", "zzzz: 3\ntitle:", 3, "zzzz", "known here: dataset_defaults, datasets"),
        ("title:", "a.b: 3\ntitle:", 3, "a.b", "known here: dataset_defaults"),
        ("title:", "__use_yte__: 1\ntitle:", 3, "__use_yte__", "unknown key"),
        ("1..3}", "1..3, fixed_point: [[0, 4]]}", 11, "families[0].fixed_point", "did you mean 'fixed_points'?"),
    ],
)
def test_an_unknown_key_is_told_with_its_line_and_a_way_on(bench, valid, old, new, line, key, word):
    found = [problem for problem in bench.problems(valid, (old, new)) if problem.key == key]
    assert len(found) == 1 and found[0].line == line and word in found[0].message


def test_a_misspelt_key_that_is_needed_gives_one_message(bench, valid):
    assert bench.only(valid, ("families:", "familes:"))[1] == "familes"


@pytest.mark.parametrize(
    "name", ["format", "study", "title", "stimulus", "response", "datasets", "families", "selection"]
)
def test_a_key_that_is_needed_is_missed(bench, valid, name):
    lines = valid.splitlines(keepends=True)
    start = next(n for n, line in enumerate(lines) if line.startswith(f"{name}:"))
    end = next((n for n in range(start + 1, len(lines)) if not lines[n].startswith(" ")), len(lines))
    assert bench.only("".join(lines[:start] + lines[end:])) == (1, name, "this key is missing")


def test_a_key_given_twice_is_an_error_with_both_lines(bench, valid):
    line, key, message = bench.only(valid, ("stimulus: {", "title: Other\nstimulus: {"))
    assert (line, key, message) == (4, "title", "the key is given twice; first in line 3")


def test_a_dataset_cannot_vanish_behind_a_second_list(bench, valid):
    line, key, _ = bench.only(valid + "datasets:\n  - {id: FM-2, files: [data/fm-2.csv]}\n")
    assert (line, key) == (15, "datasets")


def test_a_key_that_is_a_number_is_refused(bench, valid):
    line, key, message = bench.only(valid, ("columns:", "record: {2026: x}\n    columns:"))
    assert key == "datasets[0].record.2026" and "put it in quotes" in message


@pytest.mark.parametrize(
    ("entry", "key"),
    [
        ("{scheme: leave_one_level_out, folds: 5}", "validation[0].folds"),
        ("{scheme: leave_one_level_out, unit: level}", "validation[0].unit"),
        ("{scheme: leave_one_level_out}, {scheme: k_fold, folds: 5, draws: 100}", "validation[1].draws"),
        ("{scheme: leave_one_level_out}, {scheme: bootstrap, draws: 100, repeats: 2}", "validation[1].repeats"),
    ],
)
def test_a_key_of_another_scheme_has_no_effect_and_is_refused(bench, valid, entry, key):
    seed = "random_seed: 1\n" if "," in entry[32:] and "k_fold" in entry or "bootstrap" in entry else ""
    _, found, message = bench.only(valid, ("families:", f"{seed}validation: [{entry}]\nfamilies:"))
    assert found == key and "has no effect here" in message


def test_a_pattern_of_files_goes_without_an_id(bench, valid):
    _, key, message = bench.only(valid, ("    files: [data/fm-1.csv]", "    ids_from: data/fm-*.csv"))
    assert key == "datasets[0].id" and "either ids_from, or id and files" in message


@pytest.mark.parametrize("name", ["id: FM-9", "files: [data/fm-1.csv]", "ids_from: data/*.csv"])
def test_defaults_have_no_identity(bench, valid, name):
    _, key, _ = bench.only(valid, ("datasets:", f"dataset_defaults: {{{name}}}\ndatasets:"))
    assert key == f"dataset_defaults.{name.split(':')[0]}"


def test_the_list_of_keys_is_read_from_the_models():
    assert {"study", "level_tolerance", "folds", "draws", "ids_from", "coverage_factor", "where"} <= set(study_keys())
    assert keys_by_place()["selection.require"] == {"monotone", "degrees_of_freedom"}
    assert keys_by_place()["datasets[].exclusions[]"] == {"where", "reason", "person", "date"}


SEED_AND_SCHEMES = (
    "random_seed: 1\nvalidation: [{scheme: leave_one_level_out}, {scheme: bootstrap, draws: 50}]\nfamilies:"
)


@pytest.mark.parametrize(
    ("old", "new", "key"),
    [
        ("validation:", "validaton:", "validaton"),
        ("random_seed:", "random_sed:", "random_sed"),
        ("{scheme: bootstrap,", "{scheme: bootstrap, ", ""),
        ("loss:", "los:", "selection.los"),
        ("columns: {stimulus", "colums: {stimulus", "datasets[0].colums"),
    ],
)
def test_what_follows_only_from_a_misspelt_key_is_not_told(bench, valid, old, new, key):
    text = valid.replace("families:", SEED_AND_SCHEMES)
    if key:
        assert bench.only(text, (old, new))[1] == key
    else:
        bench.load(text, (old, new))


def test_a_misspelt_key_beside_the_right_one_hides_nothing(bench, valid):
    text = valid.replace(
        "families:", "random_seed: 1\nvalidaton: 3\nvalidation: [{scheme: leave_one_level_out}]\nfamilies:"
    )
    assert [problem.key for problem in bench.problems(text)] == ["random_seed", "validaton"]


def test_misspelt_defaults_do_not_blame_the_datasets(bench, valid):
    text = valid.replace("    columns: {stimulus: flow, response: hertz}\n", "").replace(
        "datasets:", "dataset_default:\n  columns: {stimulus: flow, response: hertz}\ndatasets:"
    )
    assert bench.only(text)[1] == "dataset_default"


def test_a_loss_that_is_misspelt_beside_a_rule_without_loss_is_told_once(bench, valid):
    assert bench.only(valid, ("loss:", "los:"), ("one_standard_error", "bic"))[1] == "selection.los"
