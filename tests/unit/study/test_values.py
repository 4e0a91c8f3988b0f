"""What each value of a study may be, and how a wrong one is told."""

from __future__ import annotations

import pytest

from fitlib.study import Quantity, SchemeSettings, Target


def test_the_example_of_the_format_loads_as_written(bench, full):
    study = bench.load(full)
    assert study.name == "level-sensors" and study.random_seed == 20260401
    assert study.stimulus == Quantity("water level", "m")
    assert [dataset.id for dataset in study.datasets] == ["batch-1", "batch-2", "LS-101"]
    assert [family.candidate_ids[-1] for family in study.families] == ["polynomial-6", "polynomial-3-fixed"]
    assert study.families[1].fixed_points == ((0.0, 4.0),)
    assert study.validation[3] == SchemeSettings("k_fold", "k_fold", folds=5, repeats=20, unit="level")
    assert study.selection.target == Target(0.01, 2.0)
    assert study.text == full.encode() and study.path == str(bench.path) and study.folder == bench.folder
    assert study.warnings == ()


def test_a_short_study_gets_the_defaults(bench):
    study = bench.load()
    dataset = study.datasets[0]
    assert [scheme.id for scheme in study.validation] == ["leave_one_level_out"]
    assert (dataset.evaluation, dataset.function, dataset.decimal, dataset.delimiter) == (
        "inverse",
        "calibration",
        "point",
        None,
    )
    assert (study.weighting, study.selection.degrees_of_freedom, study.selection.monotone) == ("none", 3, True)
    assert study.purpose == "" and study.random_seed is None and dataset.measuring_interval is None


