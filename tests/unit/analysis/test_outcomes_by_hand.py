"""Numbers of whole steps against the same numbers written out with numpy."""

import numpy as np
import pytest


def _by_name(result):
    return {item["candidate"]: item for item in result["candidates"]}


def test_the_outer_loss_is_the_selection_repeated(made):
    """Without one level at a time: choose anew by hand through the very steps, and judge by that level."""
    x, y, run = made.load_cell(np.random.default_rng(9), levels=8, readings=2, deviation=5e-3)
    study = made.study((made.family([1, 2, 3]),), degrees_of_freedom=2, rule="smallest_loss")
    result = made.run(study, made.observations(x, y, run))
    eligible = {item["candidate"] for item in result["candidates"] if item["eligible"]}
    squares, taken = [], set()
    for level in np.unique(x):
        keep = x != level
        inner = made.run(study, made.observations(x[keep], y[keep], run[keep]))
        assert {item["candidate"] for item in inner["candidates"] if item["eligible"]} == eligible
        degree = int(inner["selection"]["candidate"].split("-")[1])
        taken.add(degree)
        fit = np.polynomial.Polynomial.fit(x[keep], y[keep], degree)
        squares.append(np.mean((y[~keep] - fit(level)) ** 2))
    assert len(taken) > 1  # else the test could not tell a choice made anew from the first one
    assert result["selection"]["outer_loss"] == pytest.approx(np.mean(squares), rel=1e-9)
    assert result["selection"]["outer_loss_interior"] == pytest.approx(np.mean(squares[1:-1]), rel=1e-9)


def test_inverse_stimulus_weights_reach_losses_and_covariance(made):
    rng = np.random.default_rng(6)
    x = np.repeat([1.0, 3, 10, 30, 100, 300, 1000, 3000], 4)
    y = 2 * x * (1 + 0.05 * rng.normal(size=x.size))
    rows = made.observations(x, y, np.tile([1, 2, 3, 4], 8))
    results = {
        weighting: made.run(made.study((made.family([1, 2]),), weighting=weighting), rows)
        for weighting in ("none", "inverse_stimulus", "inverse_stimulus_squared")
    }
    for weighting, power in (("none", 0), ("inverse_stimulus", 1), ("inverse_stimulus_squared", 2)):
        weights = x**-power
        squares = np.zeros(x.size)
        for level in np.unique(x):
            keep = x != level
            fit = np.polynomial.Polynomial.fit(x[keep], y[keep], 1, w=np.sqrt(weights[keep]))
            squares[~keep] = (y[~keep] - fit(x[~keep])) ** 2
        loss = _by_name(results[weighting])["polynomial-1"]["losses"]["leave_one_level_out"]["loss"]
        assert loss == pytest.approx(np.average(squares, weights=weights), rel=1e-8)
    widths = [
        np.subtract(*(np.array(results["inverse_stimulus_squared"]["curves"]["prediction_interval"][k]) for k in names))
        for names in (("upper", "lower"),)
    ][0]
    assert widths[-1] > 100 * widths[0]  # a constant relative standard deviation over more than three decades


def _variances(x, y, degree, level, run):
    """Moments by hand for balanced data: scatter within levels, without series, and about the curve of level means."""
    levels, series = np.unique(level).size, np.unique(run).size
    count, n = x.size // levels, x.size
    means = np.array([y[level == k].mean() for k in np.unique(level)])
    pure = sum(np.sum((y[level == k] - y[level == k].mean()) ** 2) for k in np.unique(level))
    offsets = np.array([y[run == k].mean() for k in np.unique(run)])
    of_series = n / series * offsets.var(ddof=1)
    rest = (pure - (series - 1) * of_series) / (n - levels - series + 1)
    fit = np.polynomial.Polynomial.fit(np.unique(x), means, degree)
    about = count * np.sum((means - fit(np.unique(x))) ** 2) / (levels - degree - 1)
    return pure / (n - levels), rest, max(0.0, of_series - rest) / (n / series), about, count


@pytest.mark.parametrize("offset", [0.0, 5e-4])
def test_what_the_issued_function_says_of_new_readings(made, offset):
    """Variance of one reading, and of the mean response, from the moments of balanced data written out."""
    rng = np.random.default_rng(14)
    x, y, run = made.load_cell(rng)
    y = y + rng.normal(0, offset, 3)[run - 1]
    rows = made.observations(x, y, run)
    result = made.run(made.study((made.family([2]),)), rows)
    pure, rest, of_series, about, count = _variances(x, y, 2, x, run)
    components = result["selection"]["components"]
    assert components["level_deviation_found"]
    assert components["series_deviation_found"] == (offset > 0)
    within = rest if offset else pure
    of_level = (about - within) / count
    total = within + of_level + (of_series if offset else 0.0)
    function = result["function"]
    single = function["reading_standard_deviation"] ** 2 + function["level_standard_deviation"] ** 2
    assert single == pytest.approx(total, rel=1e-9)
    # The mean response at the centre: level means scatter by `about / count`; a series offset only by a third of it
    basis = np.polynomial.chebyshev.chebvander(np.linspace(-1, 1, 11), 2)
    centre = np.array([1.0, 0.0, -1.0])
    variance = about / count * centre @ np.linalg.inv(basis.T @ basis) @ centre + (of_series / 3 if offset else 0.0)
    assert centre @ np.array(function["covariance"]) @ centre == pytest.approx(variance, rel=1e-9)


def test_share_of_resamples_by_hand(made):
    """Every draw of levels: leave each drawn level out, refit with copies counted, take the smallest loss.

    The stimulus scatters within its levels, so that a curve through two levels alone could be had, and must not be.
    """
    from fitlib.analysis.streams import draw_counts

    rng = np.random.default_rng(3)
    level = np.repeat(np.arange(6), 3)
    x = 10.0 * level + rng.normal(0, 0.05, 18)
    y = 0.04 * x + 2e-5 * x**2 + rng.normal(0, 0.004, 6)[level] + rng.normal(0, 0.002, 18)
    study = made.study(
        (made.family([1, 2, 3]),),
        validation=("leave_one_level_out", made.scheme("bootstrap", draws=200)),
        rule="smallest_loss",
        seed=12,
        degrees_of_freedom=2,
    )
    result = made.run(study, made.observations(x, y, np.tile([1, 2, 3], 6), level=10.0 * level))
    assert all(item["eligible"] for item in result["candidates"])
    taken = {1: 0, 2: 0, 3: 0, None: 0}
    for draw in np.concatenate(list(draw_counts(12, ("LC-1", "bootstrap"), 6, 200))):
        weights, drawn = draw[level], np.flatnonzero(draw)
        losses = {}
        for degree in (1, 2, 3):
            if degree + 1 >= drawn.size:
                continue
            squares = 0.0
            for k in drawn:
                keep = (level != k) & (weights > 0)
                fit = np.polynomial.Polynomial.fit(x[keep], y[keep], degree, w=np.sqrt(weights[keep]))
                squares += np.sum(weights[level == k] * (y[level == k] - fit(x[level == k])) ** 2)
            losses[degree] = squares
        taken[min(losses, key=losses.get) if losses else None] += 1
    assert min(taken[1], taken[2], taken[None]) > 1
    shares = {item["degree"]: item["bootstrap_share"] for item in result["candidates"]}
    assert shares == {degree: taken[degree] / 200 for degree in (1, 2, 3)}
    assert result["selection"]["draws_without_choice"] == taken[None]
