"""Words on figures."""

from __future__ import annotations

import pytest

from fitlib.figures.words import axis_label, broken, clean, counted, listed, number, percent, unit_text, wrapped


def test_text_is_one_line_that_xml_can_hold():
    assert clean("a\nb\t c\x07") == "a b c\N{REPLACEMENT CHARACTER}"
    assert clean("x" * 100, 10) == "x" * 9 + "…"


@pytest.mark.parametrize(
    ("unit", "power", "exponent", "text"),
    [
        ("mA", 0, 1, "mA"),
        ("mA", 0, 2, "mA²"),
        ("m/s", 0, 1, "(m/s)"),
        ("m/s", 0, 2, "(m/s)²"),
        ("mV/V", -6, 1, "(10⁻⁶\N{NO-BREAK SPACE}mV/V)"),
        ("", 3, 1, "10³"),
        ("", 0, 1, ""),
        ("°C", 0, 2, "°C²"),
        ("(unit not stated)", 0, 1, "(unit not stated)"),
        ("(unit not stated)", 0, 2, "(unit not stated)²"),
        ("(unit not stated)", -3, 1, "(10⁻³\N{NO-BREAK SPACE}unit not stated)"),
        ("(m)/(s)", 0, 1, "((m)/(s))"),
    ],
)
def test_units_below_the_fraction_line(unit, power, exponent, text):
    assert unit_text(unit, power, exponent) == text


def test_a_quantity_without_unit_has_no_fraction_line():
    assert axis_label("ratio", "") == "ratio"
    assert broken(axis_label("loss of a level", "(unit not stated)"), 20).split("\n")[0] == "loss of a level"
    assert axis_label("ratio", "", power=-3) == "ratio /\N{NO-BREAK SPACE}10⁻³"


@pytest.mark.parametrize(
    ("value", "text"),
    [
        (0.0, "0"),
        (-0.0123456, "−0.0123"),
        (1.5e-9, "1.5 × 10⁻⁹"),
        (None, "not available"),
        (float("nan"), "not available"),
    ],
)
def test_numbers_in_notes(value, text):
    assert number(value) == text


@pytest.mark.parametrize(("share", "text"), [(0.0, "0 %"), (0.001, "under 1 %"), (0.999, "over 99 %"), (0.823, "82 %")])
def test_shares_are_never_rounded_to_nothing_or_all(share, text):
    assert percent(share) == text


def test_long_labels_are_broken_into_two_lines_with_the_unit_whole():
    lines = broken("deviation of the loop current /\N{NO-BREAK SPACE}(10⁻³\N{NO-BREAK SPACE}mA)", 32).split("\n")
    assert lines == ["deviation of the loop current", "/\N{NO-BREAK SPACE}(10⁻³\N{NO-BREAK SPACE}mA)"]
    assert len(broken("word " * 100, 20).split("\n")) == 2


def test_lists_and_counts():
    assert listed(["a", "b", "c"], 2) == "a, b and 1 more"
    assert counted(1, "row", "rows") == "1 row"
    assert counted(2, "row", "rows") == "2 rows"
    assert wrapped(["a b", "c"], 3) == ["a b", "c"]
