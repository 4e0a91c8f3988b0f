"""The solver on degenerate input: the right answer or a plain message, never nonsense in silence, never a warning.

Every RuntimeWarning is an error in this suite (pyproject.toml).
"""

from fractions import Fraction

import numpy as np
import pytest

from fitlib.numerics.families import make_family
from fitlib.numerics.least_squares import LinearProblem


def _fit(x, y, degree, **keys):
    x = np.asarray(x, dtype=float)
    family = make_family("polynomial", x, [degree], keys.get("fixed_points", ()))
    fit = family.problem(x, np.asarray(y, dtype=float), keys.get("root_weights", np.ones(x.size))).fit()[0]
    return fit, family.curve(family.members[0], fit.coefficients)


def _exact_line(x, y):
    """Slope and intercept of least squares in rational numbers."""
    x, y = [Fraction(float(v)) for v in x], [Fraction(float(v)) for v in y]
    n = len(x)
    mx, my = sum(x) / n, sum(y) / n
    slope = sum((a - mx) * (b - my) for a, b in zip(x, y, strict=True)) / sum((a - mx) ** 2 for a in x)
    return slope, my - slope * mx


def test_two_levels_carry_a_line_and_no_more():
    x, y = [1.0, 1.0, 3.0, 3.0], [2.0, 2.2, 4.0, 4.4]
    line, curve = _fit(x, y, 1)
    assert line.message == ""
    np.testing.assert_allclose(curve.evaluate(np.array([1.0, 3.0])), [2.1, 4.2], rtol=1e-14)
    np.testing.assert_allclose(line.leverage, 0.5, rtol=1e-14)
    bowed, _ = _fit(x, y, 2)
    assert "rank deficient" in bowed.message
    assert np.isnan(bowed.coefficients).all()


@pytest.mark.parametrize("degree", [1, 2, 3])
def test_more_parameters_than_observations(degree):
    fit, _ = _fit([1.0, 2.0], [1.0, 2.0], degree)
    if degree == 1:
        assert fit.message == ""
    else:
        assert fit.message == f"{degree + 1} parameters need at least {degree + 1} observations; there are 2"
        assert np.isnan(fit.residual).all()


def test_as_many_parameters_as_observations_interpolate():
    x = np.array([0.0, 1.0, 2.0, 5.0])
    fit, curve = _fit(x, [1.0, -1.0, 4.0, 2.0], 3)
    np.testing.assert_allclose(curve.evaluate(x), [1.0, -1.0, 4.0, 2.0], atol=1e-13)
    np.testing.assert_allclose(fit.leverage, 1.0, rtol=1e-12)


@pytest.mark.parametrize("step", [1e-3, 1e-5, 1e-6])
@pytest.mark.parametrize("offset", [1e9, -1e9])
def test_small_steps_on_a_huge_offset(offset, step):
    """The numbers kept are the doubles next to the steps; the line through them is the one of exact arithmetic."""
    x = offset + step * np.arange(12)
    y = np.array([0.3, 1.1, 2.2, 2.8, 4.1, 5.3, 5.7, 7.1, 8.2, 8.8, 10.1, 10.9])
    fit, curve = _fit(x, y, 1)
    slope, intercept = _exact_line(x, y)
    expected = [float(slope * Fraction(float(v)) + intercept) for v in x]
    np.testing.assert_allclose(curve.evaluate(x), expected, rtol=1e-12)
    np.testing.assert_allclose(curve.slope(x[:1]), [float(slope)], rtol=1e-11)
    assert fit.message == ""


def test_steps_below_the_resolution_of_the_offset_are_one_level():
    x = 1e9 + 1e-8 * np.arange(6)
    assert np.unique(x).size == 1
    held = LinearProblem(np.vander(x - 1e9, 2, increasing=True), np.arange(6.0), np.ones(6), [1, 2])
    constant, line = held.fit()
    assert constant.message == ""
    assert "rank deficient" in line.message


