"""Curves: fixed points, inverse evaluation, coefficients in powers; against closed forms and exact fractions."""

from fractions import Fraction

import numpy as np
import pytest
import statsmodels.api as sm

from fitlib.numerics.diagnostics import is_monotone
from fitlib.numerics.families import make_family, restore
from fitlib.numerics.inverse import inverse_evaluation
from fitlib.numerics.powers import power_form


def _noisy(seed: int = 1, n: int = 25):
    rng = np.random.default_rng(seed)
    x = np.linspace(2.0, 20.0, n)
    return x, 4 + 1.6 * x - 0.01 * x**2 + rng.normal(0, 0.05, n)


@pytest.mark.parametrize("points", [[(0.0, 4.0)], [(0.0, 4.0), (20.0, 32.5)], [(2.0, 7.0), (8.0, 16.0), (31.0, 44.0)]])
def test_fixed_points_by_constrained_least_squares(points, fit_polynomial, agrees, within):
    """A polynomial through points is least squares under linear constraints (method of Lagrange), here with numpy."""
    x, y = _noisy()
    degree = 4
    result = fit_polynomial(x, y, degree, points)
    px, py = np.array(points).T
    scaled, at = (x - 11) / 9, (px - 11) / 9
    a, c = np.vander(scaled, degree + 1), np.vander(at, degree + 1)
    zeros = np.zeros((len(points), len(points)))
    system = np.block([[2 * a.T @ a, c.T], [c, zeros]])
    solution = np.linalg.solve(system, np.concatenate([2 * a.T @ y, py]))[: degree + 1]
    grid = np.linspace(0, 31, 9)
    agrees(result.curve.evaluate(grid), np.polyval(solution, (grid - 11) / 9), 8)
    within(result.curve.evaluate(px), py, 1e-11)
    assert result.parameters == degree + 1 - len(points)


def test_fixed_point_standard_uncertainty(fit_polynomial, agrees, within):
    """Degree 2 through (0, 4): regression of y - 4 on x and x^2 without a constant (statsmodels)."""
    x, y = _noisy(2)
    result = fit_polynomial(x, y, 2, [(0.0, 4.0)])
    fit = sm.OLS(y - 4, np.column_stack([x, x**2])).fit()
    agrees(result.power.coefficients[1:], fit.params, 9)
    agrees(result.power.standard_uncertainties[1:], fit.bse, 9)
    agrees(result.power.coefficients[0], 4.0, 13)
    within(result.power.standard_uncertainties[0], 0.0, 1e-13)


@pytest.mark.parametrize("points", [(), ((0.0, 4.0),), ((0.0, 4.0), (25.0, 38.0))])
def test_derivatives_by_differences(points, fit_polynomial, agrees):
    """Slope and Jacobian against central differences; the record restores the same curve bit for bit."""
    x, y = _noisy(3)
    curve = fit_polynomial(x, y, 3, points).curve
    grid = np.linspace(2, 20, 7)
    step = 1e-5
    agrees(curve.slope(grid), (curve.evaluate(grid + step) - curve.evaluate(grid - step)) / (2 * step), 7)
    again = restore(curve.to_record())
    assert np.array_equal(again.evaluate(grid), curve.evaluate(grid))
    assert np.array_equal(again.slope(grid), curve.slope(grid))
    jacobian = curve.jacobian(grid)
    for column in range(jacobian.shape[1]):
        record = curve.to_record()
        record["coefficients"][column] += 1.0
        agrees(restore(record).evaluate(grid) - curve.evaluate(grid), jacobian[:, column], 9)


@pytest.mark.parametrize("degree", [1, 2, 3, 5])
def test_round_trip(degree, fit_polynomial):
    """Stimulus, response and back over 1000 points: within 1e-9 of the span."""
    x, y = _noisy(4)
    curve = fit_polynomial(x, y, degree).curve
    assert is_monotone(curve, 2.0, 20.0)
    grid = np.linspace(2.0, 20.0, 1000)
    back = [inverse_evaluation(curve, value, 2.0, 20.0) for value in curve.evaluate(grid)]
    assert {item.verdict for item in back} == {"within_interval"}
    assert np.max(np.abs([item.value for item in back] - grid)) < 1e-9 * 18


