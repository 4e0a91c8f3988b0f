"""Covariance, bands and converted readings against published examples and statsmodels; variance components."""

import numpy as np
import pandas as pd
import pytest
import statsmodels.api as sm
from scipy import stats
from statsmodels.formula.api import ols

from fitlib.numerics.components import level_residuals, series_effect, variance_components
from fitlib.numerics.uncertainty import (
    coefficient_covariance,
    confidence_band,
    effective_degrees_of_freedom,
    mean_standard_uncertainty,
    prediction_interval,
    reading_uncertainty,
)


def test_readings_converted_by_a_line(case, published, fit_polynomial, agrees, agrees_as_printed):
    """Miller & Miller, examples 5.6.1 and 5.6.2: fluorescence of fluorescein, one reading and the mean of four."""
    name = "miller_fluorescence"
    data = case(name)
    result = fit_polynomial(data["data"]["x_pg_per_ml"], data["data"]["y"], 1)
    agrees_as_printed(result.power.coefficients[1], published(name, "b"))
    agrees_as_printed(result.power.coefficients[0], published(name, "a"))
    for reading in ("2.9", "13.5", "23.0"):
        x = (float(reading) - result.power.coefficients[0]) / result.power.coefficients[1]
        u = reading_uncertainty(result.curve, result.covariance, x, result.deviation, 0.0, 1)
        text = published(name, f"s_x0 at {reading}")
        agrees_as_printed(u, text)
        half = stats.t.isf(0.025, 5) * u
        agrees(half, data["reference_values_computed_here"]["halfwidth95"][reading], 9)
    four = reading_uncertainty(result.curve, result.covariance, 6.20721554116559, result.deviation, 0.0, 4)
    agrees(four, data["reference_values_computed_here"]["sx0_13p5_m4"], 9)


def test_linewidth_read_back(case, fit_polynomial, agrees):
    """e-Handbook 2.3.6.7.3: standard deviation by propagation of one converted reading over the range."""
    data = case("nist_mpc3673_linewidth")
    result = fit_polynomial(data["data"]["x"], data["data"]["y"], 1)
    expected = data["reference_values_computed_here"]["u_X_at_Y"]
    assert len(expected) == 8
    for reading, value in expected.items():
        x = (float(reading) - result.power.coefficients[0]) / result.power.coefficients[1]
        agrees(reading_uncertainty(result.curve, result.covariance, x, result.deviation, 0.0, 1), value, 9)


def test_a_level_deviation_is_not_divided_by_readings(fit_polynomial, within):
    """JCGM 100:2008, eq. 13: only the repeatability is averaged."""
    x = np.linspace(0, 10, 11)
    curve = fit_polynomial(x, 2 * x, 1).curve
    u = reading_uncertainty(curve, np.zeros((2, 2)), 5.0, 0.3, 0.4, 9)
    within(u, np.sqrt(0.3**2 / 9 + 0.4**2) / 2, 1e-12)


@pytest.mark.parametrize("degree", [1, 2, 3])
@pytest.mark.parametrize("probability", [0.9, 0.95])
def test_band_and_interval(degree, probability, fit_polynomial, agrees):
    """statsmodels keeps the mean response and a new observation apart; so do the two functions here."""
    rng = np.random.default_rng(31)
    x = np.linspace(0, 20, 23)
    y = 1 + 0.2 * x - 0.01 * x**2 + rng.normal(0, 0.05, 23)
    result = fit_polynomial(x, y, degree)
    grid = np.linspace(0, 20, 9)
    fit = sm.OLS(y, np.vander(x, degree + 1)).fit()
    frame = fit.get_prediction(np.vander(grid, degree + 1)).summary_frame(alpha=1 - probability)
    free = 23 - degree - 1
    band = confidence_band(result.curve, result.covariance, free, grid, probability)
    variance = np.full(grid.size, result.deviation**2)
    interval = prediction_interval(result.curve, result.covariance, free, grid, variance, probability)
    agrees(np.concatenate([band.lower, band.upper]), [*frame["mean_ci_lower"], *frame["mean_ci_upper"]], 8)
    agrees(np.concatenate([interval.lower, interval.upper]), [*frame["obs_ci_lower"], *frame["obs_ci_upper"]], 8)
    agrees(mean_standard_uncertainty(result.curve, result.covariance, grid), frame["mean_se"], 8)


