"""Random streams by name, and plain numbers for JSON."""

import json

import numpy as np

from fitlib.analysis.jsonable import matrix, number, numbers
from fitlib.analysis.streams import draw_counts, permutations, stream


def test_a_stream_depends_on_seed_and_names_alone():
    first = stream(1, "LC-1", "bootstrap", "draw", 3).random(4).tolist()
    stream(1, "LC-2", "bootstrap", "draw", 3).random(100)
    assert stream(1, "LC-1", "bootstrap", "draw", 3).random(4).tolist() == first
    others = [
        (2, "LC-1", "bootstrap", "draw", 3),
        (1, "LC-1", "bootstrap", "draw", 4),
        (1, "LC-1", "k_fold", "draw", 3),
    ]
    assert all(stream(*names).random(4).tolist() != first for names in others)


def test_names_are_kept_apart():
    assert stream(1, "ab", "c").random() != stream(1, "a", "bc").random()
    assert stream(1, "1", 2).random() != stream(1, "12").random()


def test_a_stream_is_the_same_on_every_machine():
    """Written down once: numpy's PCG64 from 128 bits of SHA-256; a change would change published results."""
    assert stream(20260401, "LS-101", "bootstrap", "draw", 0).integers(0, 11, size=8).tolist() == [
        5,
        2,
        3,
        6,
        0,
        5,
        6,
        6,
    ]


def test_draws_are_whole_numbers_that_sum_to_the_units():
    counts = draw_counts(5, ("LC-1", "bootstrap"), 11, 400)
    assert counts.shape == (400, 11)
    assert (counts.sum(axis=1) == 11).all()
    assert counts.min() == 0
    # About 1/e of the units is left out of a draw
    assert abs((counts == 0).mean() - (1 - 1 / 11) ** 11) < 0.02


def test_more_draws_leave_the_first_ones_as_they_were():
    assert np.array_equal(draw_counts(5, ("x",), 7, 50)[:20], draw_counts(5, ("x",), 7, 20))


def test_permutations_are_different_for_each_repeat():
    orders = permutations(5, ("LC-1", "k_fold"), 11, 3)
    assert [sorted(order.tolist()) for order in orders] == [list(range(11))] * 3
    assert len({tuple(order.tolist()) for order in orders}) == 3


def test_what_json_cannot_hold_is_missing():
    assert number(np.float64(0.1)) == 0.1
    assert type(number(np.float64(0.1))) is float
    assert numbers([1.0, np.nan, np.inf, -np.inf]) == [1.0, None, None, None]
    assert json.dumps(matrix(np.array([[1.0, np.nan]])), allow_nan=False) == "[[1.0, null]]"
