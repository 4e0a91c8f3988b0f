"""Defaults for all datasets, merged key by key."""

from __future__ import annotations


def test_columns_and_record_are_merged_inside(bench, full):
    own = "record: {serial_number: LS-101, date: 2026-04-03, conditions: 5 °C}\n    columns: {direction: up_or_down}"
    study = bench.load(full, ("record: {serial_number: LS-101, date: 2026-04-03}", own))
    dataset = next(dataset for dataset in study.datasets if dataset.id == "LS-101")
    assert dataset.columns.direction == "up_or_down" and dataset.columns.stimulus == "level_m"
    assert dataset.record == {
        "certificate": "C-118",
        "conditions": "5 °C",
        "date": "2026-04-03",
        "due": "2027-03-01",
        "reference_standard": "dip gauge D-2",
        "serial_number": "LS-101",
    }


def test_every_other_value_is_replaced_as_a_whole(bench, full):
    entry = '  - {ids_from: "data/batch-*.csv", measuring_interval: [1, 2], evaluation: direct}'
    study = bench.load(
        full,
        ('  - {ids_from: "data/batch-*.csv"}', entry),
        ("  target_uncertainty: {expanded: 0.01, coverage_factor: 2}\n", ""),
    )
    batch, _, named = study.datasets
    assert (batch.measuring_interval, batch.evaluation) == ((1.0, 2.0), "direct")
    assert (named.measuring_interval, named.evaluation) == ((0.0, 10.0), "inverse")


def test_defaults_reach_the_datasets_of_a_pattern(bench, full):
    batch = bench.load(full).datasets[0]
    assert batch.key == "datasets[1]" and batch.level_tolerance == 0.02 and batch.columns.series == "run"


def test_exclusions_may_stand_in_the_defaults(bench, full):
    shared = "verification_points: {where: {run: 5}}\n  evaluation: inverse"
    study = bench.load(full, ("evaluation: inverse", shared))
    assert [dataset.verification_points for dataset in study.datasets] == [{"run": 5}, {"run": 5}, {"run": 9}]


def test_a_fault_between_defaults_and_a_dataset_names_the_dataset(bench, full):
    own = "record: {serial_number: LS-101, date: 2026-04-03}\n    columns: {level: nominal}"
    line, key, _ = bench.only(full, ("record: {serial_number: LS-101, date: 2026-04-03}", own))
    assert (line, key) == (22, "datasets[0].columns.level")


def test_a_fault_within_the_defaults_is_told_once(bench, full):
    _, key, message = bench.only(full, ("direction: way}", "direction: way, level: nominal}"))
    assert key == "dataset_defaults.level_tolerance" and "no effect beside columns.level" in message


def test_a_day_in_the_default_record_is_checked_where_it_stands(bench, full):
    line, key, _ = bench.only(full, ("due: 2027-03-01", "due: March"))
    assert (line, key) == (16, "dataset_defaults.record.due")


def test_a_line_is_found_for_keys_that_are_not_written(bench, full):
    study = bench.load(full)
    assert study.line_of("datasets[0].exclusions[0].where.run") == 23
    assert study.line_of("datasets[0].columns.stimulus") == 19
    assert study.line_of("datasets[1].files[3]") == 25
    assert study.line_of("nothing.like[7].it") == 1
