"""Lack of fit against pure error: published examples, and analysis of variance by another library."""

import numpy as np
import pandas as pd
import pytest
import statsmodels.api as sm
from scipy import stats
from statsmodels.formula.api import ols

from fitlib.numerics.components import lack_of_fit
from fitlib.numerics.evidence import Evidence
from fitlib.numerics.selection import choose, f_probability


@pytest.fixture(scope="module")
def examine(fit_polynomial):
    def run(x, y, degree: int):
        x, y = np.asarray(x, dtype=float), np.asarray(y, dtype=float)
        result = fit_polynomial(x, y, degree)
        level_index = np.unique(x, return_inverse=True)[1]
        return lack_of_fit(result.fit.residual, np.ones(x.size), level_index, degree + 1)

    return run


@pytest.fixture(scope="module")
def load_cell(case):
    data = case("nist_pmd61_pontius")["data"]
    return data["x_load"], data["y_deflection"]


def test_load_cell_line_is_rejected(load_cell, published, examine, agrees):
    """NIST/SEMATECH e-Handbook 4.6.1.5: F = 214.7464 on 18 and 20 degrees of freedom, printed in single precision."""
    lack = examine(*load_cell, 1)
    agrees(lack.f, float(published("nist_pmd61_pontius", "linear lack-of-fit F")), 5)
    assert (lack.numerator_df, lack.denominator_df) == (18, 20)
    assert lack.p < 1e-12


def test_load_cell_quadratic_is_not_rejected(load_cell, published, examine, agrees_as_printed):
    """e-Handbook 4.6.1.8 (F from memory, moderate)."""
    lack = examine(*load_cell, 2)
    agrees_as_printed(lack.f, published("nist_pmd61_pontius", "quadratic lack-of-fit F"))
    assert (lack.numerator_df, lack.denominator_df) == (17, 20)
    assert lack.p > 0.05


def test_critical_values_of_the_handbook(published, agrees_as_printed):
    """The upper 5 % points that the e-Handbook prints beside the two ratios."""
    agrees_as_printed(stats.f.isf(0.05, 18, 20), published("nist_pmd61_pontius", "F critical .05,18,20"))
    agrees_as_printed(stats.f.isf(0.05, 17, 20), published("nist_pmd61_pontius", "F critical .05,17,20"))


def test_worked_example_without_lack_of_fit(case, published, examine, agrees, agrees_as_printed):
    """Draper & Smith, Applied Regression Analysis: 24 observations, pure error 12.470 on 11 degrees of freedom."""
    data = case("draper_smith_lof")
    lack = examine(data["data"]["x"], data["data"]["y"], 1)
    agrees_as_printed(lack.pure_error_sum_of_squares, published("draper_smith_lof", "pure error SS"))
    assert lack.numerator_df == int(published("draper_smith_lof", "lof df"))
    assert lack.denominator_df == int(published("draper_smith_lof", "pure error df"))
    agrees(lack.f, data["reference_values_computed_here"]["F"], 10)


@pytest.mark.parametrize("degree", [1, 2, 3])
def test_against_an_analysis_of_variance(degree, load_cell, examine, agrees):
    """statsmodels: the polynomial against one mean per level."""
    # Two scaled loads for the same table: raw powers up to 3e6 cubed would cost the other library its digits.
    frame = pd.DataFrame({"y": load_cell[1], "x": np.array(load_cell[0]) / 1.5e6 - 1})
    terms = " + ".join(f"I(x**{k})" for k in range(1, degree + 1))
    table = sm.stats.anova_lm(ols(f"y ~ {terms}", frame).fit(), ols("y ~ C(x)", frame).fit())
    lack = examine(*load_cell, degree)
    agrees(lack.f, table["F"].iloc[1], 8)
    agrees(lack.p, table["Pr(>F)"].iloc[1], 6)
    agrees(lack.pure_error_sum_of_squares, table["ssr"].iloc[1], 8)


@pytest.mark.parametrize("degree", [1, 2])
def test_weighted_against_an_analysis_of_variance(degree, fit_polynomial, agrees):
    """statsmodels WLS, unequal numbers of replicates, standard deviation proportional to the stimulus."""
    rng = np.random.default_rng(8)
    x = np.repeat([1.0, 2.0, 4.0, 8.0, 16.0, 32.0], [3, 2, 4, 3, 1, 3])
    y = 2 * x + 0.01 * x**2 + 0.03 * x * rng.normal(size=x.size)
    root = 1 / x
    level_index = np.unique(x, return_inverse=True)[1]
    result = fit_polynomial(x, y, degree, root_weights=root)
    lack = lack_of_fit(result.fit.residual, root, level_index, degree + 1)
    smaller = sm.WLS(y, np.vander(x, degree + 1), weights=root**2).fit()
    larger = sm.WLS(y, pd.get_dummies(level_index).to_numpy(dtype=float), weights=root**2).fit()
    f, p, _ = larger.compare_f_test(smaller)
    agrees([lack.f, lack.p], [f, p], 8)


def test_linear_or_quadratic_calibration(case, published, fit_polynomial, agrees, agrees_as_printed):
    """Nitrite at ten levels, the data used with ISO 8466-1 (from memory, moderate): the test decides for the line."""
    data = case("iso8466_1_nitrite")
    x, y = np.array(data["data"]["x_mg_per_l"]), np.array(data["data"]["y"])
    fits = [fit_polynomial(x, y, degree) for degree in (1, 2)]
    agrees_as_printed(fits[0].power.coefficients[0], published("iso8466_1_nitrite", "a"))
    agrees_as_printed(fits[0].power.coefficients[1], published("iso8466_1_nitrite", "b"))
    squares = np.array([result.fit.residual_sum_of_squares for result in fits])
    evidence = Evidence(np.array([2, 3]), np.full((2, 10), np.nan), np.ones(10), squares)
    ratio = data["reference_values_computed_here"]["PG"]
    agrees(f_probability(evidence, 0, 1), stats.f.sf(ratio, 1, 7), 9)
    assert choose(evidence, "f_test", np.ones(2, dtype=bool), 0.01).chosen == 0
