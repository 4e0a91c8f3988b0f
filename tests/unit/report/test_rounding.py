"""Numbers rounded to their uncertainty."""

from __future__ import annotations

import math

import pytest

from fitlib.report.rounding import (
    equals,
    exact,
    percent,
    place_number,
    powered,
    probability,
    root,
    rounded,
    squared,
    statistic,
    table_number,
    text_number,
    with_unit,
)


@pytest.mark.parametrize(
    ("value", "uncertainty", "digits", "expected"),
    [
        # GUM 7.2.6: y = 10.057 62 ohm with u = 27 milliohm is rounded to 10.058 ohm.
        (10.05762, 0.027, 2, ("10.058", "0.027")),
        # GUM 7.2.6: u = 28.05 kHz is rounded to 28 kHz.
        (1234.567, 28.05, 2, ("1235", "28")),
        # GUM 7.2.2: m = 100.021 47 g with u = 0.35 mg, quoted with two digits of the uncertainty.
        (100.02147, 0.00035, 2, ("100.02147", "0.00035")),
        (5.0, 0.0996, 2, ("5.00", "0.10")),  # rounding up gains a digit: still two of them
        (-0.12345, 0.0067, 1, ("-0.123", "0.007")),
        (0.0, 0.012, 2, ("0.000", "0.012")),
        (1234567.0, 4500.0, 2, ("1.2346 × 10⁶", "0.0045 × 10⁶")),
        (1.23456e-9, 1.2e-11, 2, ("1.235 × 10⁻⁹", "0.012 × 10⁻⁹")),
        (0.5, 12.0, 2, ("0", "12")),
    ],
)
def test_value_and_uncertainty_end_at_the_same_place(value, uncertainty, digits, expected):
    assert rounded(value, uncertainty, digits) == expected


def test_halves_are_rounded_to_even_on_the_decimal_number_itself():
    assert rounded(0.125, 1.0e-2, 1)[0] == "0.12"  # binary rounding of the text would not matter here
    assert rounded(2.675, 0.01, 1)[0] == "2.68"  # the nearest double lies below 2.675


@pytest.mark.parametrize("uncertainty", [None, 0.0, float("nan"), float("inf"), -1.0, 1e-30])
def test_without_a_usable_uncertainty_six_digits_are_given(uncertainty):
    assert rounded(math.pi, uncertainty)[0] == "3.14159"


def test_nothing_is_never_written_as_a_number():
    assert rounded(None, 0.1)[0] == "not available"
    assert table_number(None) == table_number(float("nan")) == exact(None) == percent(None) == "–"
    assert text_number(None) == "not available"
    assert with_unit("–", "mA") == "–"
    assert table_number(True) == "–"


@pytest.mark.parametrize(
    ("value", "digits", "text"),
    [(0.0034182, 2, "0.0034"), (0, 2, "0"), (-12.3, 2, "-12"), (123456.0, 2, "1.2 × 10⁵"), (9.96, 2, "10"),
     (1234.0, 2, "1200"), (3e-12, 1, "3 × 10⁻¹²"), (0.68, 2, "0.68")],
)  # fmt: skip
def test_numbers_of_a_sentence(value, digits, text):
    assert text_number(value, digits) == text


@pytest.mark.parametrize("value", [0.1 + 0.2, 1e-300, 12345.678901234567, -7.9908787878787875])
def test_exact_numbers_read_back_the_same(value):
    assert float(exact(value)) == value


def test_tables_hold_six_digits_and_whole_numbers():
    assert table_number(1 / 3) == "0.333333"
    assert table_number(12345678) == "12345678"


@pytest.mark.parametrize(
    ("share", "text"), [(0.214, "21 %"), (0.0231, "2.3 %"), (0.9999, "over 99 %"), (1e-5, "under 0.1 %"),
                        (1.0, "100 %"), (0.0, "0 %"), (-0.125, "-12 %")]
)  # fmt: skip
def test_shares(share, text):
    assert percent(share) == text


def test_probabilities():
    assert probability(5.7e-66) == "< 0.0001"
    assert probability(0.3059) == "0.31"
    assert probability(1.0) == probability(0.9999) == "1.0"
    assert probability(0.3) == "0.30"
    assert (equals("0.31"), equals("< 0.0001"), equals("–")) == ("= 0.31", "< 0.0001", "–")


@pytest.mark.parametrize(
    ("value", "text"), [(1.2126461988, "1.213"), (12345.6, "12350"), (1, "1.000"), (0.94671, "0.9467"), (None, "–")]
)
def test_statistics_have_four_digits_whatever_their_size(value, text):
    assert statistic(value) == text


def test_units_to_a_power():
    assert (squared("mA"), squared("m/s"), squared(""), powered("m", -2), powered("m", 1)) == (
        "mA²",
        "(m/s)²",
        "",
        "m⁻²",
        "m",
    )


def test_a_unit_in_brackets_gets_no_second_pair():
    assert squared("(unit not stated)") == "(unit not stated)²"
    assert squared("(m)/(s)") == "((m)/(s))²"


@pytest.mark.parametrize(
    ("value", "text"), [(1346250.0, "1346000"), (3e6, "3000000"), (6.538461, "6.538"), (10.0, "10"), (2e12, "2e+12")]
)
def test_places_have_no_exponent_that_is_not_needed(value, text):
    assert place_number(value) == text


def test_the_error_of_a_root_is_that_of_first_order():
    value, error = root(4.0e-6, 8.0e-7)
    assert value == pytest.approx(2e-3)
    assert error == pytest.approx(8.0e-7 / (2 * 2e-3))
    assert root(0.0, 1.0) == (0.0, None)
    assert root(None) == (None, None)
