"""Flags and edges of the diagnostics: suspects, leverage one, no degrees of freedom, exact replicates."""

import numpy as np
import pytest
from scipy import stats

from fitlib.numerics.components import lack_of_fit, variance_components
from fitlib.numerics.diagnostics import serial_correlation, studentized_residuals, suspects
from fitlib.numerics.weighting import root_weights, spread


def test_a_planted_mistake_is_the_only_suspect():
    rng = np.random.default_rng(3)
    x = np.linspace(-1, 1, 20)
    y = x + rng.normal(0, 0.01, 20)
    y[6] += 0.2
    design = np.vander(x, 2)
    hat = design @ np.linalg.pinv(design)
    studentized = studentized_residuals(y - hat @ y, np.ones(20), np.diag(hat), 2)
    assert np.flatnonzero(suspects(studentized, 2)).tolist() == [6]


def test_suspects_use_the_bonferroni_limit():
    n, p = 15, 3
    limit = stats.t.isf(0.05 / (2 * n), n - p - 1)
    values = np.zeros(n)
    values[:4] = limit - 1e-9, limit + 1e-9, -limit - 1e-9, np.nan
    assert suspects(values, p).tolist() == [False, True, True] + [False] * 12


def test_false_alarms_are_as_rare_as_said():
    """In 2000 seeded samples without a mistake about 5 % raise a flag (Bonferroni is nearly sharp here)."""
    rng = np.random.default_rng(9)
    x = np.linspace(-1, 1, 12)
    design = np.vander(x, 2)
    hat = design @ np.linalg.pinv(design)
    alarms = 0
    for _ in range(2000):
        y = rng.normal(size=12)
        alarms += suspects(studentized_residuals(y - hat @ y, np.ones(12), np.diag(hat), 2), 2).any()
    low, high = stats.binom.interval(0.9999, 2000, 0.05)
    assert low <= alarms <= high


def test_no_studentized_residual_where_an_observation_determines_its_own_fit():
    leverage = np.array([1.0, 1 / 3, 1 / 3, 1 / 3])
    value = studentized_residuals(np.array([0.0, 1.0, -1.5, 0.5]), np.ones(4), leverage, 2)
    assert np.isnan(value).tolist() == [True, False, False, False]
    assert np.isnan(studentized_residuals(np.zeros(3), np.ones(3), np.full(3, 2 / 3), 2)).all()
    assert not suspects(np.full(3, 99.0), 2).any()


def test_no_lack_of_fit_without_replicates_or_levels_to_spare():
    assert lack_of_fit(np.array([0.1, -0.1, 0.2]), np.ones(3), np.arange(3), 1) is None
    assert lack_of_fit(np.array([0.1, -0.1, 0.2, 0.1]), np.ones(4), np.array([0, 0, 1, 1]), 2) is None


def test_replicates_that_agree_exactly_leave_no_pure_error():
    """A display of coarse resolution: any misfit is infinite against it, and is not passed off as no misfit."""
    level = np.repeat(np.arange(5), 2)
    lack = lack_of_fit(np.array([1.0, 1, -2, -2, 2, 2, -2, -2, 1, 1]), np.ones(10), level, 2)
    assert (lack.pure_error_sum_of_squares, lack.f, lack.p) == (0.0, np.inf, 0.0)
    assert (lack.numerator_df, lack.denominator_df) == (3, 5)


def test_lack_of_fit_by_hand():
    """Level means 1 and -1 about the fit with three readings each, and one level on it: 6 / 2 against 4 / 6."""
    residual = np.array([0.0, 1.0, 2.0, -2.0, -1.0, 0.0, 0.0, 0.0, 0.0])
    lack = lack_of_fit(residual, np.ones(9), np.repeat(np.arange(3), 3), 1)
    assert lack.f == pytest.approx((6 / 2) / (4 / 6), rel=1e-14)
    assert lack.p == pytest.approx(stats.f.sf(4.5, 2, 6), rel=1e-12)


def test_components_that_the_design_does_not_show_are_missing():
    design = np.vander(np.arange(4.0), 2)
    rows = np.arange(4)
    parts = variance_components(np.array([0.1, -0.1, -0.1, 0.1]), design, np.ones(4), rows, np.zeros(4, dtype=int))
    assert np.isnan([parts.repeatability, parts.series_deviation, parts.pure_error, parts.level_deviation]).all()


def test_one_reading_per_level_and_series_shows_no_repeatability():
    level, series = np.repeat(np.arange(5), 3), np.tile(np.arange(3), 5)
    rng = np.random.default_rng(1)
    design = np.vander(level.astype(float), 2)
    parts = variance_components(rng.normal(size=15), design, np.ones(15), level, series)
    assert np.isnan(parts.repeatability)
    assert parts.pure_error > 0


def test_a_level_deviation_is_never_negative():
    """Level means closer to the line than their scatter allows: zero, not the root of a negative number."""
    level = np.repeat(np.arange(5), 2)
    residual = np.tile([1.0, -1.0], 5)
    parts = variance_components(
        residual, np.vander(level.astype(float), 2), np.ones(10), level, np.zeros(10, dtype=int)
    )
    assert parts.level_deviation == 0.0
    assert parts.pure_error == pytest.approx(np.sqrt(2), rel=1e-14)


def test_no_serial_correlation_without_freedom_or_residuals():
    basis = np.linalg.qr(np.vander(np.arange(4.0), 3))[0]
    assert serial_correlation(np.ones(4), basis) is None
    assert serial_correlation(np.zeros(4), basis[:, :1]) is None


def test_weights_of_a_stimulus():
    x = np.array([1.0, 4.0])
    assert spread("none", x).tolist() == [1.0, 1.0]
    assert spread("inverse_stimulus", x).tolist() == [1.0, 2.0]
    assert spread("inverse_stimulus_squared", x).tolist() == [1.0, 4.0]
    np.testing.assert_allclose(root_weights("inverse_stimulus", x) ** 2, [1.6, 0.4], rtol=1e-14)
    with pytest.raises(KeyError):
        spread("per_point", x)