@pytest.mark.parametrize("sign", [1.0, -1.0])
@pytest.mark.parametrize("degree", [1, 3])
def test_one_unit_in_the_last_place_outside(sign, degree, fit_polynomial):
    """Both ends belong to the interval; the next number beyond does not. Verdicts speak of the stimulus."""
    x, y = _noisy(5)
    curve = fit_polynomial(x, sign * y, degree).curve
    for end, beyond, verdict in ((2.0, -sign, "below_range"), (20.0, sign, "above_range")):
        response = float(curve.evaluate(np.array([end]))[0])
        inside = inverse_evaluation(curve, response, 2.0, 20.0)
        assert (inside.verdict, inside.value) == ("within_interval", end)
        outside = inverse_evaluation(curve, np.nextafter(response, beyond * np.inf), 2.0, 20.0)
        assert outside.verdict == verdict
        assert np.isnan(outside.value)


def test_inverse_by_the_quadratic_formula(fit_polynomial, agrees):
    x, y = _noisy(6)
    result = fit_polynomial(x, y, 2)
    c, b, a = result.power.coefficients
    for response in (8.0, 15.0, 30.0):
        expected = (-b + np.sqrt(b * b - 4 * a * (c - response))) / (2 * a)
        agrees(inverse_evaluation(result.curve, response, 2.0, 20.0).value, expected, 11)


@pytest.fixture(scope="module")
def pump(fit_polynomial):
    flow = np.linspace(0.0, 120.0, 12)
    return fit_polynomial(flow, 48 + 0.0597 * flow - 0.0019 * flow**2 - 4e-6 * flow**3, 3).curve


class TestPumpCurve:
    """H = 48 + 0.0597 Q - 0.0019 Q^2 - 4e-6 Q^3 over 0 to 120 m3/h: the head first rises, then falls."""

    def test_turning_point(self, pump, agrees):
        """Zero of 0.0597 - 0.0038 Q - 12e-6 Q^2 by the quadratic formula."""
        expected = (-0.0038 + np.sqrt(0.0038**2 + 4 * 12e-6 * 0.0597)) / (2 * 12e-6)
        agrees(expected, 15.0, 3)
        agrees(pump.turning_points(0.0, 120.0), [expected], 9)
        assert not is_monotone(pump, 0.0, 120.0)
        assert is_monotone(pump, 20.0, 120.0)

    def test_refused_between_the_shut_off_head_and_the_maximum(self, pump, within):
        """Both flows are named, and they are roots of the cubic (numpy)."""
        for head in (48.001, 48.2, 48.44):
            outcome = inverse_evaluation(pump, head, 0.0, 120.0)
            assert outcome.verdict == "not_unique"
            assert np.isnan(outcome.value)
            roots = np.roots([-4e-6, -0.0019, 0.0597, 48 - head])
            expected = sorted(root.real for root in roots if abs(root.imag) < 1e-9 and 0 <= root.real <= 120)
            assert len(expected) == 2
            within(outcome.competing, expected, 1e-8)
            within(outcome.turning_points, [15.0], 0.01)

    def test_unique_below_the_shut_off_head(self, pump, within):
        for head in (47.999, 40.0, 25.0):
            outcome = inverse_evaluation(pump, head, 0.0, 120.0)
            assert outcome.verdict == "within_interval"
            within(pump.evaluate(np.array([outcome.value])), [head], 1e-10)

    def test_nothing_above_the_maximum(self, pump):
        assert inverse_evaluation(pump, 48.5, 0.0, 120.0).verdict == "not_evaluated"

    def test_no_number_from_no_number(self, pump):
        for reading in (np.nan, np.inf, -np.inf):
            outcome = inverse_evaluation(pump, reading, 0.0, 120.0)
            assert (outcome.verdict, outcome.competing) == ("not_a_number", ())