def _balanced(offset, levels=9, series=4, readings=3, seed=12):
    """A line with a level deviation, an offset of each series over all levels, and repeatability."""
    rng = np.random.default_rng(seed)
    level = np.repeat(np.arange(levels), series * readings)
    run = np.tile(np.repeat(np.arange(series), readings), levels)
    x = np.linspace(0, 8, levels)[level]
    y = 1 + 0.5 * x + rng.normal(0, 0.05, levels)[level] + rng.normal(0, offset, series)[run]
    return x, y + rng.normal(0, 0.01, x.size), level, run


@pytest.mark.parametrize("offset, found", [(0.03, True), (0.0, False)])
def test_components_by_the_classical_analysis(offset, found, fit_polynomial, agrees):
    """Balanced data: mean squares of levels, series, cells and the rest, from plain group means."""
    x, y, level, run = _balanced(offset)
    result = fit_polynomial(x, y, 1)
    parts = variance_components(result.fit.residual, result.design, np.ones(x.size), level, run)
    cells = y.reshape(9, 4, 3)
    pure = cells.reshape(9, 12).var(axis=1, ddof=1).mean()
    of_series = 27 * cells.mean(axis=(0, 2)).var(ddof=1)
    rest = (99 * pure - 3 * of_series) / 96
    means = cells.mean(axis=(1, 2))
    coefficients = np.polyfit(np.linspace(0, 8, 9), means, 1)
    about_line = 12 * np.sum((means - np.polyval(coefficients, np.linspace(0, 8, 9))) ** 2) / 7
    agrees(parts.repeatability, np.sqrt(cells.var(axis=2, ddof=1).mean()), 9)
    agrees(parts.pure_error, np.sqrt(pure), 9)
    agrees(parts.series_deviation, np.sqrt(max(0.0, of_series - rest) / 27), 9)
    agrees(parts.level_deviation, np.sqrt((about_line - (rest if found else pure)) / 12), 9)
    effect = series_effect(result.fit.residual, np.ones(x.size), level, run)
    assert (effect.p < 0.05) == found


@pytest.mark.parametrize("offset", [0.0, 0.03])
def test_whole_series_by_a_two_way_analysis_of_variance(offset, fit_polynomial, agrees):
    """statsmodels: the main effect of series beside levels, both as categories."""
    x, y, level, run = _balanced(offset, seed=5)
    effect = series_effect(fit_polynomial(x, y, 2).fit.residual, np.ones(x.size), level, run)
    table = sm.stats.anova_lm(ols("y ~ C(level) + C(run)", pd.DataFrame({"y": y, "level": level, "run": run})).fit())
    agrees([effect.f, effect.p], table.loc["C(run)", ["F", "PR(>F)"]], 8)
    agrees(effect.rest_variance, table.loc["Residual", "mean_sq"], 9)
    assert (effect.numerator_df, effect.denominator_df) == tuple(table["df"].iloc[1:])


def test_level_deviation_by_a_mixed_model(fit_polynomial, agrees):
    """statsmodels MixedLM by restricted maximum likelihood, which equals the moments on balanced data."""
    x, y, level, run = _balanced(0.0)
    result = fit_polynomial(x, y, 2)
    parts = variance_components(result.fit.residual, result.design, np.ones(x.size), level, run)
    frame = pd.DataFrame({"y": 100 * y, "x": x, "level": level})
    model = sm.MixedLM.from_formula("y ~ x + I(x**2)", groups="level", data=frame).fit(reml=True, gtol=1e-10)
    agrees(parts.pure_error, np.sqrt(model.scale) / 100, 4)
    agrees(parts.level_deviation, np.sqrt(float(model.cov_re.iloc[0, 0])) / 100, 4)
    # Coefficients of balanced data are those of least squares, their standard uncertainty that of the mixed model
    covariance = coefficient_covariance(
        result.design,
        np.ones(x.size),
        result.fit.inverse_normal,
        level,
        parts.pure_error**2,
        parts.level_deviation**2,
    )
    grid = np.array([0.0, 3.0, 8.0])
    terms = np.column_stack([np.ones(3), grid, grid**2])
    fixed = model.cov_params().iloc[:3, :3].to_numpy()
    expected = np.sqrt(np.einsum("ij,jk,ik->i", terms, fixed, terms)) / 100
    agrees(mean_standard_uncertainty(result.curve, covariance, grid), expected, 4)


