"""The lower tail of the von Neumann ratio of residuals: printed bounds, and a simulation."""

import numpy as np
import pytest
from scipy import stats

from fitlib.numerics.components import level_space
from fitlib.numerics.diagnostics import serial_correlation


def _modes(count: int) -> np.ndarray:
    """Eigenvectors of the sum of squared differences, ascending (Durbin & Watson 1950): cosines."""
    grid = np.pi * (np.arange(count) + 0.5) / count
    return np.stack([np.cos(k * grid) / np.linalg.norm(np.cos(k * grid)) for k in range(count)], axis=1)


def _residual_with_ratio(basis: np.ndarray, ratio: float) -> np.ndarray:
    """Some residual that the basis cannot describe and whose von Neumann ratio is as wanted."""
    count = basis.shape[0]
    difference = np.diff(np.eye(count), axis=0)
    free = np.linalg.svd(np.eye(count) - basis @ basis.T)[0][:, : count - basis.shape[1]]
    values, vectors = np.linalg.eigh(free.T @ difference.T @ difference @ free)
    share = (ratio - values[0]) / (values[-1] - values[0])
    return free @ (np.sqrt(1 - share) * vectors[:, 0] + np.sqrt(share) * vectors[:, -1])


def _rows(case):
    return case("durbin_watson_bounds")["data"]["rows"]


def test_printed_bounds(case):
    """Savin & White 1977, one regressor and a constant: at each bound the tail is the probability it is printed for.

    The lower bound belongs to a design that takes away the fastest oscillation, the upper one to a design that takes
    away the slowest.
    """
    rows = _rows(case)
    assert len(rows) == 10
    for count, probability, lower, upper in rows:
        modes = _modes(count)
        for text, taken in ((lower, -1), (upper, 1)):
            basis = modes[:, [0, taken]]
            steps = [-0.0006, 0.0006]
            below, above = (
                serial_correlation(_residual_with_ratio(basis, float(text) + step), basis).p for step in steps
            )
            assert below < probability < above
            # A bound changed by two units of its last place is found out
            changed = serial_correlation(_residual_with_ratio(basis, float(text) + 0.002), basis).p
            assert not changed < probability


@pytest.mark.parametrize("levels, degree", [(7, 1), (11, 2), (20, 3)])
def test_against_a_simulation(levels, degree):
    """The tail at several ratios lies within binomial limits of a seeded simulation of independent deviations."""
    x = np.linspace(-1, 1, levels)
    basis, _ = level_space(np.vander(x, degree + 1), np.ones(levels), np.arange(levels))
    draws = 200_000
    noise = np.random.default_rng(levels).normal(size=(draws, levels))
    residual = noise - noise @ basis @ basis.T
    simulated = np.sum(np.diff(residual, axis=1) ** 2, axis=1) / np.sum(residual**2, axis=1)
    for probability in (0.002, 0.01, 0.05, 0.5, 0.95):
        ratio = np.quantile(simulated, probability)
        found = serial_correlation(_residual_with_ratio(basis, ratio), basis)
        assert abs(found.ratio - ratio) < 1e-9
        low, high = stats.binom.interval(1 - 1e-6, draws, found.p)
        assert low <= draws * probability <= high
        disturbed = 1.4 * found.p if found.p < 0.9 else 1 - 1.4 * (1 - found.p)
        low, high = stats.binom.interval(1 - 1e-6, draws, disturbed)
        assert not low <= draws * probability <= high


def test_alternating_residuals_are_no_sign():
    basis = _modes(11)[:, :2]
    assert serial_correlation(_modes(11)[:, 10], basis).p > 0.999


def test_slow_residuals_are_a_sign():
    basis = _modes(11)[:, :2]
    assert serial_correlation(_modes(11)[:, 2], basis).p < 1e-6


def test_many_levels_use_the_normal_limit(within):
    """von Neumann 1941: mean 2 and variance 4/L; a ratio of 2 is the middle."""
    basis = np.linalg.qr(np.vander(np.linspace(-1, 1, 400), 2))[0]
    within(serial_correlation(_residual_with_ratio(basis, 2.0), basis).p, 0.5, 1e-9)
    within(serial_correlation(_residual_with_ratio(basis, 2 - 1.959964 * 0.1), basis).p, 0.025, 1e-6)
