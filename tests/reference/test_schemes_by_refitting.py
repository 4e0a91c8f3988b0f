"""Every scheme against plain refits: numpy's least squares, scikit-learn with the same folds, 50-digit arithmetic."""

import mpmath
import numpy as np
import pytest
from sklearn.linear_model import LinearRegression
from sklearn.metrics import make_scorer
from sklearn.model_selection import PredefinedSplit, cross_val_score

from fitlib.analysis.streams import draw_counts, permutations
from fitlib.numerics.bootstrap import bootstrap_errors
from fitlib.numerics.families import make_family
from fitlib.numerics.validation import scheme_errors, shuffled_folds, summarise, unit_folds

LEVELS, SERIES, READINGS = 9, 3, 2
DEGREES = [0, 1, 2, 3, 4]


class Data:
    """An invented load cell: levels with deviations of their own, uneven numbers of readings, two weightings."""

    def __init__(self, weighted: bool):
        rng = np.random.default_rng(11)
        level = np.repeat(np.arange(LEVELS), SERIES * READINGS)
        series = np.tile(np.repeat(np.arange(SERIES), READINGS), LEVELS)
        keep = rng.permutation(np.delete(np.arange(level.size), [3, 17, 18, 40]))
        self.level, self.series = level[keep], series[keep]
        self.x = np.linspace(1.0, 50.0, LEVELS)[self.level]
        self.y = 0.3 + 0.04 * self.x + 1e-5 * self.x**2 + rng.normal(0, 3e-4, LEVELS)[self.level]
        self.y += rng.normal(0, 1e-4, self.x.size)
        self.n = self.x.size
        self.root = 1 / self.x if weighted else np.ones(self.n)
        self.family = make_family("polynomial", self.x, DEGREES, ())
        self.problem = self.family.problem(self.x, self.y, self.root)
        self.parameters = [member.parameters for member in self.family.members]
        self.u = (self.x - self.x.mean()) / np.ptp(self.x)

    def predict(self, size: int, weights: np.ndarray) -> np.ndarray:
        """Values at all observations of a fit with some weights (0: left out)."""
        rows = weights > 0
        design = np.polynomial.legendre.legvander(2 * self.u, size - 1)
        root = np.sqrt(weights[rows])
        return design @ np.linalg.lstsq(design[rows] * root[:, None], self.y[rows] * root, rcond=None)[0]

    def folds(self, scheme: str):
        """The tool's own folds."""
        if scheme == "k_fold":
            orders = permutations(5, ("LC-1", "k_fold"), LEVELS, 4)
            return shuffled_folds(self.level, LEVELS, 5, orders)
        units = {
            "leave_one_out": np.arange(self.n),
            "leave_one_level_out": self.level,
            "leave_one_series_out": self.series,
        }[scheme]
        return unit_folds(units, [str(k) for k in range(units.max() + 1)])


@pytest.fixture(scope="module", params=[False, True], ids=["equal weights", "relative weights"])
def data(request):
    return Data(request.param)


SCHEMES = ["leave_one_out", "leave_one_level_out", "leave_one_series_out", "k_fold"]


@pytest.mark.parametrize("scheme", SCHEMES)
def test_losses_by_refitting(scheme, data, agrees, within):
    """The closed form of a left-out block against as many refits as there are folds."""
    folds = data.folds(scheme)
    errors = scheme_errors(data.problem, data.parameters, folds, data.root, data.level)
    assert not errors.failed.any()
    loss = summarise(errors.squared, data.root, data.level, LEVELS)
    repeats = 1 + max(fold.repeat for fold in folds)
    weights = data.root**2
    for member, size in enumerate(data.parameters):
        squared, fold_loss = np.zeros(data.n), []
        for fold in folds:
            kept = weights.copy()
            kept[fold.rows] = 0
            held = (data.y - data.predict(size, kept))[fold.rows] ** 2
            squared[fold.rows] += held / repeats
            fold_loss.append(np.average(held, weights=weights[fold.rows]))
        agrees(loss.loss[member], np.average(squared, weights=weights), 9)
        # A single row can be held out nearly without residual: relative to the mean, as losses are compared
        within(errors.fold_loss[member], fold_loss, 1e-9 * np.mean(fold_loss))
        levels = [np.average(squared[data.level == k], weights=weights[data.level == k]) for k in range(LEVELS)]
        agrees(loss.levels[member], levels, 9)
        inner = (data.level > 0) & (data.level < LEVELS - 1)
        agrees(loss.interior[member], np.average(squared[inner], weights=weights[inner]), 9)


