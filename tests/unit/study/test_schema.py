"""The JSON Schema: current, and of one mind with the loader on keys and values."""

from __future__ import annotations

import json

import jsonschema
import pytest

from fitlib.study import export_schema, load_glossary
from fitlib.study.schema import shipped_schema_text
from fitlib.study.yaml_reader import read_yaml


@pytest.fixture(scope="module")
def validator():
    schema = json.loads(shipped_schema_text())
    jsonschema.Draft202012Validator.check_schema(schema)
    return jsonschema.Draft202012Validator(schema)


def test_the_shipped_schema_is_current():
    """Renew it with: fitlib schema > fitlib/study/study.schema.json"""
    assert json.loads(shipped_schema_text()) == export_schema()


def test_the_schema_accepts_a_full_and_a_short_study(validator, full, valid):
    for text in (full, valid):
        validator.validate(read_yaml(text).data)


@pytest.mark.parametrize(
    ("old", "new"),
    [
        ("title:", "titel:"),
        ("  measuring_interval:", "  measuring_intervall:"),
        ("serial_number: LS-101", "serial_number: 101"),
        ("unit: mA", "unit: 1"),
        ("where: {run: 2, level_m: 4.0}", "where: {}"),
        ("date: 2026-04-03}\n    ver", "date: 3 April}\n    ver"),
        ("0..6", "six"),
        ("1..3", "51"),
        ("1..3", "[1, 1]"),
        ("[[0, 4]]", "[[0, 4, 5]]"),
        ("folds: 5", "folds: 1"),
        ("draws: 2000", "draws: 100001"),
        ("scheme: leave_one_out", "scheme: leave_one"),
        ("scheme: leave_one_out", "scheme: leave_one_out, folds: 5"),
        ("monotone: true", "monotone: yes"),
        ("expanded: 0.01", "expanded: 0"),
        ("weighting: none", "weighting: per_point"),
        ("rule: one_standard_error", "rule: best"),
        ("format: 1", "format: 2"),
        ("study: level-sensors", "study: Level Sensors"),
        ('  - {ids_from: "data/batch-*.csv"}', "  - {ids_from: data/batch-1.csv, id: x}"),
        ("level_tolerance: 0.02", "level_tolerance: "),
    ],
)
def test_the_schema_refuses_what_the_loader_refuses(validator, bench, full, old, new):
    assert bench.problems(full, (old, new))
    data = read_yaml(full.replace(old, new)).data
    if new.endswith(": "):
        data["dataset_defaults"]["level_tolerance"] = None
    assert not validator.is_valid(data)


def test_every_key_in_the_schema_carries_its_meaning():
    schema, glossary = export_schema(), load_glossary()
    groups = [schema, *schema["$defs"].values()]
    described = {name: value.get("description") for group in groups for name, value in group["properties"].items()}
    assert len(described) > 40
    assert described == {name: glossary[name].meaning for name in described}
