"""Fits in exact arithmetic against published values to thirteen digits, and against arithmetic with 60 digits.

Published: NIST Statistical Reference Datasets (StRD), linear regression, doi 10.18434/M32189; values in ``cases/``.
Other comparisons are with mpmath, which works on the decimal numbers as they are written, by another method.
"""

import math
import random
from fractions import Fraction
from types import SimpleNamespace

import mpmath
import numpy as np
import pytest

from fitlib.numerics.exact import MOST_PARAMETERS, as_written, exact_fits, square_root
from fitlib.numerics.families import make_family
from fitlib.numerics.powers import power_form
from fitlib.numerics.weighting import exact_weights

#: Degree of the model of each set, and how its published quantities are named in the case.
SETS = {
    "strd_norris": (1, ""),
    "nist_pmd61_pontius": (2, "StRD "),
    "strd_filip": (10, ""),
    "strd_wampler1": (5, ""),
    "strd_wampler2": (5, ""),
    "strd_wampler3": (5, ""),
    "strd_wampler4": (5, ""),
    "strd_wampler5": (5, ""),
}
#: Sets that a polynomial meets exactly: NIST certifies standard deviations of zero.
EXACT = ("strd_wampler1", "strd_wampler2")
DIGITS = 13


def _data(case, name):
    data = case(name)["data"]
    keys = ("x_load", "y_deflection") if "x_load" in data else ("x", "y")
    return tuple(np.array(data[key]) for key in keys)


@pytest.fixture(scope="module")
def fitted(case):
    """Each set fitted as the tool fits it: the issued function, the exact fit, and what is published of it."""
    found = {}
    for name, (degree, _) in SETS.items():
        x, y = _data(case, name)
        family = make_family("polynomial", x, [degree], ())
        problem = family.problem(x, y, np.ones(x.size))
        fit = problem.fit()[0]
        assert fit.message == ""
        curve = family.curve(family.members[0], fit.coefficients)
        exact = family.exact(as_written(x), as_written(y), [Fraction(1)] * x.size)[degree]
        variance = exact.residual_sum_of_squares / (x.size - degree - 1)
        power = power_form(curve, float(variance) * fit.inverse_normal, float(x.min()), float(x.max()), exact, variance)
        found[name] = SimpleNamespace(
            curve=curve, exact=exact, variance=variance, power=power, degree=degree, span=float(np.ptp(y)), x=x
        )
    return found


def _certified(published, name, quantity):
    degree, prefix = SETS[name]
    return [float(published(name, f"{prefix}{quantity}{k}")) for k in range(degree + 1)]


def test_the_number_of_sets_is_known():
    assert len(SETS) == 8


@pytest.mark.parametrize("name", SETS)
def test_coefficients(name, fitted, published, agrees):
    agrees(fitted[name].power.coefficients, _certified(published, name, "B"), DIGITS)


@pytest.mark.parametrize("name", [name for name in SETS if name not in (*EXACT, "strd_wampler3")])
def test_standard_deviations_of_coefficients(name, fitted, published, agrees):
    agrees(fitted[name].power.standard_uncertainties, _certified(published, name, "sd B"), DIGITS)


@pytest.mark.parametrize("name", [name for name in SETS if name not in EXACT])
def test_published_numbers_are_the_exact_ones_rounded_once(name, fitted):
    found = fitted[name]
    roots = [square_root(factor * found.variance) for factor in found.exact.variance_factors]
    assert found.power.standard_uncertainties.tolist() == roots
    assert found.power.coefficients.tolist() == [float(value) for value in found.exact.coefficients]


def test_standard_deviations_grow_with_the_deviations(fitted, published, agrees):
    """Wampler3 has the deviations of Wampler4 divided by 100 (``notes`` of the cases)."""
    expected = np.array(_certified(published, "strd_wampler4", "sd B")) / 100
    agrees(fitted["strd_wampler3"].power.standard_uncertainties, expected, DIGITS)


