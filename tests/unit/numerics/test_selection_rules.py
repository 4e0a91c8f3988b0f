"""Selection rules on losses made by hand."""

import numpy as np
import pytest
from scipy import stats

from fitlib.numerics.diagnostics import information_criteria
from fitlib.numerics.selection import (
    Evidence,
    ManyEvidence,
    choose,
    f_probability,
    paired_standard_error,
    take,
    take_many,
)


def _evidence(losses, parameters=None, squares=None, floor=0.0, weights=None):
    losses = np.asarray(losses, dtype=float)
    m, levels = losses.shape
    return Evidence(
        parameters=np.arange(1, m + 1) if parameters is None else np.asarray(parameters),
        level_losses=losses,
        level_weights=np.ones(levels) if weights is None else np.asarray(weights, dtype=float),
        level_squares=np.full(m, np.nan) if squares is None else np.asarray(squares, dtype=float),
        floor=floor,
    )


def _all(evidence):
    return np.ones(evidence.parameters.size, dtype=bool)


# Mean losses 10, 3, 2.5, 2.4; the standard error of the last is 0.4 (levels 1.6, 2.4, 3.2: s = 0.8, 0.8 / sqrt(3))
LOSSES = [[9, 10, 11], [2.6, 3.0, 3.4], [2.2, 2.5, 2.8], [1.6, 2.4, 3.2]]


def test_smallest_loss():
    choice = choose(_evidence(LOSSES), "smallest_loss", np.ones(4, dtype=bool))
    assert (choice.chosen, choice.smallest, choice.runner_up, choice.tied) == (3, 3, 2, ())
    np.testing.assert_allclose(choice.values, [10, 3, 2.5, 2.4], rtol=1e-14)
    assert choice.margin == pytest.approx(0.1 / 2.4, rel=1e-12)
    assert np.isnan(choice.threshold)


def test_one_standard_error_takes_the_simplest_within_reach():
    choice = choose(_evidence(LOSSES), "one_standard_error", np.ones(4, dtype=bool))
    assert choice.threshold == pytest.approx(2.4 + 0.8 / np.sqrt(3), rel=1e-12)
    assert (choice.chosen, choice.smallest) == (2, 3)
    # Without the chosen one the rule takes the last: 3.0 is beyond the threshold
    assert choice.runner_up == 3
    assert choice.margin == pytest.approx((2.4 - 2.5) / 2.5, rel=1e-12)


def test_the_standard_error_is_that_of_the_smallest_loss_not_of_the_candidate():
    """A simple candidate with a wild standard error of its own is not within reach for that."""
    losses = [[0.0, 0.0, 12.0], [1.0, 1.0, 1.0]]
    assert choose(_evidence(losses), "one_standard_error", np.ones(2, dtype=bool)).chosen == 1


def test_level_weights_count():
    losses = [[1.0, 4.0], [2.0, 2.0]]
    assert take(_evidence(losses, weights=[1, 1]), "smallest_loss", np.ones(2, dtype=bool)) == 1
    assert take(_evidence(losses, weights=[3, 1]), "smallest_loss", np.ones(2, dtype=bool)) == 0


def test_ineligible_and_failed_candidates_are_passed_over():
    losses = np.array(LOSSES)
    losses[2, 1] = np.nan
    evidence = _evidence(losses)
    eligible = np.array([True, True, True, False])
    choice = choose(evidence, "smallest_loss", eligible)
    assert (choice.chosen, choice.runner_up) == (1, 0)
    assert np.isnan(choice.values[2])
    # The threshold is of the smallest among those open to choice
    assert choose(evidence, "one_standard_error", eligible).threshold == pytest.approx(3 + 0.4 / np.sqrt(3))


@pytest.mark.parametrize("rule", ["smallest_loss", "one_standard_error", "aicc", "bic", "f_test"])
def test_none_eligible(rule):
    evidence = _evidence(LOSSES, squares=[4.0, 3.0, 2.0, 1.0])
    choice = choose(evidence, rule, np.zeros(4, dtype=bool))
    assert (choice.chosen, choice.runner_up, choice.smallest, choice.tied) == (None, None, None, ())
    assert take(evidence, rule, np.zeros(4, dtype=bool)) is None


@pytest.mark.parametrize("rule", ["smallest_loss", "one_standard_error", "aicc", "bic", "f_test"])
def test_a_single_eligible_candidate_has_no_runner_up(rule):
    evidence = _evidence(np.tile(LOSSES, 4), squares=[4.0, 3.0, 2.0, 1.0])
    choice = choose(evidence, rule, np.array([False, True, False, False]))
    assert (choice.chosen, choice.runner_up, choice.tied) == (1, None, ())
    assert np.isnan(choice.margin)


