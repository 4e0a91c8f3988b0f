"""The resolved study: every default spelled out, and nothing of how the file is written."""

from __future__ import annotations

import json

import pytest


def as_json(study) -> str:
    return json.dumps(study.resolved(), allow_nan=False)


REWRITTEN = """\
# another hand, the same study
selection:
    target_uncertainty:
        coverage_factor: 2.0
        expanded: 1e-2
    require: {degrees_of_freedom: 3, monotone: true}
    rule: "one_standard_error"
    loss: leave_one_level_out
validation:
- scheme: leave_one_level_out
- scheme: leave_one_series_out
- scheme: 'leave_one_out'
- {repeats: 20, folds: 5, scheme: k_fold}
- {draws: 2000, scheme: bootstrap}
families:
- {degree: [6, 5, 4, 3, 2, 1, 0], family: polynomial}
- {fixed_points: [[0.0, 4.0]], degree: 1..3, family: polynomial}
datasets:
- ids_from: ./data/batch-*.csv
- verification_points: {where: {run: 9}}
  exclusions:
  - date: "2026-04-03"
    person: shift lead
    reason: >
      cable
      moved
    where: {level_m: 4, run: 2}
  record: {date: 2026-04-03, serial_number: LS-101}
  files:
  - data/LS-101-spring.csv
  - data/LS-101-autumn.csv
  id: "LS-101"
dataset_defaults:
  record: {due: 2027-03-01, certificate: C-118, reference_standard: dip gauge D-2, conditions: 23 °C}
  level_tolerance: 2e-2
  measuring_interval: [0, 1e1]
  columns: {direction: way, series: run, response: current_mA, stimulus: level_m}
response: {unit: mA, quantity: loop current}
stimulus: {unit: m, quantity: water level}
random_seed: 20260401
purpose: Convert loop current to water level.
title: Submersible level sensors, spring batch
study: level-sensors
format: 1
"""


def test_it_depends_on_neither_order_comments_quoting_style_nor_spelled_defaults(bench, full):
    assert as_json(bench.load(full)) == as_json(bench.load(REWRITTEN))


def test_it_depends_on_neither_byte_order_mark_nor_line_ends(bench, full):
    plain = as_json(bench.load(full))
    assert as_json(bench.load(b"\xef\xbb\xbf" + full.encode())) == plain
    assert as_json(bench.load(full.replace("\n", "\r\n"))) == plain


@pytest.mark.parametrize(
    ("old", "new"),
    [
        ("20260401", "20260402"),
        ("0.02", "0.03"),
        ("0..6", "0..5"),
        ("run: 9", "run: 8"),
        ("run: 9", "run: '9'"),
        ("  - {scheme: leave_one_series_out}\n", ""),
        ("2000", "2001"),
        ("cable moved", "cable Moved"),
        ("[data/LS-101-spring.csv, data/LS-101-autumn.csv]", "[data/LS-101-autumn.csv, data/LS-101-spring.csv]"),
        ("degrees_of_freedom: 3", "degrees_of_freedom: 4"),
    ],
)
def test_it_changes_when_the_meaning_does(bench, full, old, new):
    assert as_json(bench.load(full)) != as_json(bench.load(full, (old, new)))


def test_it_spells_out_every_default(bench):
    resolved = bench.load().resolved()
    assert resolved["datasets"] == [
        {
            "id": "FM-1",
            "file_name": "FM-1",
            "files": ["data/fm-1.csv"],
            "columns": {"stimulus": "flow", "response": "hertz", "series": None, "direction": None, "level": None},
            "delimiter": None,
            "decimal": "point",
            "measuring_interval": None,
            "evaluation": "inverse",
            "function": "calibration",
            "level_tolerance": None,
            "record": {},
            "exclusions": [],
            "verification_points": None,
        }
    ]
    assert resolved["validation"] == [
        {
            "id": "leave_one_level_out",
            "scheme": "leave_one_level_out",
            "folds": None,
            "repeats": None,
            "unit": None,
            "draws": None,
        }
    ]
    assert resolved["selection"] == {
        "loss": "leave_one_level_out",
        "rule": "one_standard_error",
        "alpha": None,
        "require": {"monotone": True, "degrees_of_freedom": 3},
        "target_uncertainty": None,
    }
    assert resolved["weighting"] == "none"


def test_it_names_neither_the_folder_nor_the_place_in_the_file(bench, full):
    text = as_json(bench.load(full))
    assert str(bench.folder) not in text and "datasets[0]" not in text


def test_the_records_cannot_be_changed(bench):
    study = bench.load()
    with pytest.raises(AttributeError):
        study.name = "other"
    with pytest.raises(AttributeError):
        study.datasets[0].evaluation = "direct"