@pytest.mark.parametrize("scheme", SCHEMES)
def test_losses_by_cross_val_score(scheme, agrees):
    """scikit-learn on predefined splits, one call for each repeat; its mean over folds is weighted by their size."""
    data = Data(weighted=False)
    folds = data.folds(scheme)
    errors = scheme_errors(data.problem, data.parameters, folds, data.root, data.level)
    loss = summarise(errors.squared, data.root, data.level, LEVELS).loss
    total = make_scorer(lambda expected, predicted: float(np.sum((expected - predicted) ** 2)))
    repeats = 1 + max(fold.repeat for fold in folds)
    for member, size in enumerate(data.parameters):
        basis = np.polynomial.chebyshev.chebvander(2 * data.u, size - 1)
        squares = 0.0
        for repeat in range(repeats):
            place = np.empty(data.n, dtype=int)
            for number, fold in enumerate(fold for fold in folds if fold.repeat == repeat):
                place[fold.rows] = number
            model = LinearRegression(fit_intercept=False)
            squares += cross_val_score(model, basis, data.y, cv=PredefinedSplit(place), scoring=total).sum()
        agrees(loss[member], squares / data.n / repeats, 9)


@pytest.mark.parametrize("unit", ["level", "series", "observation"])
def test_bootstrap_losses_by_refitting(unit, data, agrees):
    """Efron & Tibshirani 1997, eq. 17: the mean over draws that left the unit out, draw by draw."""
    units = {"level": data.level, "series": data.series, "observation": np.arange(data.n)}[unit]
    counts = np.concatenate(list(draw_counts(9, ("LC-1", "bootstrap"), int(units.max()) + 1, 60)))
    outcome = bootstrap_errors(data.problem, data.parameters, [counts], units, data.level)
    for member, size in enumerate(data.parameters):
        total, number, deficient = np.zeros(data.n), np.zeros(data.n), 0
        for draw in counts[:, units]:
            if np.unique(data.level[draw > 0]).size < size:
                deficient += 1
                continue
            squared = (data.y - data.predict(size, data.root**2 * draw)) ** 2
            total += np.where(draw == 0, squared, 0.0)
            number += draw == 0
        assert outcome.rank_deficient[member] == deficient
        if deficient > 6:
            assert np.isnan(outcome.squared[member]).all()
        else:
            agrees(outcome.squared[member], total / number, 7)
    assert outcome.draws == 60
    assert outcome.left_out.tolist() == (counts == 0).sum(axis=0)[units].tolist()


def test_refits_do_not_depend_on_the_size_of_blocks(data):
    counts = np.concatenate(list(draw_counts(2, ("LC-1",), data.n, 30)))
    whole = data.problem.refit(counts)
    parts = [data.problem.refit(counts[start : start + 7]) for start in range(0, 30, 7)]
    assert len(parts) > 1
    assert np.array_equal(np.concatenate(parts, axis=2), whole)


@pytest.mark.parametrize("unit", ["level", "observation"])
def test_levels_held_out_within_resamples(unit, data, agrees):
    """Each level left out of each draw, against a refit for every draw and level."""
    units = data.level if unit == "level" else np.arange(data.n)
    counts = np.concatenate(list(draw_counts(4, ("LC-1", unit), int(units.max()) + 1, 12)))[:, units]
    blocks = [np.flatnonzero(data.level == k) for k in range(LEVELS)]
    residual = data.problem.resampled_held_out(counts, blocks)
    assert residual.shape == (len(data.parameters), data.n, 12)
    seen = 0
    for draw, found in zip(counts, residual.transpose(2, 0, 1), strict=True):
        for rows in blocks:
            kept = data.root**2 * draw
            kept[rows] = 0
            drawn = rows[draw[rows] > 0]
            for member, size in enumerate(data.parameters):
                if drawn.size and np.unique(data.level[kept > 0]).size > size:
                    expected = (data.y - data.predict(size, kept))[drawn]
                    # The residual is a difference of numbers about 1, and a draw may extrapolate: digits of the largest
                    scale = np.max(np.abs(expected))
                    assert np.all(np.abs(found[member, drawn] - expected) < 1e-6 * scale)
                    assert not np.all(np.abs(found[member, drawn] * (1 + 1e-5) - expected) < 1e-6 * scale)
                    seen += 1
    assert seen > 200


