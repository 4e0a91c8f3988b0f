"""From values to positions on paper."""

from __future__ import annotations

import numpy as np
import pytest

from fitlib.figures.scales import decade_scale, linear_scale


def test_ordinary_numbers_keep_their_size():
    scale = linear_scale([0.0, 10.0], margin=0.05)
    assert (scale.lower, scale.upper, scale.power, scale.offset) == (-0.5, 10.5, 0, 0.0)
    assert scale.label("level", "m") == "level /\N{NO-BREAK SPACE}m"


@pytest.mark.parametrize(("size", "power"), [(4e-7, -9), (3e6, 6), (2e150, 150), (5e-200, -201)])
def test_powers_of_ten_are_taken_out_in_threes_and_named(size, power):
    scale = linear_scale([0.0, size])
    assert scale.power == power
    assert scale(size) == pytest.approx(size / 10.0**power)
    assert "10" in scale.label("level", "m")


def test_a_small_range_on_a_large_value_is_shifted_and_named():
    scale = linear_scale([1e9 + 1, 1e9 + 2])
    assert scale.offset != 0
    assert scale(1e9 + 2) - scale(1e9 + 1) == pytest.approx(1.0)
    assert scale.label("frequency", "Hz").startswith("(frequency − 1")


@pytest.mark.parametrize("values", [[], [np.nan], [3.0], [0.0, 0.0], [1e300, 1e300], [-5.0]])
def test_limits_are_a_proper_interval_whatever_the_values(values):
    scale = linear_scale(values)
    assert np.isfinite([scale.lower, scale.upper]).all()
    assert scale.lower < scale.upper


def test_a_wild_value_is_led_off_the_panel_but_not_to_infinity():
    scale = linear_scale([0.0, 1.0])
    at = scale([1e12, -1e12])
    assert at[0] > 10 * scale.upper
    assert np.abs(at).max() < 100


@pytest.mark.parametrize("upper", [0.013, 1.0, 7.0, 99.0, 12345.0])
def test_ticks_say_what_they_stand_for(upper):
    scale = linear_scale([-upper / 3, upper])
    at, texts = scale.ticks(6)
    assert len(at) >= 2
    assert [float(text.replace("−", "-")) for text in texts] == pytest.approx(at, rel=1e-9, abs=1e-12)


def test_decades_are_labelled_and_zero_goes_to_the_foot():
    scale = decade_scale([0.0, 1e-6, 1e2])
    at, texts, _ = scale.ticks()
    assert dict(zip(texts, at, strict=True))["0.01"] == -2
    assert scale([0.0])[0] == scale.lower
    assert np.isnan(scale([np.nan])[0])


@pytest.mark.parametrize(("low", "high"), [(2.1e-3, 2.2e-3), (0.9, 1.1), (4e5, 9e5), (1e-9, 3e-9)])
def test_less_than_a_decade_still_has_a_labelled_tick(low, high):
    at, texts, _ = decade_scale([low, high]).ticks()
    assert len(texts) >= 2


def test_without_a_positive_value_nothing_is_labelled():
    assert decade_scale([0.0, 0.0]).ticks() == ([], [], [])