@pytest.mark.parametrize("scale", [1e-100, 1e-30, 1e30, 1e100, 1e300])
def test_units_of_the_stimulus_do_not_matter(scale):
    """Powers of two would agree bit by bit; powers of ten to rounding."""
    u = np.linspace(0, 3, 10)
    y = np.cos(u)
    plain, _ = _fit(u, y, 3)
    scaled, curve = _fit(scale * u, y, 3)
    np.testing.assert_allclose(scaled.coefficients, plain.coefficients, rtol=1e-11)
    np.testing.assert_allclose(curve.evaluate(scale * u), y - plain.residual, rtol=1e-11)


@pytest.mark.parametrize("scale", [2.0**-300, 2.0**300])
def test_units_of_the_response_only_scale(scale):
    u = np.linspace(0, 3, 10)
    plain, _ = _fit(u, np.cos(u), 2)
    scaled, _ = _fit(u, scale * np.cos(u), 2)
    assert np.array_equal(scaled.coefficients, scale * plain.coefficients)
    assert np.array_equal(scaled.residual, scale * plain.residual)
    assert scaled.residual_sum_of_squares == scale**2 * plain.residual_sum_of_squares


def test_denormal_steps_keep_the_curve():
    """Steps of the smallest doubles: levels are told apart as long as they are different numbers."""
    x = 5e-324 * np.array([0, 1024, 2048, 3072, 4096], dtype=float)
    y = np.array([0.0, 1.0, 2.0, 3.0, 4.0])
    fit, curve = _fit(x, y, 1)
    assert fit.message == ""
    np.testing.assert_allclose(curve.evaluate(x), y, atol=1e-14)


def test_one_observation_is_a_constant():
    fit = LinearProblem(np.ones((1, 1)), np.array([4.2]), np.ones(1), [1]).fit()[0]
    assert (fit.coefficients.tolist(), fit.residual.tolist(), fit.leverage.tolist()) == ([4.2], [0.0], [1.0])
    (held,) = LinearProblem(np.ones((1, 1)), np.array([4.2]), np.ones(1), [1]).held_out([np.array([0])])
    assert held.shape == (1, 1)
    assert np.isnan(held).all()


@pytest.mark.parametrize("factor", [1e-5, 1e-7])
def test_nearly_equal_levels_are_solved_not_refused(factor):
    """Levels 0, factor, 2 factor and 1: the quadratic is determined, the answer is that of exact interpolation."""
    x = np.array([0.0, factor, 2 * factor, 1.0])
    y = 1 + x + x**2
    fit, curve = _fit(x, y, 2)
    assert fit.message == ""
    np.testing.assert_allclose(curve.evaluate(x), y, rtol=1e-12)


def test_levels_too_close_are_refused():
    x = np.array([0.0, 1e-13, 2e-13, 1.0])
    fit, _ = _fit(x, 1 + x, 2)
    assert fit.message == "the observations do not determine 3 parameters (rank deficient design)"
    assert fit.condition_number > 1e12


def test_condition_number_is_that_of_the_scaled_design():
    x = np.array([-1.0, -0.5, 0.0, 0.5, 1.0])
    fit, _ = _fit(x, x, 2)
    assert fit.condition_number == pytest.approx(np.linalg.cond(np.polynomial.chebyshev.chebvander(x, 2)), rel=1e-12)


@pytest.mark.parametrize("seed", range(4))
def test_row_order_does_not_matter(seed):
    rng = np.random.default_rng(seed)
    x = np.repeat(np.linspace(0, 9, 10), 2)
    y = np.sin(x) + rng.normal(0, 0.1, 20)
    order = rng.permutation(20)
    first, second = _fit(x, y, 3)[0], _fit(x[order], y[order], 3)[0]
    np.testing.assert_allclose(first.coefficients, second.coefficients, rtol=1e-11)
    np.testing.assert_allclose(first.residual[order], second.residual, atol=1e-14)


