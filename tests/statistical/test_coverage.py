"""Coverage of bands for a fixed candidate whose levels carry deviations, and honesty of the outer loss."""

import numpy as np
import pytest
from scipy import stats

from fitlib.numerics.components import variance_components
from fitlib.numerics.families import make_family
from fitlib.numerics.uncertainty import coefficient_covariance, confidence_band, prediction_interval

LEVELS, SERIES, READINGS = 21, 3, 3
DEVIATION, REPEATABILITY = 3e-4, 1e-4
STUDIES = 2000


def _truth(x):
    return 0.04 * x + 8e-6 * x * (50 - x)


@pytest.fixture(scope="module")
def coverage():
    """Shares of 2000 studies in which the band and the interval of a quadratic hold what they are made for."""
    rng = np.random.default_rng(20)
    force = np.linspace(0, 50, LEVELS)
    level = np.repeat(np.arange(LEVELS), SERIES * READINGS)
    series = np.tile(np.repeat(np.arange(SERIES), READINGS), LEVELS)
    x, ones = force[level], np.ones(level.size)
    family = make_family("polynomial", x, [2], ())
    member = family.members[0]
    grid = np.array([0.0, 11.0, 25.0, 50.0])
    count = {"band": np.zeros(4, dtype=int), "interval": np.zeros(4, dtype=int), "textbook": np.zeros(4, dtype=int)}
    for _ in range(STUDIES):
        y = _truth(x) + rng.normal(0, DEVIATION, LEVELS)[level] + rng.normal(0, REPEATABILITY, x.size)
        fit = family.problem(x, y, ones).fit()[0]
        curve = family.curve(member, fit.coefficients)
        design = curve.jacobian(x)
        parts = variance_components(fit.residual, design, ones, level, series)
        variances = parts.pure_error**2, parts.level_deviation**2
        covariance = coefficient_covariance(design, ones, fit.inverse_normal, level, *variances)
        band = confidence_band(curve, covariance, LEVELS - 3, grid)
        new = _truth(grid) + rng.normal(0, DEVIATION, 4) + rng.normal(0, REPEATABILITY, 4)
        interval = prediction_interval(curve, covariance, LEVELS - 3, grid, np.full(4, sum(variances)))
        plain = fit.residual_sum_of_squares / (x.size - 3) * fit.inverse_normal
        textbook = confidence_band(curve, plain, x.size - 3, grid)
        count["band"] += (band.lower <= _truth(grid)) & (_truth(grid) <= band.upper)
        count["interval"] += (interval.lower <= new) & (new <= interval.upper)
        count["textbook"] += (textbook.lower <= _truth(grid)) & (_truth(grid) <= textbook.upper)
    return count


@pytest.mark.parametrize("which", ["band", "interval"])
def test_coverage_is_between_93_and_97_percent(coverage, which):
    """At each of four stimuli; the limits allow for 2000 studies (binomial, 1 in 10 000 at each end)."""
    low = stats.binom.ppf(1e-4, STUDIES, 0.93)
    high = stats.binom.ppf(1 - 1e-4, STUDIES, 0.97)
    assert ((coverage[which] >= low) & (coverage[which] <= high)).all()
    # And not only by the width of these limits: the mean over the stimuli lies inside
    assert 0.93 < coverage[which].mean() / STUDIES < 0.97


def test_a_textbook_band_does_not_cover(coverage):
    """Every reading counted as independent: about half of the studies hold the curve."""
    assert coverage["textbook"].max() / STUDIES < 0.7


@pytest.fixture(scope="module")
def losses(made):
    study = made.study((made.family(range(0, 7)),), evaluation="direct", monotone=False)
    force = np.linspace(0, 50, 11)
    rows = []
    for seed in range(200):
        rng = np.random.default_rng([31, seed])
        x, y, run = made.load_cell(rng, shape="line")
        result = made.run_steps(study, made.observations(x, y, run))
        degree = int(result["selection"]["candidate"].split("-")[1])
        fit = np.polynomial.Polynomial.fit(x, y, degree)
        # The error of a new level: bias and variance of the curve at the levels, and the scatter of one reading
        squared = (fit(force) - 0.04 * force) ** 2 + 3e-4**2 + 1e-4**2
        selection = result["selection"]
        rows.append(
            (
                selection["outer_loss"],
                selection["outer_loss_interior"],
                selection["loss"],
                squared.mean(),
                squared[1:-1].mean(),
            )
        )
    return np.sqrt(np.mean(rows, axis=0))


class TestOuterLoss:
    """Noise around a line, seven candidates: the loss of the whole procedure against the error it really makes."""

    def test_interior_outer_error_is_within_five_percent(self, losses):
        _, interior, _, _, true_interior = losses
        assert interior == pytest.approx(true_interior, rel=0.05)

    def test_outer_error_of_all_levels_is_not_below_the_true_one(self, losses):
        outer, _, _, true_error, _ = losses
        assert outer >= true_error

    def test_the_loss_of_the_chosen_one_is_smaller_than_that_of_the_procedure(self, losses):
        outer, _, own, _, _ = losses
        assert own < outer


def test_offsets_of_whole_series_are_covered(made):
    """A run-to-run offset common to all levels does not shrink with their number; three series tell little of it.

    500 studies of three series with an offset of three times the repeatability: the band of the right curve holds the
    truth in at least 93 %, and the textbook band of the same fits in less than 70 %.
    """
    from fitlib.analysis import run_step
    from fitlib.numerics.families import restore

    study = made.study((made.family([2]),))
    grid = np.array([0.0, 25.0, 50.0])
    held, textbook = np.zeros(3, dtype=int), np.zeros(3, dtype=int)
    for seed in range(500):
        rng = np.random.default_rng([41, seed])
        x, y, run = made.load_cell(rng, deviation=0.0)
        rows = made.observations(x, y + rng.normal(0, 3e-4, 3)[run - 1], run)
        record = run_step("fits", study, study.datasets[0], rows, {})["candidates"]["polynomial-2"]
        curve, covariance = restore(record["scaled"]), np.array(record["covariance"])
        band = confidence_band(curve, covariance, record["covariance_degrees_of_freedom"], grid)
        held += (band.lower <= _truth(grid)) & (_truth(grid) <= band.upper)
        family = make_family("polynomial", x, [2], ())
        fit = family.problem(x, rows.response, np.ones(x.size)).fit()[0]
        plain = confidence_band(curve, fit.residual_sum_of_squares / 96 * fit.inverse_normal, 96, grid)
        textbook += (plain.lower <= _truth(grid)) & (_truth(grid) <= plain.upper)
    assert (held >= stats.binom.ppf(1e-4, 500, 0.95)).all()
    assert held.sum() / 1500 > 0.93
    assert (textbook < 350).all()
