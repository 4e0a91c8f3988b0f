"""Every fault of a study is reported at once, each with its own line and key."""

from __future__ import annotations

TEN_FAULTS = """\
format: 1
study: Level Sensors
title: Level sensors
titel: Level sensors
stimulus: {quantity: water level, unit: m}
response: {quantity: loop current, unit: 1}
dataset_defaults:
  columns: {stimulus: level_m, response: current_mA}
datasets:
  - id: LS-101
    files: [data/LS-101-spring.csv]
    measuring_interval: [10, 0]
    exclusions:
      - where: {run: 2}
        reason: cable moved
        person: shift lead
        date: 2026-02-30
  - id: ls-101
    files: [data/LS-101-autumn.csv]
families:
  - {family: polynomial, degree: 0..51}
validation:
  - {scheme: leave_one_level_out}
  - {scheme: k_fold, folds: 1}
selection:
  loss: leave_one_level_out
  rule: one_standard_eror
  require: {monotone: yes}
random_seed: 20260401
"""
WHERE_THEY_ARE = [
    (2, "study"),
    (4, "titel"),
    (6, "response.unit"),
    (12, "datasets[0].measuring_interval"),
    (17, "datasets[0].exclusions[0].date"),
    (18, "datasets[1].id"),
    (21, "families[0].degree"),
    (24, "validation[1].folds"),
    (27, "selection.rule"),
    (28, "selection.require.monotone"),
]


def test_ten_planted_errors_give_exactly_ten_messages_each_in_its_place(bench):
    problems = bench.problems(TEN_FAULTS)
    assert [(problem.line, problem.key) for problem in problems] == WHERE_THEY_ARE


def test_a_key_that_is_missing_as_well_gives_one_message_more(bench):
    problems = bench.problems(TEN_FAULTS, ("random_seed: 20260401\n", ""))
    assert [(problem.line, problem.key) for problem in problems] == [(1, "random_seed"), *WHERE_THEY_ARE]


def test_mended_one_by_one_the_errors_disappear_one_by_one(bench):
    mended = [
        ("Level Sensors", "level-sensors"),
        ("titel: Level sensors\n", "purpose: to test\n"),
        ("unit: 1}", "unit: '1'}"),
        ("[10, 0]", "[0, 10]"),
        ("2026-02-30", "2026-03-02"),
        ("ls-101", "ls-102"),
        ("0..51", "0..5"),
        ("folds: 1", "folds: 2"),
        ("one_standard_eror", "one_standard_error"),
    ]
    for count in range(1, len(mended) + 1):
        assert len(bench.problems(TEN_FAULTS, *mended[:count])) == 10 - count
    assert bench.load(TEN_FAULTS, *mended, ("yes", "true")).name == "level-sensors"


def test_a_message_names_file_line_key_value_and_what_is_allowed(bench, valid):
    text = valid.replace("families:", "random_seed: 1\nvalidation: [{scheme: k_fold, folds: 1}]\nfamilies:")
    (problem,) = (p for p in bench.problems(text) if p.key.startswith("validation"))
    assert str(problem) == f"{bench.path}:11: validation[0].folds: 1 is not allowed; a whole number of 2 or more"


def test_problems_come_in_the_order_of_the_file(bench):
    lines = [problem.line for problem in bench.problems(TEN_FAULTS)]
    assert lines == sorted(lines)


def test_a_rule_is_still_checked_when_another_value_of_its_group_is_faulty(bench, valid):
    found = bench.problems(
        valid, ("rule: one_standard_error", "rule: one_standard_error\n  alpha: 0.1\n  require: {monotone: 3}")
    )
    assert {problem.key for problem in found} == {"selection.alpha", "selection.require.monotone"}


def test_a_rule_that_needs_a_faulty_value_says_nothing(bench, valid):
    assert bench.only(valid, ("rule: one_standard_error", "rule: 7"))[1] == "selection.rule"


def test_an_unknown_scheme_does_not_make_the_loss_undeclared(bench, valid):
    text = valid.replace("families:", "validation:\n  - {scheme: leave_one_level}\nfamilies:")
    line, key, message = bench.only(text)
    assert (line, key) == (11, "validation[0].scheme")
    assert "did you mean leave_one_level_out?" in message


def test_a_value_that_is_not_given_is_reported_once(bench, valid):
    line, key, message = bench.only(valid, ("title: Turbine flow meters", "title:"))
    assert (line, key) == (3, "title") and "no value is given" in message


def test_a_faulty_default_is_reported_once_and_not_for_every_dataset(bench, full):
    line, key, message = bench.only(full, ("level_tolerance: 0.02", "level_tolerance: -0.02"))
    assert (line, key) == (14, "dataset_defaults.level_tolerance")
    assert message == "-0.02 is not allowed; 0 or a number above 0"