def _with_mpmath(x, y, weights, size: int, rows) -> list:
    """Held-out residuals at 50 digits from the normal equations in raw powers."""
    mpmath.mp.dps = 50
    design = mpmath.matrix([[mpmath.mpf(float(value)) ** k for k in range(size)] for value in x])
    keep = [k for k in range(len(x)) if k not in set(rows)]
    a = mpmath.matrix(size, size)
    b = mpmath.matrix(size, 1)
    for k in keep:
        for i in range(size):
            b[i] += float(weights[k]) * design[k, i] * mpmath.mpf(float(y[k]))
            for j in range(size):
                a[i, j] += float(weights[k]) * design[k, i] * design[k, j]
    solution = mpmath.lu_solve(a, b)
    return [float(mpmath.mpf(float(y[k])) - sum(design[k, i] * solution[i] for i in range(size))) for k in rows]


@pytest.mark.parametrize("gap", [1e-2, 1e-4, 1e-6])
def test_a_fold_that_nearly_determines_the_function(gap, agrees):
    """Without the last level the rest is nearly one point: extrapolation over 1/gap, checked at 50 digits.

    The largest kept-out value is about 1/gap^2 times the scatter. Each power of ten of the gap costs as many digits of
    the data, whatever the arithmetic; the closed form alone would lose all of them.
    """
    rng = np.random.default_rng(3)
    x = np.concatenate([1 + gap * np.arange(5), [2.0, 2.0]])
    y = x + rng.normal(0, 1e-3, x.size)
    level = np.array([0, 1, 2, 3, 4, 5, 5])
    family = make_family("polynomial", x, [1, 2], ())
    held = family.problem(x, y, np.ones(x.size)).held_out([np.flatnonzero(level == k) for k in range(6)])
    digits = 9 + np.log10(gap)
    for member, size in ((0, 2), (1, 3)):
        expected = _with_mpmath(x, y, np.ones(x.size), size, [5, 6])
        assert all(np.isfinite(part[member]).all() for part in held)
        agrees(held[5][member], expected, digits if size == 2 else digits + np.log10(gap) / 2)


def test_an_essential_level_fails_by_name():
    """Where the remaining levels are one point to rounding, the fold fails: no number is made up."""
    x = np.concatenate([1 + 1e-14 * np.arange(5), [2.0]])
    (held,) = make_family("polynomial", x, [1], ()).problem(x, x, np.ones(6)).held_out([np.array([5])])
    assert np.isnan(held[0, 0])


def _beside_a_dominating_level(small: float):
    """Relative weights and two readings at a small stimulus, which then carry nearly all the weight."""
    rng = np.random.default_rng(3)
    x = np.concatenate([[small, small], np.linspace(1, 2, 7)])
    y = (3 + x) * (1 + rng.normal(0, 1e-3, x.size))
    family = make_family("polynomial", x, [0, 1, 2], ())
    sizes = [member.parameters for member in family.members]
    assert sizes[:3] == [1, 2, 3]
    return x, y, family.problem(x, y, 1 / x), [np.array([0, 1]), np.arange(2, 5), np.arange(5, 9)]


@pytest.mark.parametrize("small", [1e-2, 1e-4, 1e-6, 1e-8])
def test_a_level_that_carries_the_weight_is_left_out(small, agrees):
    """What is left then has a share of `small` squared of the weight: a weak block, refitted, checked at 50 digits."""
    x, y, problem, blocks = _beside_a_dominating_level(small)
    held = problem.held_out(blocks)
    for size in (1, 2, 3):
        agrees(held[0][size - 1], _with_mpmath(x, y, x**-2.0, size, [0, 1]), 9)


