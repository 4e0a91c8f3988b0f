"""The shape of a curve: turning points, monotone or not, excursions, verdicts of an inversion."""

import numpy as np
import pytest

from fitlib.numerics.diagnostics import excursion, is_monotone
from fitlib.numerics.families import make_family, parameter_count, restore
from fitlib.numerics.families.polynomial import PolynomialCurve, Scale
from fitlib.numerics.inverse import inverse_evaluation


def _curve(coefficients, centre=0.0, half_span=1.0, points=()):
    return PolynomialCurve(Scale(centre, half_span, points), np.array(coefficients, dtype=float))


def _through(x, y, degree):
    x = np.asarray(x, dtype=float)
    family = make_family("polynomial", x, [degree], ())
    fit = family.problem(x, np.asarray(y, dtype=float), np.ones(x.size)).fit()[0]
    return family.curve(family.members[0], fit.coefficients)


def test_turning_points_of_a_chebyshev_polynomial():
    """T_5 turns at cos(k pi / 5) (Mason & Handscomb 2003, sec. 2.2)."""
    curve = _curve([0, 0, 0, 0, 0, 1.0], 10.0, 5.0)
    np.testing.assert_allclose(
        curve.turning_points(5, 15), 10 + 5 * np.sort(np.cos(np.arange(1, 5) * np.pi / 5)), rtol=1e-12
    )
    np.testing.assert_allclose(curve.turning_points(12, 15), [10 + 5 * np.cos(np.pi / 5)], rtol=1e-12)


@pytest.mark.parametrize("degree", [3, 6, 20, 50])
@pytest.mark.parametrize("leading", [1e-12, 1e-17, 1e-30, 1e-300, 5e-324])
def test_a_leading_coefficient_of_rounding_hides_no_turning_point(leading, degree):
    """0.1 T_1 - T_2 turns at u = 1/40, whatever rounding left in higher terms."""
    coefficients = np.zeros(degree + 1)
    coefficients[:3] = 1.0, 0.1, -1.0
    coefficients[degree] = leading
    curve = _curve(coefficients, 60.0, 60.0)
    np.testing.assert_allclose(curve.turning_points(0, 120), [61.5], atol=1e-6)
    assert not is_monotone(curve, 0, 120)


def test_an_inflection_is_no_turning_point():
    """u^3 = (3 T_1 + T_3) / 4 is level at 0 and rises on both sides."""
    cube = _curve([0, 0.75, 0, 0.25])
    assert cube.turning_points(-1, 1).size == 0
    assert is_monotone(cube, -1, 1)


@pytest.mark.parametrize("dip", [1e-2, 1e-4, 1e-6])
def test_a_shallow_dip_is_found(dip):
    """u^3 - dip u turns at plus and minus sqrt(dip / 3), between the points of any grid."""
    curve = _curve([0, 0.75 - dip, 0, 0.25])
    np.testing.assert_allclose(curve.turning_points(-1, 1), np.sqrt(dip / 3) * np.array([-1, 1]), rtol=1e-6)
    assert not is_monotone(curve, -1, 1)


@pytest.mark.parametrize("sign", [1, -1])
def test_rising_and_falling_are_monotone_constant_is_not(sign):
    assert is_monotone(_curve([0, sign]), -1, 1)
    assert is_monotone(_curve([2, 3 * sign, 0.5]), -1, 1)
    assert not is_monotone(_curve([2.0]), -1, 1)
    assert not is_monotone(_curve([2.0, 0.0, 0.0]), -1, 1)


def test_monotone_speaks_of_the_interval_only():
    parabola = _curve([0.5, 0, 0.5])
    assert is_monotone(parabola, 0.1, 1)
    assert not is_monotone(parabola, -0.1, 1)


def test_excursion_of_an_oscillating_curve():
    """x = 0, 1, 2, 3 with y = 0, 0, 1, 1: the cubic through them dips below 0 and rises above 1."""
    x, y = np.arange(4.0), np.array([0.0, 0.0, 1.0, 1.0])
    found = excursion(_through(x, y, 3), x, y, np.arange(4))
    grid = np.linspace(0, 3, 3001)
    values = np.polyval(np.polyfit(x, y, 3), grid)
    assert found.amount == pytest.approx(np.max(-values[grid <= 1]), rel=2e-3)
    assert found.stimulus == pytest.approx(grid[np.argmin(np.where(grid <= 1, values, 1))], abs=0.05)


def test_a_curve_between_its_neighbours_has_no_excursion():
    x = np.repeat([0.0, 1.0, 2.0], 2)
    y = np.array([0.0, 0.1, 1.0, 1.1, 2.0, 2.1])
    assert excursion(_through(x, y, 1), x, y, np.repeat(np.arange(3), 2)).amount == 0.0


def test_excursion_does_not_depend_on_the_order_of_rows():
    rng = np.random.default_rng(0)
    x = np.repeat(np.linspace(0, 1, 7), 3)
    y = x + rng.normal(0, 0.05, 21)
    level = np.repeat(np.arange(7), 3)
    order = rng.permutation(21)
    curve = _through(x, y, 5)
    assert excursion(curve, x, y, level) == excursion(curve, x[order], y[order], level[order])


def test_falling_curves_answer_by_the_stimulus():
    """A response above the largest of a falling curve lies below the range of the stimulus."""
    falling = _curve([0, -1.0], 5.0, 5.0)
    assert inverse_evaluation(falling, 1.5, 0, 10).verdict == "below_range"
    assert inverse_evaluation(falling, -1.5, 0, 10).verdict == "above_range"
    assert inverse_evaluation(falling, 0.0, 0, 10).value == 5.0


def test_the_turning_point_itself_and_both_of_its_sides():
    """2 u^2 - 1 over [-1, 1]: two answers inside, both ends answer 1 together, none below the minimum."""
    parabola = _curve([0, 0, 1.0])
    outcome = inverse_evaluation(parabola, 0.0, -1, 1)
    assert outcome.verdict == "not_unique"
    np.testing.assert_allclose(outcome.competing, [-np.sqrt(0.5), np.sqrt(0.5)], rtol=1e-12)
    ends = inverse_evaluation(parabola, 1.0, -1, 1)
    assert (ends.verdict, ends.competing) == ("not_unique", (-1.0, 1.0))
    assert inverse_evaluation(parabola, -1.1, -1, 1).verdict == "not_evaluated"
    assert inverse_evaluation(parabola, 0.0, 0, 1).verdict == "within_interval"


def test_three_answers_are_all_named():
    wave = _curve([0, 0, 0, 1.0])
    outcome = inverse_evaluation(wave, 0.0, -1, 1)
    np.testing.assert_allclose(outcome.competing, np.array([-1, 0, 1]) * np.sqrt(0.75), atol=1e-12)
    assert len(outcome.turning_points) == 2


def test_probes_are_two_degrees_higher_and_cannot_be_chosen():
    family = make_family("polynomial", np.arange(5.0), [1, 2, 3], ())
    assert [(member.order, member.probe) for member in family.members] == [
        (1, False),
        (2, False),
        (3, False),
        (4, True),
        (5, True),
    ]
    for member in family.members[:3]:
        assert family.two_orders_higher(member).order == member.order + 2
    assert family.two_orders_higher(family.members[4]) is None


def test_fixed_points_take_parameters_away():
    assert parameter_count("polynomial", 3, ()) == 4
    assert parameter_count("polynomial", 3, ((0, 4), (1, 5))) == 2


def test_an_unknown_basis_is_refused():
    with pytest.raises(KeyError):
        restore({"basis": "legendre"})
