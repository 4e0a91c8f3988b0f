"""The strict YAML reader: what it keeps, what it refuses, and the line of each."""

from __future__ import annotations

import json
import random

import pytest
import yaml

from fitlib.study import yaml_reader
from fitlib.study.yaml_reader import YamlFault, read_yaml


@pytest.fixture(params=["CSafeLoader", "SafeLoader"], autouse=True)
def parser(request, monkeypatch):
    """Every test runs with the C parser and with the one in Python."""
    if not hasattr(yaml, request.param):
        pytest.skip("PyYAML is built without the C parser")
    monkeypatch.setattr(yaml_reader, "PARSER", getattr(yaml, request.param))


def faults(text):
    return [(fault.line, fault.key, fault.message) for fault in read_yaml(text).faults]


def test_json_text_reads_as_json_reads_it():
    """Source: YAML 1.2.2 section 1.3, JSON is a subset of YAML; here without null."""
    chance = random.Random(7)

    def value(depth):
        kind = chance.randrange(6 if depth < 5 else 4)
        simple = [chance.randint(-99, 99), chance.uniform(-5, 5), chance.choice(["no", "1", "a: b", "é\n"]), True]
        if kind < 4:
            return simple[kind]
        items = [value(depth + 1) for _ in range(chance.randrange(4))]
        return items if kind == 4 else {f"k{n}": item for n, item in enumerate(items)}

    for _ in range(100):
        text = json.dumps({"all": value(0)})
        assert read_yaml(text).data == json.loads(text)


def test_every_key_and_every_entry_of_a_list_has_its_line():
    lines = read_yaml("a: 1\nb:\n  - x: 1\n    y: 2\n  - 3\nc: {d: [1,\n  2]}\n").lines
    assert lines == {
        "": 1,
        "a": 1,
        "b": 2,
        "b[0]": 3,
        "b[0].x": 3,
        "b[0].y": 4,
        "b[1]": 5,
        "c": 6,
        "c.d": 6,
        "c.d[0]": 6,
        "c.d[1]": 7,
    }


def test_quotes_make_text_of_numbers_and_words():
    assert read_yaml("a: \"1\"\nb: 'true'\nc: |\n  5\n").data == {"a": "1", "b": "true", "c": "5\n"}


def test_a_key_given_twice_keeps_the_first_and_says_where_it_is():
    document = read_yaml("a: 1\nb: 2\na: 3\n")
    assert document.data == {"a": 1, "b": 2}
    assert faults("a: 1\nb: 2\na: 3\n") == [(3, "a", "the key is given twice; first in line 1")]


def test_what_stands_under_a_key_given_twice_is_left_out():
    document = read_yaml("a: {x: 1}\na: {y: [1, {z: 2}]}\nb: 3\n")
    assert document.data == {"a": {"x": 1}, "b": 3}


@pytest.mark.parametrize("key", ["2", "1.5", "true", "null"])
def test_only_text_is_a_key(key):
    ((line, name, message),) = faults(f"a: 1\n{key}: 2\n")
    assert (line, name) == (
        2,
        key,
    ) and message == f"the key '{key}' is not text; put it in quotes if it is meant as a name"
    assert read_yaml(f"'{key}': 2\n").data == {key: 2}


def test_no_and_on_are_keys_like_any_other():
    assert read_yaml("no: 1\non: 2\n").data == {"no": 1, "on": 2}


@pytest.mark.parametrize(
    ("text", "line", "key", "word"),
    [
        ("a: 1\nb: &x 2\n", 2, "b", "the anchor &x is not allowed"),
        (
            "a: !!python/object:os.system {}\n",
            1,
            "a",
            "the tag tag:yaml.org,2002:python/object:os.system is not allowed",
        ),
        ("a: !own 3\n", 1, "a", "the tag !own is not allowed"),
        ("a: 1\nb:\n", 2, "b", "no value is given"),
        ("a: [1, null]\n", 1, "a[1]", "no value is given"),
        (f"a: {'9' * 400}\n", 1, "a", "a number of 400 characters is too long"),
    ],
)
def test_what_no_study_needs_is_refused_with_its_line(text, line, key, word):
    ((at, name, message),) = faults(text)
    assert (at, name) == (line, key) and word in message


def test_an_alias_is_refused_and_never_expanded():
    found = faults("a: &x [1]\nb: *x\n")
    assert [(line, key) for line, key, _ in found] == [(1, "a"), (2, "b")]
    assert "the alias *x is not allowed" in found[1][2]


def test_aliases_that_would_grow_without_end_cost_nothing():
    text = "a0: &a0 [x, x]\n" + "".join(f"a{n}: &a{n} [*a{n - 1}, *a{n - 1}]\n" for n in range(1, 60))
    assert len(read_yaml(text).faults) == 60 + 59 * 2


@pytest.mark.parametrize(
    ("text", "line", "word"),
    [
        ("a: [1, 2\nb: 3\n", 2, "YAML syntax"),
        ("a: 1\n\tb: 2\n", 2, "indent with spaces, not with a tab"),
        ("unit: %\n", 1, "put text that starts with % in quotes"),
        ("a: 1\n---\nb: 2\n", 2, "a second document"),
        ("? [a, b]\n: 1\n", 1, "a key is a single word"),
        ("a: {{ name }}\n", 1, "a key is a single word"),
        ("%TAG ! tag:example.com,2026:\n---\na: 1\n", 1, "%TAG"),
    ],
)
def test_syntax_stops_with_a_plain_message_and_a_line(text, line, word):
    with pytest.raises(YamlFault, match=word) as caught:
        read_yaml(text)
    assert caught.value.line == line


@pytest.mark.parametrize("opening", ["[", "{a: ", "- ", "[{a: "])
def test_hostile_depth_is_refused(opening):
    with pytest.raises(YamlFault, match="nested more than 20 levels"):
        read_yaml(opening * 10_000)


def test_twenty_levels_are_still_read():
    data = read_yaml("[" * 20 + "1" + "]" * 20).data
    for _ in range(20):
        (data,) = data
    assert data == 1