def _exact_value(curve, x: Fraction) -> Fraction:
    """The issued function in rational numbers: Clenshaw-free, by the three-term recurrence."""
    u = (x - Fraction(curve.scale.centre)) / Fraction(curve.scale.half_span)

    def series(coefficients) -> Fraction:
        total, previous, current = Fraction(0), Fraction(1), u
        for k, value in enumerate(coefficients):
            term = previous if k == 0 else current
            if k > 1:
                term = 2 * u * current - previous
                previous, current = current, term
            total += Fraction(float(value)) * term
        return total

    return series(curve.scale.interpolant) + series(curve.scale.nodal) * series(curve.coefficients)


@pytest.mark.parametrize("points", [(), ((0.0, 4.0),), ((0.0, 4.0), (25.0, 38.0))])
@pytest.mark.parametrize("degree", [2, 6, 10])
def test_power_coefficients_are_correctly_rounded(degree, points, fit_polynomial):
    """Exact interpolation of the issued function at degree + 1 rational points gives the coefficients without error."""
    x, y = _noisy(7)
    result = fit_polynomial(x, y, degree, points)
    nodes = [Fraction(k) for k in range(degree + 1)]
    table = [_exact_value(result.curve, node) for node in nodes]
    for order in range(1, degree + 1):  # Newton's divided differences
        for k in range(degree, order - 1, -1):
            table[k] = (table[k] - table[k - 1]) / (nodes[k] - nodes[k - order])
    exact = [Fraction(0)]
    for k in range(degree, -1, -1):
        shifted = [Fraction(0), *exact]
        exact = [a - nodes[k] * b for a, b in zip(shifted, [*exact, Fraction(0)], strict=True)]
        exact[0] += table[k]
    expected = [float(value) for value in exact[: degree + 1]]
    assert result.power.coefficients.tolist() == expected
    assert np.nextafter(result.power.coefficients[0], np.inf) != expected[0]
    grid = [Fraction(2) + Fraction(18) * k / 64 for k in range(65)]
    shift = max(
        abs(sum((a - Fraction(b)) * point**k for k, (a, b) in enumerate(zip(exact, expected, strict=False))))
        for point in grid
    )
    assert result.power.largest_shift == pytest.approx(float(shift), rel=1e-12)


def test_largest_shift_grows_with_the_offset_of_the_stimulus(fit_polynomial):
    """A narrow interval far from zero: published powers shift the function, and the record says by how much."""
    x = 1e4 + np.linspace(0, 1, 15)
    y = np.sin(2 * (x - 1e4))
    result = fit_polynomial(x, y, 5)
    exact = [_exact_value(result.curve, Fraction(float(value))) for value in x]
    rounded = [
        sum(Fraction(float(c)) * Fraction(float(value)) ** k for k, c in enumerate(result.power.coefficients))
        for value in x
    ]
    seen = max(abs(float(a - b)) for a, b in zip(exact, rounded, strict=True))
    assert 0 < seen <= 2 * result.power.largest_shift
    assert result.power.largest_shift < 4 * seen + 1e-3
    narrow = power_form(result.curve, result.covariance, 1e4, 1e4 + 1)
    assert narrow.largest_shift > 1e-6 > fit_polynomial(x - 1e4, y, 5).power.largest_shift


def test_members_are_nested_in_one_factorisation(agrees):
    """Fitting degrees 0 to 6 at once is the same as fitting each alone."""
    x, y = _noisy(8)
    together = make_family("polynomial", x, range(7), ())
    fits = together.problem(x, y, np.ones(x.size)).fit()
    for degree in range(7):
        alone = make_family("polynomial", x, [degree], ())
        agrees(fits[degree].coefficients, alone.problem(x, y, np.ones(x.size)).fit()[0].coefficients, 9)