@pytest.mark.parametrize("name", [name for name in SETS if name not in EXACT])
def test_residual_standard_deviation(name, fitted, published, agrees):
    text = published(name, f"{SETS[name][1]}residual SD")
    agrees(square_root(fitted[name].variance), float(text), DIGITS)


@pytest.mark.parametrize("name", EXACT)
def test_exact_sets_leave_nothing(name, fitted, within):
    found = fitted[name]
    limit = 10.0**-DIGITS * found.span
    within(square_root(found.variance), 0.0, limit)
    within(found.power.standard_uncertainties, np.zeros(6), limit)


def _chebyshev(coefficients, centre, half):
    """The same polynomial of x in Chebyshev polynomials of u = (x - centre) / half, without rounding."""
    series = [Fraction(0)]
    for value in reversed(coefficients):
        times_u = [Fraction(0)] * (len(series) + 1)
        for k, part in enumerate(series):  # u T_0 = T_1 and u T_k = (T_(k-1) + T_(k+1)) / 2
            share = part if k == 0 else part / 2
            times_u[k + 1] += share
            if k:
                times_u[k - 1] += share
        padded = [*series, Fraction(0)]
        series = [centre * a + half * b for a, b in zip(padded, times_u, strict=True)]
        series[0] += value
    return series


def _largest_distance(record, exact):
    """No point of the interval has a larger one: Chebyshev polynomials stay within -1 and 1."""
    centre, half = Fraction(record["centre"]), Fraction(record["half_span"])
    other = _chebyshev(exact.coefficients, centre, half)
    issued = [Fraction(value) for value in record["coefficients"]]
    assert not any(other[len(issued) :])
    return float(sum(abs(a - b) for a, b in zip(issued, other, strict=False)))


@pytest.mark.parametrize("name", SETS)
def test_the_issued_function_is_the_exact_polynomial(name, fitted, within):
    """Over the whole interval, between observations too; Filip's tenth degree is no exception in the scaled basis."""
    found = fitted[name]
    record = found.curve.to_record()
    assert (record["centre"], record["half_span"]) == ((found.x.max() + found.x.min()) / 2, np.ptp(found.x) / 2)
    within(_largest_distance(record, found.exact), 0.0, 1e-12 * found.span)
    for k in range(found.degree + 1):
        moved = [value + (3e-12 * found.span if k == j else 0.0) for j, value in enumerate(record["coefficients"])]
        assert _largest_distance(record | {"coefficients": moved}, found.exact) > 2e-12 * found.span


@pytest.mark.parametrize("name", SETS)
def test_coefficients_in_powers_give_the_issued_function(name, fitted, within):
    """Filip's coefficients lose nine digits to each other, however well they are rounded; others lose none."""
    found = fitted[name]
    within(found.power.largest_shift, 0.0, (1e-9 if name == "strd_filip" else 1e-15) * found.span)


def test_the_shift_of_filip_comes_from_rounding_the_coefficients(fitted):
    """Each coefficient is off by up to half a unit of its last place, times x to its power at the far end."""
    found = fitted["strd_filip"]
    far = np.max(np.abs(found.x))
    rounding = sum(np.spacing(abs(value)) / 2 * far**k for k, value in enumerate(found.power.coefficients))
    assert 1e-11 * found.span < found.power.largest_shift < rounding


# With 60 digits: weighted least squares with and without fixed points


