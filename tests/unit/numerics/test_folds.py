"""Folds, losses per level, failed folds, bootstrap bookkeeping."""

import numpy as np
import pytest

from fitlib.numerics.bootstrap import LARGEST_FAILED_SHARE, bootstrap_errors, distinct_levels, unit_losses
from fitlib.numerics.families import make_family
from fitlib.numerics.validation import (
    level_means,
    scheme_errors,
    shuffled_folds,
    standard_error,
    summarise,
    unit_folds,
    weighted_mean,
)


def test_a_unit_is_left_out_whole_wherever_its_rows_stand():
    folds = unit_folds(np.array([2, 0, 1, 0, 2, 2]), ["a", "b", "c"])
    assert [(fold.label, fold.rows.tolist()) for fold in folds] == [("a", [1, 3]), ("b", [2]), ("c", [0, 4, 5])]


def test_shuffled_folds_hold_every_row_once_in_each_repeat():
    units = np.repeat(np.arange(11), 3)
    rng = np.random.default_rng(0)
    folds = shuffled_folds(units, 11, 4, [rng.permutation(11) for _ in range(3)])
    assert [fold.label for fold in folds[:2]] == ["repeat 1 fold 1", "repeat 1 fold 2"]
    for repeat in range(3):
        part = [fold for fold in folds if fold.repeat == repeat]
        assert len(part) == 4
        assert sorted(np.concatenate([fold.rows for fold in part]).tolist()) == list(range(33))
        assert {np.unique(units[fold.rows]).size for fold in part} == {2, 3}
        for fold in part:  # replicates of a level are never on both sides
            assert not set(units[fold.rows]) & set(np.delete(units, fold.rows))


def test_shuffled_folds_follow_the_order_given():
    folds = shuffled_folds(np.arange(4), 4, 2, [np.array([3, 1, 0, 2])])
    assert [fold.rows.tolist() for fold in folds] == [[0, 3], [1, 2]]


def _problem(x, y, degrees):
    family = make_family("polynomial", x, degrees, ())
    return family.problem(x, y, np.ones(x.size)), [member.parameters for member in family.members]


def test_a_fold_that_leaves_too_few_levels_fails_and_has_no_loss():
    """Three rows of one level and one of the other: the row that is a level of its own is essential to the line."""
    x = np.array([0.0, 0.0, 0.0, 1.0])
    level = np.array([0, 0, 0, 1])
    problem, parameters = _problem(x, np.array([0.0, 0.1, -0.1, 1.0]), [0, 1])
    errors = scheme_errors(problem, parameters, unit_folds(np.arange(4), list("abcd")), np.ones(4), level)
    line = parameters.index(2)
    assert errors.failed[line].tolist() == [False, False, False, True]
    assert np.isnan(errors.fold_loss[line]).tolist() == [False, False, False, True]
    assert np.isnan(summarise(errors.squared, np.ones(4), level, 2).loss[line])
    assert not errors.failed[parameters.index(1)].any()


def test_replicates_cannot_stand_in_for_levels():
    """Rows of slightly different stimulus count as one level: a fit over them alone would be nonsense."""
    x = np.array([0.0, 1e-4, 2e-4, 1.0])
    problem, parameters = _problem(x, x, [1])
    folds = unit_folds(np.array([0, 0, 0, 1]), ["low", "high"])
    errors = scheme_errors(problem, parameters, folds, np.ones(4), np.array([0, 0, 0, 1]))
    assert errors.failed[0].tolist() == [True, True]


def test_repeats_are_averaged_before_the_standard_error():
    x = np.linspace(0, 1, 8)
    y = np.array([0.1, -0.2, 0.3, 0.1, -0.1, 0.2, 0.0, -0.3])
    problem, parameters = _problem(x, y, [0])
    orders = [np.random.default_rng(k).permutation(8) for k in range(2)]
    both = scheme_errors(problem, parameters, shuffled_folds(np.arange(8), 8, 4, orders), np.ones(8), np.arange(8))
    single = [
        scheme_errors(problem, parameters, shuffled_folds(np.arange(8), 8, 4, [order]), np.ones(8), np.arange(8))
        for order in orders
    ]
    np.testing.assert_allclose(both.squared, (single[0].squared + single[1].squared) / 2, rtol=1e-14)
    loss = summarise(both.squared, np.ones(8), np.arange(8), 8)
    assert loss.standard_error[0] == pytest.approx(np.std(both.squared[0], ddof=1) / np.sqrt(8), rel=1e-12)


def test_loss_weighs_rows_and_the_interior_leaves_out_both_end_levels():
    squared = np.array([[1.0, 3.0, 10.0, 20.0, 5.0]])
    root = np.sqrt([1.0, 1.0, 2.0, 1.0, 4.0])
    level = np.array([0, 0, 1, 2, 3])
    loss = summarise(squared, root, level, 4)
    assert loss.levels.tolist() == [[2.0, 10.0, 20.0, 5.0]]
    assert loss.loss[0] == pytest.approx((1 + 3 + 20 + 20 + 20) / 9, rel=1e-14)
    assert loss.interior[0] == pytest.approx(40 / 3, rel=1e-14)


def test_nothing_is_averaged_over_a_missing_value():
    assert np.isnan(weighted_mean(np.array([[1.0, np.nan]]), np.ones(2))).all()
    assert np.isnan(weighted_mean(np.empty((2, 0)), np.empty(0))).all()
    assert np.isnan(level_means(np.ones((1, 1)), np.ones(1), np.array([1]), 2)[0, 0])


