"""Scalars against the core schema of YAML 1.2.2 (section 10.3.2) and against JSON's numbers."""

from __future__ import annotations

import json
import math
import random

import pytest

from fitlib.study.scalars import ScalarFault, plain_scalar


@pytest.mark.parametrize(
    ("text", "value"),
    [
        ("0", 0),
        ("-19", -19),
        ("+12", 12),
        ("007", 7),
        ("0o7", 7),
        ("0x3A", 58),
        ("1e-6", 1e-6),
        ("1E3", 1000.0),
        ("0.", 0.0),
        (".5", 0.5),
        ("-2E+05", -200000.0),
        ("+.inf", math.inf),
        ("-.Inf", -math.inf),
        ("true", True),
        ("false", False),
    ],
)
def test_numbers_and_truth_values_are_those_of_yaml_1_2(text, value):
    found = plain_scalar(text)
    assert found == value and type(found) is type(value)


@pytest.mark.parametrize(
    "text",
    ["no", "on", "yes", "off", "y", "No", "ON", "True", "TRUE", "2026-04-03", "1:30", "1_000", "0b1", "1e", ".e3", "-"]
    + ["+", ".", "..", "0..8", "1.2.3", "--", "e5", "inf", "nan", "<<"],
)
def test_words_that_are_not_numbers_stay_text(text):
    assert plain_scalar(text) == text and isinstance(plain_scalar(text), str)


def test_not_a_number_is_read_as_such():
    assert math.isnan(plain_scalar(".nan"))


@pytest.mark.parametrize("text", ["", "~", "null"])
def test_nothing_is_none(text):
    assert plain_scalar(text) is None


def test_every_number_of_json_reads_as_json_reads_it():
    chance = random.Random(20260401)
    for _ in range(500):
        text = json.dumps(
            chance.choice([chance.randint(-(10**9), 10**9), chance.uniform(-1, 1) * 10 ** chance.randint(-30, 30)])
        )
        assert plain_scalar(text) == json.loads(text)


def test_a_number_of_many_digits_is_refused():
    with pytest.raises(ScalarFault, match="a number of 5000 characters is too long"):
        plain_scalar("9" * 5000)