def _with_sixty_digits(x, y, power, degree, points=()):
    """Normal equations with Lagrange multipliers for the fixed points, weights ``x^-power`` averaging 1."""
    with mpmath.workdps(60):
        x, y = ([mpmath.mpf(repr(float(value))) for value in values] for values in (x, y))
        weights = [value**-power for value in x]
        mean = mpmath.fsum(weights) / len(weights)
        weights = [value / mean for value in weights]
        p = degree + 1
        matrix, right = mpmath.zeros(p + len(points)), mpmath.zeros(p + len(points), 1)
        for j in range(p):
            right[j] = mpmath.fsum(w * b * a**j for w, a, b in zip(weights, x, y, strict=True))
            for k in range(p):
                matrix[j, k] = mpmath.fsum(w * a ** (j + k) for w, a in zip(weights, x, strict=True))
        for number, (a, b) in enumerate(points):
            right[p + number] = mpmath.mpf(repr(b))
            for k in range(p):
                matrix[p + number, k] = matrix[k, p + number] = mpmath.mpf(repr(a)) ** k
        inverse = matrix**-1
        solution = inverse * right
        powers = [[a**k for k in range(p)] for a in x]
        residuals = [b - mpmath.fdot(row, solution[:p]) for row, b in zip(powers, y, strict=True)]
        squares = mpmath.fsum(w * r**2 for w, r in zip(weights, residuals, strict=True))
        return SimpleNamespace(
            coefficients=[float(solution[k]) for k in range(p)],
            roots=[float(mpmath.sqrt(abs(inverse[k, k]))) for k in range(p)],
            sum_of_squares=float(squares),
        )


def _exactly(x, y, weighting, degree, points=()):
    x, y = as_written(x), as_written(y)
    points = [tuple(as_written(point)) for point in points]
    return exact_fits(x, y, exact_weights(weighting, x), [degree], points)[degree]


WEIGHTINGS = {"none": 0, "inverse_stimulus": 1, "inverse_stimulus_squared": 2}
POSITIVE = [name for name in SETS if name != "strd_filip"]  # relative weights need a positive stimulus


@pytest.mark.parametrize("weighting", WEIGHTINGS)
@pytest.mark.parametrize("name", POSITIVE)
def test_weighted_fits(name, weighting, case, agrees):
    x, y = _data(case, name)
    x, y = x[x > 0], y[x > 0]
    degree = SETS[name][0]
    expected = _with_sixty_digits(x, y, WEIGHTINGS[weighting], degree)
    found = _exactly(x, y, weighting, degree)
    agrees([float(value) for value in found.coefficients], expected.coefficients, 14)
    agrees([square_root(value) for value in found.variance_factors], expected.roots, 14)
    if name not in EXACT:
        agrees(float(found.residual_sum_of_squares), expected.sum_of_squares, 14)


def test_filip_with_sixty_digits(case, agrees):
    x, y = _data(case, "strd_filip")
    expected = _with_sixty_digits(x, y, 0, 10)
    found = _exactly(x, y, "none", 10)
    agrees([float(value) for value in found.coefficients], expected.coefficients, 14)
    agrees([square_root(value) for value in found.variance_factors], expected.roots, 14)


@pytest.mark.parametrize("weighting", WEIGHTINGS)
@pytest.mark.parametrize(
    "points", [[(0.0, 0.0)], [(0.0, 0.01)], [(0.0, 0.0), (1.8e6, 1.3079)], [(-1.5e5, -0.11), (0.1, 0.2), (3.1e6, 2.3)]]
)
def test_fits_through_fixed_points(weighting, points, case, agrees):
    x, y = _data(case, "nist_pmd61_pontius")
    expected = _with_sixty_digits(x, y, WEIGHTINGS[weighting], 4, points)
    found = _exactly(x, y, weighting, 4, points)
    coefficients = [float(value) for value in found.coefficients]
    if points[0] == (0.0, 0.0):  # then the constant term is zero, and known
        assert (found.coefficients[0], found.variance_factors[0]) == (0, 0)
        coefficients, expected.coefficients, expected.roots = (
            coefficients[1:],
            expected.coefficients[1:],
            expected.roots[1:],
        )
    roots = [square_root(value) for value in found.variance_factors][-len(coefficients) :]
    if points[0] == (0.0, 0.01):
        assert (found.coefficients[0], found.variance_factors[0]) == (Fraction(1, 100), 0)
        roots, expected.roots = roots[1:], expected.roots[1:]
    agrees(coefficients, expected.coefficients, 14)
    agrees(roots, expected.roots, 14)
    agrees(float(found.residual_sum_of_squares), expected.sum_of_squares, 14)
    for a, b in points:
        a, b = as_written([a, b])
        assert sum(value * a**k for k, value in enumerate(found.coefficients)) == b