def test_equal_losses_are_a_tie_and_the_simplest_is_taken():
    losses = [[2.0, 2.0, 2.0], [2.0, 2.0, 2.0 * (1 + 1e-10)]]
    choice = choose(_evidence(losses), "smallest_loss", np.ones(2, dtype=bool))
    assert choice.tied == (1,) if choice.chosen == 0 else choice.tied == (0,)
    clear = choose(_evidence([[2.0, 2.0, 2.0], [2.0, 2.0, 2.1]]), "smallest_loss", np.ones(2, dtype=bool))
    assert (clear.chosen, clear.tied) == (0, ())


def test_a_loss_on_the_threshold_is_a_tie():
    """Which side of the threshold the simpler one falls on is rounding: both choices must be told."""
    evidence = _evidence([[0.0, 0.0, 0.0], [1.6, 2.4, 3.2]])
    threshold = 2.4 + 0.8 / np.sqrt(3)
    for shift in (-1e-12, 1e-12):
        losses = evidence.level_losses.copy()
        losses[0] = threshold * (1 + shift)
        choice = choose(_evidence(losses), "one_standard_error", np.ones(2, dtype=bool))
        assert choice.chosen == (0 if shift < 0 else 1)
        assert choice.tied == (1 - choice.chosen,)
    losses[0] = threshold * (1 - 1e-5)
    assert choose(_evidence(losses), "one_standard_error", np.ones(2, dtype=bool)).tied == ()


def test_equal_numbers_of_parameters_within_one_paired_standard_error_tie():
    """Difference of means 0.1; per level 0.3, 0.3, -0.3: its standard error is 0.2."""
    losses = np.array([[1.3, 2.3, 2.7], [1.0, 2.0, 3.0]])
    evidence = _evidence(losses, parameters=[3, 3])
    assert paired_standard_error(evidence, 0, 1) == pytest.approx(0.2, rel=1e-12)
    choice = choose(evidence, "smallest_loss", np.ones(2, dtype=bool))
    assert (choice.chosen, choice.tied) == (1, (0,))
    assert choose(_evidence(losses, parameters=[3, 4]), "smallest_loss", np.ones(2, dtype=bool)).tied == ()
    steady = np.array([[1.3, 2.3, 3.3], [1.0, 2.0, 3.0]])
    assert choose(_evidence(steady, parameters=[3, 3]), "smallest_loss", np.ones(2, dtype=bool)).tied == ()


@pytest.mark.parametrize("rule", ["smallest_loss", "one_standard_error"])
def test_losses_below_the_floor_are_equal_and_the_simplest_is_taken(rule):
    losses = [[9e-30] * 3, [1e-31] * 3, [1e-33] * 3]
    evidence = _evidence(losses, floor=1e-29)
    choice = choose(evidence, rule, _all(evidence))
    assert (choice.chosen, choice.tied) == (0, ())
    assert np.isnan(choice.margin)
    raw = _evidence(losses)
    assert choose(raw, rule, _all(raw)).chosen == 2
    above = _evidence([[2e-29] * 3, [1e-31] * 3, [1e-33] * 3], floor=1e-29)
    assert choose(above, rule, _all(above)).chosen == 1


@pytest.mark.parametrize("rule", ["aicc", "bic", "f_test"])
def test_squares_below_the_floor_are_equal_and_the_simplest_is_taken(rule):
    """Exact data: what is left is rounding, and a smaller rounding is no reason for a further term."""
    evidence = _evidence(np.full((4, 12), np.nan), squares=[5.0, 3e-29, 1e-30, 1e-33], floor=1e-29)
    assert choose(evidence, rule, _all(evidence)).chosen == 1
    assert choose(evidence, rule, _all(evidence)).tied == ()


@pytest.mark.parametrize("rule", ["aicc", "bic"])
def test_information_criteria_by_hand(rule):
    squares = np.array([50.0, 4.0, 3.5, 3.4])
    evidence = _evidence(np.full((4, 12), np.nan), squares=squares)
    n, k = 12, np.arange(1, 5) + 1
    values = n * (np.log(2 * np.pi * squares / n) + 1)
    values += 2 * k + 2 * k * (k + 1) / (n - k - 1) if rule == "aicc" else k * np.log(n)
    choice = choose(evidence, rule, _all(evidence))
    np.testing.assert_allclose(choice.values, values, rtol=1e-12)
    assert choice.chosen == choice.smallest == int(np.argmin(values)) == 1
    assert choice.runner_up == 2
    assert choice.margin == pytest.approx(values[2] - values[1], rel=1e-9)


