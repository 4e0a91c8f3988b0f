"""Shortened coefficients are compared with the issued function, and refused where they move it."""

import numpy as np
import pytest

from fitlib.errors import FitlibError
from fitlib.numerics.families import make_family
from fitlib.numerics.powers import power_form
from fitlib.numerics.shortened import LARGEST_SHARE, shorten, shortest


@pytest.fixture(scope="module")
def thermometer():
    """A quartic over 270 to 370 K in powers of the temperature: large terms that cancel."""
    x = np.linspace(270.0, 370.0, 21)
    y = 2.0 + 0.3 * ((x - 320) / 50) + 0.05 * ((x - 320) / 50) ** 2 - 0.01 * ((x - 320) / 50) ** 4
    family = make_family("polynomial", x, [4], ())
    fit = family.problem(x, y, np.ones(21)).fit()[0]
    curve = family.curve(family.members[0], fit.coefficients)
    return curve, power_form(curve, 1e-8 * fit.inverse_normal, 270.0, 370.0).coefficients, x


def test_four_digits_are_refused_with_the_size_of_the_shift(thermometer):
    curve, coefficients, x = thermometer
    with pytest.raises(FitlibError, match="4 digits are too few: a converted value would move by"):
        shorten(curve, coefficients, 4, x, np.full(x.size, 1e-4))


def test_the_shortest_form_is_accepted_and_one_digit_less_is_not(thermometer):
    curve, coefficients, x = thermometer
    uncertainty = np.full(x.size, 1e-4)
    form = shortest(curve, coefficients, x, uncertainty)
    assert 5 < form.digits < 17
    assert shorten(curve, coefficients, form.digits, x, uncertainty) == form
    with pytest.raises(FitlibError):
        shorten(curve, coefficients, form.digits - 1, x, uncertainty)


def test_the_printed_words_give_the_curve_back(thermometer):
    curve, coefficients, x = thermometer
    form = shortest(curve, coefficients, x, np.full(x.size, 1e-4))
    values = np.polynomial.polynomial.polyval(x, [float(word) for word in form.coefficients])
    np.testing.assert_allclose(values, curve.evaluate(x), rtol=0, atol=1e-4 * LARGEST_SHARE * 1.001)


def test_no_form_is_given_when_every_one_moves_the_curve(thermometer):
    curve, coefficients, x = thermometer
    assert shortest(curve, np.asarray(coefficients) * 1.5, x, np.full(x.size, 1e-4)) is None