@pytest.mark.parametrize("small", [1e-2, 1e-4, 1e-6, 1e-8])
def test_a_level_that_carries_the_weight_is_left_out_of_a_resample(small):
    """Six digits, as for other resamples, or no number; never a wrong one."""
    x, y, problem, blocks = _beside_a_dominating_level(small)
    counts = np.array([[1] * 9, [2, 1, 1, 0, 1, 2, 1, 0, 1]])
    residual = problem.resampled_held_out(counts, blocks)
    for draw, found in zip(counts, residual.transpose(2, 0, 1), strict=True):
        for size in (1, 2, 3):
            expected = np.array(_with_mpmath(x, y, draw * x**-2.0, size, [0, 1]))
            off = np.abs(found[size - 1, :2] - expected) > 1e-6 * np.max(np.abs(expected))
            assert not off.any(), f"{found[size - 1, :2]} is not {expected}"
            if small == 1e-2:
                assert np.isfinite(found[size - 1, :2]).all()


@pytest.mark.parametrize("small", [1e-2, 1e-4, 1e-6, 1e-8])
def test_a_draw_without_the_level_that_carries_the_weight(small, agrees):
    x, y, problem, _ = _beside_a_dominating_level(small)
    counts = np.array([[0, 0, 1, 2, 1, 1, 0, 2, 2]])
    residual = problem.refit(counts)[:, :, 0]
    for size in (1, 2, 3):
        agrees(residual[size - 1, :2], _with_mpmath(x, y, counts[0] * x**-2.0, size, [0, 1]), 9)


@pytest.mark.parametrize("gap", [1e-2, 1e-4, 1e-6])
def test_a_draw_that_nearly_determines_the_function(gap, agrees):
    """As for a fold, with the last level not drawn and copies among the others."""
    rng = np.random.default_rng(3)
    x = np.concatenate([1 + gap * np.arange(5), [2.0, 2.0]])
    y = x + rng.normal(0, 1e-3, x.size)
    problem = make_family("polynomial", x, [1, 2], ()).problem(x, y, np.ones(x.size))
    counts = np.array([[1, 2, 0, 1, 3, 0, 0]])
    residual = problem.refit(counts)[:, :, 0]
    digits = 9 + np.log10(gap)
    for member, size in ((0, 2), (1, 3)):
        if size == 3 and gap < 1e-5:
            assert np.isnan(residual[member]).all()  # no digit would be left
            continue
        expected = _with_mpmath(x, y, counts[0], size, [5, 6])
        agrees(residual[member, 5:], expected, digits if size == 2 else digits + np.log10(gap) / 2)


def test_blocks_may_overlap(data, within):
    """Blocks of different lengths that share rows: each is left out of all the others' observations as well."""
    order = np.random.default_rng(1).permutation(data.n)
    blocks = [order[:6], order[3:9], order[5:6], order[:12], order[:6], order[10:14], np.flatnonzero(data.level < 2)]
    assert sum(block.size for block in blocks) > np.unique(np.concatenate(blocks)).size
    held = data.problem.held_out(blocks)
    assert [part.shape for part in held] == [(len(data.parameters), block.size) for block in blocks]
    for block, part in zip(blocks, held, strict=True):
        kept = data.root**2
        kept[block] = 0
        for member, size in enumerate(data.parameters[:5]):
            # A row can be held out nearly without residual: digits of the largest of the block
            expected = (data.y - data.predict(size, kept))[block]
            within(part[member], expected, 1e-9 * np.max(np.abs(expected)))
    assert np.array_equal(held[0], held[4])


def test_blocks_left_out_do_not_depend_on_how_many_are_done_at_once(data, monkeypatch):
    blocks = [fold.rows for fold in data.folds("k_fold") + data.folds("leave_one_out")]
    whole = data.problem.held_out(blocks)
    monkeypatch.setattr("fitlib.numerics.least_squares.BLOCK_DOUBLES", 500)
    few = data.problem.held_out(blocks)
    for number, block in enumerate(blocks):
        (alone,) = data.problem.held_out([block])
        scale = np.max(np.abs(whole[number]))
        assert np.max(np.abs(few[number] - whole[number])) <= 1e-12 * scale
        assert np.max(np.abs(alone - whole[number])) <= 1e-12 * scale