def test_the_scale_of_the_weights_does_not_matter(case):
    x, y = (as_written(values) for values in _data(case, "strd_norris"))
    weights = exact_weights("inverse_stimulus", x)
    other = [Fraction(7, 3) * value for value in weights]
    assert exact_fits(x, y, weights, [1, 3]) == exact_fits(x, y, other, [1, 3])


def test_numbers_are_taken_as_they_were_written():
    """Three points on y = 0.1 x: in decimals nothing is left, in doubles 0.1 * 3 is not 0.3."""
    found = exact_fits(as_written([1.0, 2.0, 3.0]), as_written([0.1, 0.2, 0.3]), [Fraction(1)] * 3, [1])[1]
    assert found.coefficients == (0, Fraction(1, 10))
    assert found.residual_sum_of_squares == 0
    assert as_written([1e-320, -2.5e300]) == [Fraction(1, 10**320), Fraction(-25 * 10**299)]


def test_degrees_that_the_data_do_not_determine_are_left_out():
    x, y = as_written([1.0, 1.0, 2.0, 3.0, 3.0]), as_written([1.0, 1.5, 2.0, 2.5, 4.0])
    ones = [Fraction(1)] * 5
    assert set(exact_fits(x, y, ones, [1, 2, 3, 4, 7])) == {1, 2}  # three places: no cubic, no quartic
    assert exact_fits(x, y, ones, [5]) == {}  # six parameters, five observations
    assert exact_fits(x, y, ones, []) == {}


def test_degrees_without_a_free_parameter_are_left_out():
    x, y = as_written([1.0, 2.0, 3.0]), as_written([1.0, 2.5, 2.0])
    points = [tuple(as_written(point)) for point in ((0.0, 0.0), (4.0, 5.0))]
    assert set(exact_fits(x, y, [Fraction(1)] * 3, [0, 1, 2], points)) == {2}


def test_observations_at_the_fixed_point_determine_nothing():
    points = [tuple(as_written((2.0, 2.5)))]
    assert exact_fits(as_written([2.0, 2.0]), as_written([2.4, 2.6]), [Fraction(1)] * 2, [1], points) == {}


def test_the_largest_number_of_parameters():
    x, y = as_written(range(1, 31)), as_written([(7 * k) % 11 for k in range(30)])
    found = exact_fits(x, y, [Fraction(1)] * 30, [MOST_PARAMETERS - 1, MOST_PARAMETERS])
    assert set(found) == {MOST_PARAMETERS - 1}


# Square roots


def test_square_roots_of_doubles():
    """IEEE 754 demands that the square root is rounded correctly."""
    source = random.Random(20260401)
    values = [source.uniform(0.0, 1.0) * 10.0 ** source.randint(-300, 300) for _ in range(400)]
    assert [square_root(Fraction(value)) for value in values] == [math.sqrt(value) for value in values]


@pytest.mark.parametrize(("above", "below"), [(40, 4000), (4000, 40), (4000, 4000), (1, 1200), (1200, 1), (3000, 2900)])
def test_square_roots_of_ratios_of_very_long_numbers(above, below):
    source = random.Random(above * 10_000 + below)
    shift = 2 * ((below - above) // 2)  # so that the root is a double
    for _ in range(50):
        numerator, denominator = (source.getrandbits(size) | 1 << size - 1 for size in (above, below))
        value = Fraction(numerator, denominator) * Fraction(2) ** (shift + source.randint(-800, 800))
        with mpmath.workprec(9000):
            expected = mpmath.sqrt(mpmath.mpf(value.numerator) / value.denominator)
        assert square_root(value) == float(expected)


@pytest.mark.parametrize("root", [Fraction(0), Fraction(3), Fraction(1, 7), Fraction(10**30 + 1, 10**17)])
def test_square_roots_of_squares(root):
    assert square_root(root**2) == float(root)
    assert square_root(-(root**2)) == 0.0


def test_a_root_beyond_the_range_of_doubles_is_infinite():
    assert square_root(Fraction(10) ** 700) == float("inf")
    assert square_root(Fraction(10) ** 600) == 1e300
