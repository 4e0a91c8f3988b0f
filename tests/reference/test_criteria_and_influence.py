"""Information criteria, leverage, studentized residuals and weighted fits against statsmodels."""

import numpy as np
import pytest
import statsmodels.api as sm
from statsmodels.stats.outliers_influence import OLSInfluence

from fitlib.numerics.components import level_residuals
from fitlib.numerics.diagnostics import information_criteria, studentized_residuals
from fitlib.numerics.evidence import Evidence
from fitlib.numerics.selection import choose
from fitlib.numerics.validation import standard_error
from fitlib.numerics.weighting import root_weights


@pytest.fixture(scope="module")
def readings():
    rng = np.random.default_rng(21)
    x = np.repeat(np.linspace(1, 10, 10), 2)
    return x, 2 + 0.5 * x + 0.02 * x**2 + 0.02 * x * rng.normal(size=x.size)


def _design(x, degree: int) -> np.ndarray:
    return np.vander(x, degree + 1, increasing=True)


WEIGHTINGS = ["none", "inverse_stimulus", "inverse_stimulus_squared"]


@pytest.mark.parametrize("degree", [0, 1, 2, 3])
@pytest.mark.parametrize("weighting", WEIGHTINGS)
def test_criteria_of_single_observations(weighting, degree, readings, fit_polynomial, agrees):
    """From the log-likelihood of statsmodels, with the variance as a parameter (Burnham & Anderson 2002, eq. 2.15)."""
    x, y = readings
    root = root_weights(weighting, x)
    result = fit_polynomial(x, y, degree, root_weights=root)
    n, k = x.size, degree + 2
    likelihood = sm.WLS(y, _design(x, degree), weights=root**2).fit().llf
    criteria = information_criteria(result.fit.residual_sum_of_squares, root, degree + 1)
    agrees(criteria.aicc, -2 * likelihood + 2 * k + 2 * k * (k + 1) / (n - k - 1), 10)
    agrees(criteria.bic, -2 * likelihood + k * np.log(n), 10)


@pytest.mark.parametrize("weighting", WEIGHTINGS)
def test_weighted_fit(weighting, readings, fit_polynomial, agrees):
    """Coefficients, covariance, residual SD and leverage of statsmodels WLS."""
    x, y = readings
    root = root_weights(weighting, x)
    result = fit_polynomial(x, y, 2, root_weights=root)
    fit = sm.WLS(y, _design(x, 2), weights=root**2).fit()
    agrees(result.power.coefficients, fit.params, 10)
    agrees(result.power.standard_uncertainties, fit.bse, 10)
    agrees(result.deviation, np.sqrt(fit.scale), 10)
    agrees(result.fit.residual, fit.resid, 9)
    agrees(result.fit.leverage, OLSInfluence(sm.OLS(fit.model.wendog, fit.model.wexog).fit()).hat_matrix_diag, 10)


def test_weights_average_one_and_scale_is_free(readings, fit_polynomial, agrees):
    """Relative weights carry no absolute information: ten times the weights change nothing but their name."""
    x, y = readings
    for weighting in WEIGHTINGS:
        root = root_weights(weighting, x)
        agrees(np.mean(root**2), 1.0, 13)
        powers = {"none": 0, "inverse_stimulus": 1, "inverse_stimulus_squared": 2}
        agrees(root**2 * x ** powers[weighting] / root[0] ** 2, np.full(x.size, x[0] ** powers[weighting]), 12)
    one, ten = (fit_polynomial(x, y, 2, root_weights=factor * root) for factor in (1, 10))
    agrees(ten.power.standard_uncertainties, one.power.standard_uncertainties, 11)
    agrees(ten.fit.leverage, one.fit.leverage, 11)


@pytest.mark.parametrize("weighting", WEIGHTINGS)
def test_studentized_residuals(weighting, readings, fit_polynomial, agrees):
    """Externally studentized: each with the variance estimated without the observation."""
    x, y = readings
    root = root_weights(weighting, x)
    result = fit_polynomial(x, y, 1, root_weights=root)
    fit = sm.OLS(root * y, root[:, None] * _design(x, 1)).fit()
    actual = studentized_residuals(result.fit.residual, root, result.fit.leverage, 2)
    agrees(actual, OLSInfluence(fit).resid_studentized_external, 9)


@pytest.mark.parametrize("rule", ["aicc", "bic"])
def test_rules_work_on_level_means(rule, fit_polynomial, agrees):
    """The criterion that decides is that of a fit to the level means, weighted by the numbers of readings."""
    rng = np.random.default_rng(4)
    counts = np.array([1, 3, 2, 4, 2, 3, 1, 2, 3])
    level = np.repeat(np.arange(9), counts)
    x = np.linspace(0, 8, 9)[level]
    y = 1 + x - 0.05 * x**2 + rng.normal(0, 0.1, 9)[level] + rng.normal(0, 0.05, x.size)
    ones = np.ones(x.size)
    squares, expected = [], []
    means = np.bincount(level, y) / counts
    for degree in range(4):
        residual, weights = level_residuals(fit_polynomial(x, y, degree).fit.residual, ones, level)
        squares.append(np.sum(weights * residual**2))
        likelihood = sm.WLS(means, _design(np.arange(9.0), degree), weights=counts / counts.mean()).fit().llf
        k = degree + 2
        penalty = 2 * k + 2 * k * (k + 1) / (9 - k - 1) if rule == "aicc" else k * np.log(9)
        expected.append(-2 * likelihood + penalty)
    evidence = Evidence(np.arange(1, 5), np.full((4, 9), np.nan), counts.astype(float), np.array(squares))
    choice = choose(evidence, rule, np.ones(4, dtype=bool))
    agrees(choice.values, expected, 9)
    assert choice.chosen == int(np.argmin(expected))


def test_backward_elimination_on_level_means(agrees):
    """The F test of a larger against a smaller polynomial is that of statsmodels on level means."""
    from fitlib.numerics.selection import f_probability

    rng = np.random.default_rng(5)
    x = np.linspace(-1, 1, 10)
    y = 1 + x + 0.4 * x**2 + rng.normal(0, 0.1, 10)
    fits = [sm.OLS(y, _design(x, degree)).fit() for degree in range(5)]
    evidence = Evidence(np.arange(1, 6), np.full((5, 10), np.nan), np.ones(10), np.array([fit.ssr for fit in fits]))
    for larger in range(1, 5):
        expected = fits[larger].compare_f_test(fits[larger - 1])[1]
        agrees(f_probability(evidence, larger - 1, larger), expected, 9)
    significant = [fits[k].compare_f_test(fits[k - 1])[1] < 0.05 for k in range(1, 5)]
    assert choose(evidence, "f_test", np.ones(5, dtype=bool)).chosen == max(
        k for k in range(5) if k == 0 or significant[k - 1]
    )


def test_standard_error_of_a_loss(agrees):
    """Equal weights: the textbook standard error of a mean; unequal ones: that of a ratio, by linearisation."""
    levels = np.random.default_rng(6).gamma(1.0, size=(3, 12))
    agrees(standard_error(levels, np.full(12, 5.0)), levels.std(axis=1, ddof=1) / np.sqrt(12), 12)
    weights = np.arange(1.0, 13.0)
    mean = levels @ weights / weights.sum()
    residual = weights * (levels - mean[:, None]) / weights.mean()
    agrees(standard_error(levels, weights), np.sqrt(np.sum(residual**2, axis=1) / (12 * 11)), 12)
