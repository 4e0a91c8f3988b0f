"""When to ask for a level tolerance: both sides of the rule, on seeded data.

The behaviour asked for: setting scatter must never pass in silence, and levels that are plain as they are must not be
questioned. Data are drawn here; there is no published source for this rule.
"""

import math

import numpy as np
import pytest

from fitlib.observations.clusters import find_clusters, log_chance

PONTIUS_LOADS = np.tile(np.arange(150_000.0, 3_000_001.0, 150_000.0), 2)  # NIST StRD "Pontius": 20 loads, twice
DECADES = np.outer(10.0 ** np.arange(-2, 4), [1, 2, 5]).ravel()


def one_series(values):
    return np.asarray(values, dtype=float), np.zeros(len(values), dtype=int)


def in_series(passes):
    return np.concatenate(passes).astype(float), np.repeat(np.arange(len(passes)), [len(one) for one in passes])


PLAIN_DESIGNS = {
    "20 levels read once": one_series(np.arange(20)),
    "one pass up and down": one_series(np.r_[np.arange(11), np.arange(10)[::-1]]),
    "NIST load cell without series": one_series(PONTIUS_LOADS),
    "NIST load cell with series": in_series([PONTIUS_LOADS[:20], PONTIUS_LOADS[20:]]),
    "1-2-5 steps over decades": one_series(DECADES),
    "1-2-5 steps, three times": one_series(np.tile(DECADES, 3)),
    "decades from zero": one_series(np.r_[0, 10.0 ** np.arange(8)]),
    "powers of two, replicates in a row": one_series(np.repeat(2.0 ** np.arange(12), 3)),
    "Chebyshev points": one_series(np.cos((2 * np.arange(12) + 1) * math.pi / 24)),
    "close levels met by every series": in_series([[0, 1, 49, 50, 51, 99, 100]] * 3),
    "close levels, passes not named": one_series(np.tile([0, 1, 49, 50, 51, 99, 100], 3)),
    "each series a part of the interval": in_series([np.arange(6), np.arange(5, 11), np.arange(10, 16)]),
    "decimal steps with binary rounding": one_series(np.arange(21) * 0.1),
    "two values": one_series([1, 1.001, 1, 5]),
}


@pytest.mark.parametrize("design", PLAIN_DESIGNS)
def test_plain_designs_are_not_questioned(design):
    assert find_clusters(*PLAIN_DESIGNS[design]) is None


DRAWS = {
    "uniform": lambda rng, m: rng.random(m),
    "normal": lambda rng, m: rng.normal(size=m),
    "log-normal": lambda rng, m: np.exp(1.5 * rng.normal(size=m)),
    "uniform over four decades": lambda rng, m: 10 ** (4 * rng.random(m)),
    "even steps with jitter": lambda rng, m: np.arange(m) + 0.2 * rng.normal(size=m),
    "uniform, rounded": lambda rng, m: np.round(10 * rng.random(m), 1),
}


@pytest.mark.parametrize("law", DRAWS)
@pytest.mark.parametrize("size", [4, 8, 15, 40])
def test_values_placed_at_random_are_rarely_questioned(law, size):
    rng = np.random.default_rng(20260401)
    alarms = sum(find_clusters(*one_series(DRAWS[law](rng, size))) is not None for _ in range(300))
    # The rule's own level is 0.1 %. A few values over decades are not what its chance is derived for: below 4 %.
    assert alarms <= (12 if law == "uniform over four decades" and size == 8 else 4)


SETTINGS = {
    "named series": lambda rng, levels, sd: in_series([levels + sd * rng.normal(size=levels.size) for _ in range(3)]),
    "series not named": lambda rng, levels, sd: one_series(np.tile(levels, 3) + sd * rng.normal(size=3 * levels.size)),
    "one pass up and down": lambda rng, levels, sd: one_series(
        np.r_[levels, levels[-2::-1]] + sd * rng.normal(size=2 * levels.size - 1)
    ),
    "replicates share one setting": lambda rng, levels, sd: in_series(
        [np.repeat(levels + sd * rng.normal(size=levels.size), 3) for _ in range(3)]
    ),
    "replicates scatter less than series": lambda rng, levels, sd: in_series(
        [
            np.repeat(levels + sd * rng.normal(size=levels.size), 3) + sd / 50 * rng.normal(size=3 * levels.size)
            for _ in range(3)
        ]
    ),
    "ends set exactly": lambda rng, levels, sd: in_series(
        [np.r_[levels[0], levels[1:-1] + sd * rng.normal(size=levels.size - 2), levels[-1]] for _ in range(3)]
    ),
    "values rounded, some meet again": lambda rng, levels, sd: in_series(
        [np.round(levels + sd * rng.normal(size=levels.size), 3) for _ in range(5)]
    ),
    "zero set before each level": lambda rng, levels, sd: one_series(
        [value for _ in range(3) for level in levels[1:] for value in (0.0, level + sd * rng.normal())]
    ),
}