def test_a_criterion_without_degrees_of_freedom_cannot_win():
    """AICc is infinite where n is not above K + 1."""
    assert information_criteria(1e-9, np.ones(4), 2).aicc == np.inf
    assert np.isfinite(information_criteria(1e-9, np.ones(5), 2).aicc)
    assert information_criteria(0.0, np.ones(5), 2).aicc == -np.inf


def test_backward_elimination():
    """F = (4 - 1) / (1 / 9) = 27 on 1 and 9 counts; (1 - 0.98) / (0.98 / 8) of the last term does not."""
    evidence = _evidence(np.full((4, 12), np.nan), squares=[4.2, 4.0, 1.0, 0.98])
    assert f_probability(evidence, 1, 2) == pytest.approx(stats.f.sf(27, 1, 9), rel=1e-10)
    choice = choose(evidence, "f_test", _all(evidence), 0.05)
    assert (choice.chosen, choice.runner_up) == (2, 3)
    assert choose(evidence, "f_test", _all(evidence), 1e-4).chosen == 0
    # Backward: the search stops at the first term that counts, although the next lower one does not
    assert choose(evidence, "f_test", np.array([True, True, False, False])).chosen == 0


def test_f_test_on_the_edge_is_a_tie():
    evidence = _evidence(np.full((2, 12), np.nan), squares=[4.0, 3.0])
    alpha = f_probability(evidence, 0, 1)
    choice = choose(evidence, "f_test", _all(evidence), alpha * (1 + 1e-10))
    assert (choice.chosen, choice.tied) == (1, (0,))
    assert choose(evidence, "f_test", _all(evidence), alpha * (1 + 1e-4)).tied == ()


def test_an_f_test_without_degrees_of_freedom_keeps_the_smaller():
    evidence = _evidence(np.full((3, 3), np.nan), squares=[4.0, 3.0, 0.0])
    assert f_probability(evidence, 1, 2) == 1.0
    assert choose(evidence, "f_test", _all(evidence)).chosen < 2


@pytest.mark.parametrize("rule", ["smallest_loss", "one_standard_error", "aicc", "bic", "f_test"])
def test_take_agrees_with_choose(rule):
    rng = np.random.default_rng(1)
    for _ in range(50):
        losses = rng.gamma(1.0, size=(5, 9))
        evidence = _evidence(losses, squares=np.sort(rng.gamma(1.0, size=5))[::-1])
        eligible = rng.random(5) < 0.7
        assert take(evidence, rule, eligible) == choose(evidence, rule, eligible).chosen


RULES = ["supported_gain", "one_standard_error", "smallest_loss", "aicc", "bic", "f_test"]


def _many(seed, parameters, levels=9, draws=120, floor=0.0, size=1.0):
    """Losses that fall with the parameters, levels not drawn, candidates without a value, weights that differ."""
    rng = np.random.default_rng(seed)
    m = len(parameters)
    fall = (0.4 + 3.0 ** -np.arange(m))[:, None, None] * size
    shared = 0.5 * rng.normal(size=(1, levels, draws))  # candidates go wrong at the same levels
    losses = ((shared + rng.normal(size=(m, levels, draws))) * fall) ** 2
    means = (shared + 0.5 * rng.normal(size=(m, levels, draws))) * fall
    weights = rng.poisson(1.0, size=(levels, draws)) * rng.uniform(0.5, 2.0, size=(levels, 1))
    weights[0, weights.sum(axis=0) == 0] = 1.0
    weights[:, 3] = [1.5] + [0.0] * (levels - 1)  # a single level drawn
    squares = np.einsum("mld,ld->md", means**2, weights)
    missing = rng.random((m, draws)) < 0.15
    missing[:, 5] = True  # no candidate is judged
    losses.transpose(0, 2, 1)[missing] = np.nan
    squares[missing] = np.nan
    losses[1, np.flatnonzero(weights[:, 7] > 0)[0], 7] = np.nan  # one level of one candidate
    return _with_idle_levels(ManyEvidence(np.asarray(parameters), losses, weights, squares, floor), 1e3)


def _with_idle_levels(many, value):
    """Another loss at the levels that were not drawn: it must count for nothing."""
    losses = many.level_losses.copy()
    idle = losses[:, many.level_weights == 0]
    losses[:, many.level_weights == 0] = np.where(np.isnan(idle), np.nan, value)
    return ManyEvidence(many.parameters, losses, many.level_weights, many.level_squares, many.floor)