def test_covariance_of_balanced_data_is_that_of_level_means(fit_polynomial, agrees):
    """With moments of the same model: a plain fit of the level means and its own residual variance."""
    x, y, level, run = _balanced(0.0)
    result = fit_polynomial(x, y, 2)
    parts = variance_components(result.fit.residual, result.design, np.ones(x.size), level, run)
    assert parts.level_deviation > 0
    covariance = coefficient_covariance(
        result.design, np.ones(x.size), result.fit.inverse_normal, level, parts.pure_error**2, parts.level_deviation**2
    )
    means = np.bincount(level, y) / 12
    of_means = fit_polynomial(np.linspace(0, 8, 9), means, 2)
    agrees(of_means.fit.coefficients, result.fit.coefficients, 9)
    agrees(covariance, of_means.covariance, 8)


@pytest.mark.parametrize("weighting", [0.0, 0.5, 1.0])
def test_covariance_by_the_general_formula(weighting, fit_polynomial, agrees):
    """Uneven data with weights against (X'WX)^-1 X'W V W X (X'WX)^-1 written out; deviations grow like the scatter."""
    rng = np.random.default_rng(2)
    level = np.repeat(np.arange(7), [1, 4, 2, 3, 5, 1, 2])
    x = np.linspace(1, 8, 7)[level] + rng.normal(0, 1e-3, level.size)
    root = x**-weighting
    result = fit_polynomial(x, x + rng.normal(0, 0.1, x.size), 2, root_weights=root)
    run = rng.integers(0, 3, level.size)
    common = (result.design, root, result.fit.inverse_normal, level, 0.3, 0.7)
    same, series = (index[:, None] == index[None, :] for index in (level, run))
    half = np.linalg.inv(result.design.T @ np.diag(root**2) @ result.design) @ result.design.T @ np.diag(root**2)
    for further, spread in (((), 0.7 * same), ((run, 0.2), 0.7 * same + 0.2 * series)):
        whole = np.diag(0.3 / root**2) + spread / np.outer(root, root)
        agrees(coefficient_covariance(*common, *further), half @ whole @ half.T, 7)


def test_effective_degrees_of_freedom(agrees):
    """JCGM 100:2008, eq. G.2b; its example in G.4.1: 0.25, 0.57, 0.82 % with 9, 4, 14 (from memory, high): 19.0."""
    agrees(effective_degrees_of_freedom([0.25**2, 0.57**2, 0.82**2], [9, 4, 14]), 19.0, 2.3)
    agrees(effective_degrees_of_freedom([3.0], [7]), 7.0, 12)


@pytest.mark.parametrize("power", [0.0, 1.0])
def test_level_deviation_has_the_right_expectation(power):
    """Uneven data: the mean of many seeded estimates of the variance is the variance put in, within its own error.

    With weights all deviations grow like the scatter that the weights declare.
    """
    rng = np.random.default_rng(77)
    level = np.repeat(np.arange(8), [2, 3, 1, 4, 2, 5, 1, 3])
    x = np.linspace(1, 8, 8)[level]
    root = x**-power
    design = np.vander(x, 3)
    run = np.zeros(x.size, dtype=int)
    hat = design @ np.linalg.pinv(root[:, None] * design) * root
    found = []
    for _ in range(3000):
        y = (rng.normal(0, 2.0, 8)[level] + rng.normal(0, 0.5, x.size)) / root
        found.append(variance_components(y - hat @ y, design, root, level, run).level_deviation ** 2)
    error = np.std(found) / np.sqrt(3000)
    assert abs(np.mean(found) - 4.0) < 4 * error
    assert not abs(1.2 * np.mean(found) - 4.0) < 4 * error


def test_level_residuals_are_weighted_means(agrees):
    residual, weights = level_residuals(np.array([1.0, 4.0, 7.0]), np.array([1.0, 2.0, 3.0]), np.array([0, 0, 1]))
    agrees(residual, [17 / 5, 7.0], 12)
    agrees(weights, [5.0, 9.0], 12)