@pytest.mark.parametrize(
    ("old", "new", "key", "message"),
    [
        ("format: 1", "format: 2", "format", "2 is not allowed; this version of fitlib reads format 1"),
        ("format: 1", "format: true", "format", "true is not allowed"),
        ("flow-meters", "Flow_Meters", "study", "'Flow_Meters' is not allowed; small letters"),
        ("flow-meters", "-meters", "study", "'-meters' is not allowed"),
        ("flow-meters", "a" * 61, "study", "is not allowed"),
        ("title: Turbine flow meters", "title: '  '", "title", "the text is empty"),
        ("title: Turbine flow meters", "title: 12", "title", "12 is not text; put it in quotes"),
        ("title: Turbine flow meters", 'title: "a\\u202eb"', "title", "the hidden character U+202E"),
        ("title: Turbine flow meters", 'title: "a\\nb"', "title", "has a line break"),
        ("unit: Hz", "unit: 1", "response.unit", "1 is not text; put it in quotes"),
        (
            "stimulus: {quantity: flow, unit: L/min}",
            "stimulus: flow",
            "stimulus",
            "'flow' is not allowed; a group of keys",
        ),
        (
            "stimulus: {quantity: flow, unit: L/min}",
            "stimulus: [flow]",
            "stimulus",
            "a list is not allowed; a group of keys",
        ),
        ("id: FM-1", "id: 101", "datasets[0].id", "101 is not text; put it in quotes"),
        ("id: FM-1", "id: ' FM'", "datasets[0].id", "without spaces at its ends"),
        ("id: FM-1", 'id: "F\\tM"', "datasets[0].id", "printable text"),
        ("id: FM-1", f"id: {'x' * 101}", "datasets[0].id", "at most 100 characters (this has 101)"),
        ("1..3", "3..1", "families[0].degree", "the range 3..1 runs downwards; write 1..3"),
        ("1..3", "1..51", "families[0].degree", "'1..51' is not allowed; a whole number from 0 to 50"),
        ("1..3", "-1", "families[0].degree", "-1 is not allowed"),
        ("1..3", "2.0", "families[0].degree", "2.0 is not allowed"),
        ("1..3", "[1, 1]", "families[0].degree", "degree 1 is given twice"),
        ("1..3", "[]", "families[0].degree", "an empty list is not allowed"),
        ("1..3", "[1, two]", "families[0].degree", "'two' is not allowed"),
        ("1..3", "1...3", "families[0].degree", "'1...3' is not allowed"),
        ("1..3", "1..99999999999999", "families[0].degree", "is not allowed"),
        ("family: polynomial", "family: polynomal", "families[0].family", "'polynomal' is not allowed; polynomial"),
        ("1..3", "2, fixed_points: [[0, 4, 1]]", "families[0].fixed_points", "not allowed as a fixed point"),
        ("1..3", "2, fixed_points: [[0, .nan]]", "families[0].fixed_points", "nan is not allowed in a fixed point"),
        ("1..3", "2, fixed_points: []", "families[0].fixed_points", "an empty list is not allowed"),
        (
            "columns:",
            "measuring_interval: [3, 3]\n    columns:",
            "datasets[0].measuring_interval",
            "[3, 3] is not increasing",
        ),
        (
            "columns:",
            "measuring_interval: [0, .inf]\n    columns:",
            "datasets[0].measuring_interval",
            "inf is not allowed",
        ),
        ("columns:", "measuring_interval: [1]\n    columns:", "datasets[0].measuring_interval", "two numbers"),
        (
            "columns:",
            "level_tolerance: -1\n    columns:",
            "datasets[0].level_tolerance",
            "-1 is not allowed; 0 or a number above 0",
        ),
        (
            "columns:",
            "delimiter: ';'\n    columns:",
            "datasets[0].delimiter",
            "';' is not allowed; comma, semicolon or tab",
        ),
        ("columns:", "evaluation: invers\n    columns:", "datasets[0].evaluation", "did you mean inverse?"),
        (
            "columns:",
            "record: {due: 03.04.2026}\n    columns:",
            "datasets[0].record.due",
            "a day of the calendar as YYYY-MM-DD",
        ),
        ("columns:", "record: {operator: 7}\n    columns:", "datasets[0].record.operator", "7 is not text"),
        ("columns:", "record: {}\n    columns:", "datasets[0].record", "nothing stands under this key"),
        (
            "columns:",
            "verification_points: {where: {}}\n    columns:",
            "datasets[0].verification_points.where",
            "nothing stands",
        ),
        ("[data/fm-1.csv]", "data/fm-1.csv", "datasets[0].files", "'data/fm-1.csv' is not allowed; a list"),
        ("[data/fm-1.csv]", "[]", "datasets[0].files", "nothing stands under this key"),
        (
            "families:",
            "weighting: per_point\nfamilies:",
            "weighting",
            "'per_point' is not in this version; none, inverse_stimulus",
        ),
        ("families:", "weighting: estimated\nfamilies:", "weighting", "'estimated' is not in this version"),
        ("families:", "weighting: inverse_stimuls\nfamilies:", "weighting", "did you mean inverse_stimulus?"),
        (
            "families:",
            "random_seed: -1\nfamilies:",
            "random_seed",
            "-1 is not allowed; a whole number from 0 to 9007199254740991",
        ),
        ("families:", "validation: []\nfamilies:", "validation", "nothing stands under this key"),
        (
            "families:",
            "validation: [leave_one_out]\nfamilies:",
            "validation[0]",
            "'leave_one_out' is not allowed; a group of keys",
        ),
        (
            "families:",
            "validation: [{folds: 5}]\nfamilies:",
            "validation[0].scheme",
            "this key is missing; one of leave_one_level_out",
        ),
        (
            "rule: one_standard_error",
            "rule: best",
            "selection.rule",
            "'best' is not allowed; supported_gain, one_standard_error",
        ),
        (
            "rule:",
            "require: {degrees_of_freedom: 1}\n  rule:",
            "selection.require.degrees_of_freedom",
            "1 is not allowed",
        ),
        (
            "rule:",
            "target_uncertainty: {expanded: 1}\n  rule:",
            "selection.target_uncertainty.coverage_factor",
            "missing",
        ),
        (
            "rule:",
            "target_uncertainty: 1\n  rule:",
            "selection.target_uncertainty",
            "1 is not allowed; a group of keys",
        ),
    ],
)
def test_a_wrong_value_is_named_with_what_is_allowed(bench, valid, old, new, key, message):
    line, found_key, found = bench.only(valid, (old, new))
    assert found_key == key and message in found and line is not None


@pytest.mark.parametrize("draws", [9, 100_001, 1e3, "many"])
def test_draws_are_limited(bench, valid, draws):
    text = valid.replace("families:", f"random_seed: 1\nvalidation: [{{scheme: bootstrap, draws: {draws}}}]\nfamilies:")
    keys = [problem.key for problem in bench.problems(text)]
    assert keys[0] == "validation[0].draws"


def test_the_most_draws_and_the_highest_degree_are_accepted(bench, valid):
    lines = "random_seed: 1\nvalidation: [{scheme: leave_one_level_out}, {scheme: bootstrap, draws: 100000}]\nfamilies:"
    study = bench.load(valid, ("families:", lines), ("1..3", "50"))
    assert study.validation[1].draws == 100_000 and study.families[0].degrees == (50,)