@pytest.mark.parametrize("setting", SETTINGS)
@pytest.mark.parametrize("count", [5, 11])
def test_setting_scatter_is_found_and_the_proposed_tolerance_restores_the_levels(setting, count):
    rng = np.random.default_rng(20260401)
    levels = np.linspace(0, 1, count)
    for _ in range(50):
        stimulus, series = SETTINGS[setting](rng, levels, 1e-3)
        found = find_clusters(stimulus, series)
        assert found is not None and found.sign == "groups"
        assert found.groups == count
        assert found.width < found.tolerance < found.gap
        ordered = np.sort(stimulus)
        assert np.sum(np.diff(ordered) > found.tolerance) == count - 1


@pytest.mark.parametrize("with_zero", [False, True])
@pytest.mark.parametrize("sign", [1, -1])
def test_scatter_in_proportion_to_the_stimulus_is_found_over_decades(sign, with_zero):
    rng = np.random.default_rng(20260401)
    levels = sign * np.r_[[0.0] * with_zero, 10.0 ** np.arange(-1, 4)]
    for _ in range(50):
        found = find_clusters(*in_series([levels * (1 + 1e-2 * rng.normal(size=levels.size)) for _ in range(3)]))
        assert found is not None and found.groups == levels.size
    # Here a tolerance wide enough at 1000 would join the low levels: none is proposed.
    found = find_clusters(*in_series([levels * (1 + shift) for shift in (0, 0.02, 0.04)]))
    assert found.groups == levels.size and found.tolerance is None


def test_values_that_series_could_share_and_do_not_are_questioned():
    rng = np.random.default_rng(20260401)
    found = find_clusters(*in_series([np.sort(rng.random(10)) for _ in range(3)]))
    assert found.sign == "few repeats" and found.distinct == 30
    found = find_clusters(*in_series([np.arange(0, 40, 4.0), np.arange(1, 41, 4.0)]))
    assert found.groups == 10 and 1 < found.tolerance < 3


def test_series_that_meet_again_are_not_questioned_for_one_value_mistyped():
    passes = [np.arange(11.0) for _ in range(3)]
    passes[1][4] = 4.1
    assert find_clusters(*in_series(passes)) is None


@pytest.mark.parametrize(("gaps", "small", "ratio"), [(3, 2, 2.0), (5, 3, 1.5), (4, 3, 3.0)])
def test_the_chance_of_gaps_agrees_with_counting_random_gaps(gaps, small, ratio):
    rng = np.random.default_rng(20260401)
    drawn = np.sort(rng.exponential(size=(200_000, gaps)), axis=1)
    share = np.mean(drawn[:, small] >= ratio * drawn[:, small - 1])
    chance = math.exp(log_chance(gaps, small, ratio))
    assert abs(share - chance) < 5 * math.sqrt(chance / 200_000)


def test_the_chance_of_two_pairs_among_four_values_is_the_textbook_integral():
    # Three gaps, the middle one r times the larger of the others: 2 / ((1 + r)(2 + r)), times the three places it may
    # take. Elementary integral of exponential densities; own derivation.
    assert math.exp(log_chance(3, 2, 3.0)) == pytest.approx(3 * 2 / (4 * 5), rel=1e-12)


def test_check_stops_and_proposes_a_tolerance(problems, read):
    rng = np.random.default_rng(20260401)
    rows = [(level + 0.004 * rng.normal(), level, run) for run in range(3) for level in range(11)]
    data = {"a.csv": "x,y,run\n" + "".join(f"{x:.4f},{y},{run}\n" for x, y, run in rows)}
    columns = "stimulus: x, response: y, series: run"
    (found,) = problems(data, columns=columns)
    assert found.key == "datasets[0].level_tolerance" and found.file == "bench/study.yaml"
    assert "gather in 11 groups without repeating" in found.message
    proposed = found.message.split("`level_tolerance: ")[1].split("`")[0]
    assert read(data, f"level_tolerance: {proposed}", columns).level_index.max() == 10
    apart = found.message.split("`level_tolerance: ")[2].split("`")[0]
    assert read(data, f"level_tolerance: {apart}", columns).level_index.max() > 10


def test_a_level_column_answers_the_question(read):
    rng = np.random.default_rng(20260401)
    rows = [(level + 0.004 * rng.normal(), 2 * level, level) for _ in range(3) for level in range(11)]
    data = {"a.csv": "x,y,set\n" + "".join(f"{x:.4f},{y},{level}\n" for x, y, level in rows)}
    assert read(data, columns="stimulus: x, response: y, level: set").level_index.max() == 10