def test_one_level_has_no_standard_error():
    assert np.isnan(standard_error(np.array([[3.0]]), np.ones(1))).all()


def test_distinct_levels_of_draws():
    level = np.array([2, 0, 1, 0])
    rows = np.array([[1, 0, 0, 0], [0, 1, 0, 3], [1, 1, 1, 1], [0, 0, 2, 1]])
    assert distinct_levels(rows, level).tolist() == [1, 1, 3, 2]


def test_bootstrap_counts_draws_that_fail_and_withholds_the_loss():
    """Of 20 draws, 3 (over 10 %) hold two levels only: no loss for a quadratic, the line keeps its own."""
    x = np.arange(5.0)
    problem, parameters = _problem(x, x**2, [1, 2])
    good = np.tile([1, 1, 1, 1, 1], (17, 1))
    good[:, 0] = 0
    good[:, 4] = 2
    counts = np.concatenate([good, np.tile([0, 0, 3, 2, 0], (3, 1))])
    outcome = bootstrap_errors(problem, parameters, [counts], np.arange(5), np.arange(5))
    line, bowed = parameters.index(2), parameters.index(3)
    assert outcome.draws == 20
    assert outcome.rank_deficient[[line, bowed]].tolist() == [0, 3]
    assert np.isfinite(outcome.squared[line, [0, 1]]).all()
    assert np.isnan(outcome.squared[bowed]).all()
    assert outcome.left_out.tolist() == [20, 3, 0, 0, 3]
    few = bootstrap_errors(problem, parameters, [counts[:-1]], np.arange(5), np.arange(5))
    assert few.rank_deficient[bowed] == 2 > LARGEST_FAILED_SHARE * 19
    fewer = bootstrap_errors(problem, parameters, [counts[:-2]], np.arange(5), np.arange(5))
    assert fewer.rank_deficient[bowed] == 1 <= LARGEST_FAILED_SHARE * 18
    assert np.isfinite(fewer.squared[bowed, 0])


def test_an_observation_in_every_draw_has_no_bootstrap_error():
    x = np.arange(4.0)
    problem, parameters = _problem(x, x, [1])
    outcome = bootstrap_errors(problem, parameters, [np.array([[1, 1, 2, 0]])], np.arange(4), np.arange(4))
    assert np.isnan(outcome.squared[0]).tolist() == [True, True, True, False]


def test_loss_of_each_unit():
    losses = unit_losses(np.array([[1.0, 3.0, 10.0]]), np.array([1.0, 3.0, 1.0]), np.array([0, 0, 1]), 2)
    assert losses.tolist() == [[2.5, 10.0]]


def test_a_draw_of_two_scattered_levels_does_not_determine_a_quadratic():
    """The stimulus scatters within a level: six different numbers, but two levels."""
    x = np.array([0.0, 0.01, 0.02, 1.0, 1.01, 1.02, 2.0, 2.01, 2.02])
    level = np.repeat(np.arange(3), 3)
    problem, parameters = _problem(x, x**2, [1, 2])
    outcome = bootstrap_errors(problem, parameters, [np.array([[2, 1, 0]])], level, level)
    assert outcome.rank_deficient[[parameters.index(2), parameters.index(3)]].tolist() == [0, 1]


def _bootstrap_of_twelve_levels(counts):
    rng = np.random.default_rng(4)
    level = np.repeat(np.arange(12), 2)
    x = level + rng.normal(0, 0.02, 24)
    y = np.sin(x / 4) + rng.normal(0, 0.01, 24)
    problem, parameters = _problem(x, y, [1, 2, 3, 4])
    return bootstrap_errors(problem, parameters, counts, level, level)


def _assert_same_bootstrap(one, other):
    assert one.draws == other.draws
    assert np.array_equal(one.left_out, other.left_out)
    assert np.array_equal(one.rank_deficient, other.rank_deficient)
    np.testing.assert_allclose(one.squared, other.squared, rtol=1e-10, equal_nan=True)


def test_bootstrap_errors_do_not_depend_on_how_the_draws_are_cut():
    counts = np.random.default_rng(8).multinomial(12, np.full(12, 1 / 12), size=150)
    counts[5] = [6, 6] + [0] * 10  # fails for all but lines
    whole = _bootstrap_of_twelve_levels([counts])
    assert whole.rank_deficient.max() >= 1
    assert np.isfinite(whole.squared).all()
    for cuts in ([1], [7, 8, 100], range(1, 150)):
        _assert_same_bootstrap(_bootstrap_of_twelve_levels(np.split(counts, list(cuts))), whole)
    _assert_same_bootstrap(_bootstrap_of_twelve_levels(iter([counts[:60], counts[60:]])), whole)


@pytest.mark.parametrize("at_once", [1, 1000, 7777])
def test_bootstrap_errors_do_not_depend_on_how_many_residuals_are_held(at_once, monkeypatch):
    counts = np.random.default_rng(8).multinomial(12, np.full(12, 1 / 12), size=150)
    whole = _bootstrap_of_twelve_levels([counts])
    monkeypatch.setattr("fitlib.numerics.bootstrap.RESIDUALS_AT_ONCE", at_once)
    _assert_same_bootstrap(_bootstrap_of_twelve_levels([counts]), whole)