@pytest.mark.parametrize(
    ("written", "degrees"), [("0..8", tuple(range(9))), ("2..2", (2,)), ("4", (4,)), ("[4, 0, 2]", (0, 2, 4))]
)
def test_degrees_are_a_range_a_list_or_one_number(bench, valid, written, degrees):
    assert bench.load(valid, ("1..3", written)).families[0].degrees == degrees


def test_a_small_number_in_powers_of_ten_is_a_number(bench, valid):
    assert bench.load(valid, ("columns:", "level_tolerance: 1e-6\n    columns:")).datasets[0].level_tolerance == 1e-6


def test_no_and_on_stay_words(bench, valid):
    dataset = bench.load(valid, ("stimulus: flow,", "stimulus: no,"), ("response: hertz", "response: on")).datasets[0]
    assert (dataset.columns.stimulus, dataset.columns.response) == ("no", "on")


def test_text_may_hold_a_narrow_space_and_a_degree_sign(bench, valid):
    dataset = bench.load(valid, ("columns:", "record: {conditions: 23\u202f°C}\n    columns:")).datasets[0]
    assert dataset.record == {"conditions": "23\u202f°C"}


@pytest.mark.parametrize("missing", ["where: {run: 2}, ", "reason: cable, ", "person: lead, ", "date: 2026-04-03"])
def test_an_exclusion_needs_where_reason_person_and_date(bench, valid, missing):
    entry = "{where: {run: 2}, reason: cable, person: lead, date: 2026-04-03}".replace(missing, "").replace(", }", "}")
    line, key, message = bench.only(valid, ("columns:", f"exclusions: [{entry}]\n    columns:"))
    assert (
        key == f"datasets[0].exclusions[0].{missing.split(':')[0]}" and message == "this key is missing" and line == 9
    )


@pytest.mark.parametrize(
    "day", ["2026-02-29", "2026-13-01", "20260403", "2026-4-3", "2026-W10-1", "03.04.2026", "'٢٠٢٦-٠٤-٠٣'"]
)
def test_a_day_that_is_not_a_real_day_in_iso_form_is_refused(bench, valid, day):
    entry = f"{{where: {{run: 2}}, reason: cable, person: lead, date: {day}}}"
    line, key, message = bench.only(valid, ("columns:", f"exclusions: [{entry}]\n    columns:"))
    assert key == "datasets[0].exclusions[0].date" and "YYYY-MM-DD" in message


def test_a_leap_day_is_a_day(bench, valid):
    entry = "{where: {run: 2}, reason: cable, person: lead, date: 2024-02-29}"
    dataset = bench.load(valid, ("columns:", f"exclusions: [{entry}]\n    columns:")).datasets[0]
    assert dataset.exclusions[0].date == "2024-02-29" and dataset.exclusions[0].where == {"run": 2}


@pytest.mark.parametrize(
    ("value", "key", "told"),
    [
        ("0.01", "", "0.01 is not allowed; a group of keys such as {expanded: 0.01, coverage_factor: 2}"),
        ("0.01 bar", "", "such as {expanded: 0.01, coverage_factor: 2}; write the number without unit"),
        ("{expanded: 0.01 bar, coverage_factor: 2}", ".expanded", "a number above 0; write the number without unit"),
        ('{expanded: "0.01", coverage_factor: 2}', ".expanded", "a number above 0; write the number without quotes"),
    ],
)
def test_a_target_written_in_another_way_shows_how_it_is_written(bench, valid, value, key, told):
    _, found, message = bench.only(valid, ("rule:", f"target_uncertainty: {value}\n  rule:"))
    assert found == f"selection.target_uncertainty{key}" and message.endswith(told)


@pytest.mark.parametrize("value", ["a lot", "m", "2026-04-03", "0..6", "1/2"])
def test_a_text_without_a_number_gets_no_hint_about_units(bench, valid, value):
    _, _, message = bench.only(valid, ("    columns:", f"    level_tolerance: {value}\n    columns:"))
    assert message.endswith("0 or a number above 0")


@pytest.mark.parametrize(
    ("old", "new", "example"),
    [
        ("{quantity: flow, unit: L/min}", "flow", "{quantity: water level, unit: m}"),
        ("{family: polynomial, degree: 1..3}", "polynomial", "{family: polynomial, degree: 1..3}"),
        (
            "{stimulus: flow, response: hertz}",
            "[flow, hertz]",
            "{stimulus: level_m, response: current_mA, series: run}",
        ),
    ],
)
def test_where_a_group_of_keys_is_needed_one_is_shown(bench, valid, old, new, example):
    told = [problem.message for problem in bench.problems(valid, (old, new))]
    assert any(message.endswith(f"a group of keys such as {example}") for message in told)