def test_blocks_longer_than_the_number_of_parameters():
    """The closed form agrees with a refit for blocks shorter and longer than the parameters."""
    rng = np.random.default_rng(0)
    x = np.linspace(0, 1, 30)
    y = x + rng.normal(0, 0.1, 30)
    family = make_family("polynomial", x, [1, 2], ())
    problem = family.problem(x, y, np.ones(30))
    for length in (1, 2, 3, 4, 12):
        rows = np.arange(9, 9 + length)
        kept = np.delete(np.arange(30), rows)
        expected = y[rows] - np.polyval(np.polyfit(x[kept], y[kept], 2), x[rows])
        (held,) = problem.held_out([rows])
        assert held.shape == (len(family.members), length)  # of the block, and of nothing else
        np.testing.assert_allclose(held[1], expected, rtol=1e-9)


def test_leaving_everything_out_fails():
    x = np.linspace(0, 1, 6)
    (held,) = make_family("polynomial", x, [1], ()).problem(x, x, np.ones(6)).held_out([np.arange(6)])
    assert held.size == 6 * held.shape[0] > 0
    assert np.isnan(held).all()


def test_a_draw_without_enough_levels_gives_no_number():
    """Copies of two levels do not determine a quadratic, and no huge coefficient is made up."""
    x = np.repeat([0.0, 1.0, 2.0, 3.0], 2)
    family = make_family("polynomial", x, [1, 2], ())
    problem = family.problem(x, x**2, np.ones(8))
    counts = np.array([[2, 1, 0, 0, 0, 0, 3, 2]])
    residual = problem.refit(counts)
    assert residual.shape == (len(family.members), 8, 1)
    line, bowed = (next(k for k, member in enumerate(family.members) if member.order == degree) for degree in (1, 2))
    assert np.isfinite(residual[line]).all()
    assert np.isnan(residual[bowed]).all()


def test_a_limit_withholds_larger_members_of_a_block_and_of_a_draw():
    """The caller knows how many levels are left; what scatters within them must not be taken for more."""
    rng = np.random.default_rng(5)
    x = np.repeat(np.arange(6.0), 3) + rng.normal(0, 0.01, 18)
    family = make_family("polynomial", x, [0, 1, 2, 3], ())
    problem = family.problem(x, np.cos(x), np.ones(18))
    sizes = np.array([member.parameters for member in family.members])
    blocks, limits = [np.arange(3), np.arange(12, 18), np.arange(3, 6)], np.array([5, 2, 3])
    free = problem.held_out(blocks)
    for number, part in enumerate(problem.held_out(blocks, limits)):
        assert np.isnan(part).all(axis=1).tolist() == (sizes > limits[number]).tolist()
        assert np.array_equal(part[sizes <= limits[number]], free[number][sizes <= limits[number]])
    counts = rng.multinomial(18, np.full(18, 1 / 18), size=4)
    limits = np.array([1, 9, 2, 3])
    free, limited = problem.refit(counts), problem.refit(counts, limits)
    assert np.isfinite(free[sizes <= 4]).all()
    for draw, limit in enumerate(limits):
        assert np.isnan(limited[:, :, draw]).all(axis=1).tolist() == (sizes > limit).tolist()
        assert np.array_equal(limited[sizes <= limit, :, draw], free[sizes <= limit, :, draw])


def test_members_that_the_data_do_not_determine_have_no_number_anywhere():
    """Three levels: no cubic, whether left out, refitted or resampled."""
    x = np.repeat([0.0, 1.0, 2.0], 4)
    problem = make_family("polynomial", x, [1, 3], ()).problem(x, x**3, np.ones(12))
    sizes = np.array(problem.sizes)
    counts = np.ones((2, 12), dtype=int)
    blocks = [np.array([0]), np.array([4, 5]), np.array([1, 2, 3, 6, 7, 8, 9, 10, 11])]
    for part in problem.held_out(blocks[:2]):
        assert np.isnan(part).all(axis=1).tolist() == (sizes > 3).tolist()
    assert np.isnan(problem.refit(counts)).all(axis=(1, 2)).tolist() == (sizes > 3).tolist()
    held = problem.resampled_held_out(counts, blocks)
    assert np.isnan(held[sizes > 3]).all()
    assert np.isfinite(held[sizes <= 2][:, [0, 4, 5]]).all()