def _draw_by_draw(many, rule, eligible, alpha=0.05):
    taken = []
    for draw in range(many.level_weights.shape[1]):
        drawn = many.level_weights[:, draw] > 0
        losses, weights = many.level_losses[:, drawn, draw], many.level_weights[drawn, draw]
        one = Evidence(many.parameters, losses, weights, many.level_squares[:, draw], many.floor)
        position = take(one, rule, eligible, alpha)
        taken.append(-1 if position is None else position)
    return taken


@pytest.mark.parametrize("rule", RULES)
@pytest.mark.parametrize("seed", range(3))
def test_many_draws_are_judged_as_one_by_one(rule, seed):
    many = _many(seed, [1, 2, 3, 4, 6])
    expected = _draw_by_draw(many, rule, np.ones(5, dtype=bool))
    assert take_many(many, rule, np.ones(5, dtype=bool)).tolist() == expected
    assert expected[5] == -1
    assert len(set(expected)) > 3
    for eligible in ([True, False, True, True, False], [False, False, True, False, False], [False] * 5):
        eligible = np.array(eligible)
        found = take_many(many, rule, eligible).tolist()
        assert found == _draw_by_draw(many, rule, eligible)
        assert set(found) <= {-1, *np.flatnonzero(eligible)}
        assert (set(found) == {-1}) == (not eligible.any())


@pytest.mark.parametrize("rule", RULES)
def test_many_draws_with_equal_and_unsorted_numbers_of_parameters(rule):
    many = _many(11, [3, 1, 2, 3, 2] if rule != "f_test" else [3, 1, 2, 5, 4])
    found = take_many(many, rule, np.ones(5, dtype=bool)).tolist()
    assert found == _draw_by_draw(many, rule, np.ones(5, dtype=bool))
    assert len(set(found)) > 3


@pytest.mark.parametrize("rule", RULES)
def test_many_draws_below_the_floor(rule):
    """Some losses below the floor and some above it; the simplest of those below is taken."""
    for size in (1e-16, 3e-15, 1e-14):
        many = _many(12, [1, 2, 3, 4, 6], floor=1e-29, size=size)
        assert take_many(many, rule, np.ones(5, dtype=bool)).tolist() == _draw_by_draw(
            many, rule, np.ones(5, dtype=bool)
        )
    tiny = ManyEvidence(np.arange(1, 6), np.full((5, 9, 2), 1e-33), np.ones((9, 2)), np.full((5, 2), 1e-32), 1e-29)
    assert take_many(tiny, rule, np.ones(5, dtype=bool)).tolist() == [0, 0]


@pytest.mark.parametrize("alpha", [1e-6, 0.01, 0.3])
def test_many_draws_follow_the_level_of_the_f_test(alpha):
    many = _many(13, [1, 2, 3, 4, 6])
    found = take_many(many, "f_test", np.ones(5, dtype=bool), alpha).tolist()
    assert found == _draw_by_draw(many, "f_test", np.ones(5, dtype=bool), alpha)
    assert found != take_many(many, "f_test", np.ones(5, dtype=bool), 0.9).tolist()


@pytest.mark.parametrize("rule", RULES)
def test_many_draws_with_fewer_levels_than_parameters(rule):
    many = _many(14, [1, 2, 3, 4, 6], levels=4, draws=60)
    assert take_many(many, rule, np.ones(5, dtype=bool)).tolist() == _draw_by_draw(many, rule, np.ones(5, dtype=bool))


@pytest.mark.parametrize("rule", RULES)
def test_levels_not_drawn_count_for_nothing(rule):
    many = _many(15, [1, 2, 3, 4, 6])
    again = _with_idle_levels(many, -7.0)
    every = np.ones(5, dtype=bool)
    assert np.array_equal(take_many(again, rule, every), take_many(many, rule, every))


def test_a_candidate_beyond_the_limit_is_no_tie_however_uncertain_the_difference_is():
    """The threshold of the smallest loss is 1 + 0.1155 / 2; the third has as many parameters as the chosen one."""

    def choice(third):
        losses = [[1.05] * 4, [0.9, 1.1, 0.9, 1.1], third]
        return choose(_evidence(losses, parameters=[1, 2, 1]), "one_standard_error", np.ones(3, dtype=bool))

    beyond, within = [0.7, 1.7, 0.7, 1.7], [0.556, 1.556, 0.556, 1.556]  # means 1.2 and 1.056
    assert choice(beyond).threshold == pytest.approx(1 + np.sqrt(0.04 / 3) / 2, rel=1e-12)
    for third, tied in ((beyond, ()), (within, (2,))):
        evidence = _evidence([[1.05] * 4, third])
        assert paired_standard_error(evidence, 0, 1) > abs(np.mean(third) - 1.05)
        assert (choice(third).chosen, choice(third).tied) == (0, tied)
