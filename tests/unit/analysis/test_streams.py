"""Random streams by name, and plain numbers for JSON."""

import hashlib
import json

import numpy as np
import pytest

from fitlib.analysis.jsonable import matrix, number, numbers
from fitlib.analysis.streams import draw_counts, permutations

WORD = 2**64


def _philox(counter: list[int], key: list[int]) -> list[int]:
    """Philox 4x64 with 10 rounds in plain whole numbers.

    Salmon, Moraes, Dror & Shaw, Parallel random numbers: as easy as 1, 2, 3, SC11 (2011), sec. 3.3 and table 2.
    """
    a, b, c, d = counter
    first, second = key
    for _ in range(10):
        low, high = 0xD2E7470EE14C6C93 * a, 0xCA5A826395121157 * c
        a, b, c, d = high // WORD ^ b ^ first, high % WORD, low // WORD ^ d ^ second, low % WORD
        first, second = (first + 0x9E3779B97F4A7C15) % WORD, (second + 0xBB67AE8584CAA73B) % WORD
    return [a, b, c, d]


# Known answers published with the generator by its authors (Random123, file kat_vectors, lines "philox4x64 10"):
# counter, key, output
KNOWN_ANSWERS = [
    (
        "0000000000000000 0000000000000000 0000000000000000 0000000000000000",
        "0000000000000000 0000000000000000",
        "16554d9eca36314c db20fe9d672d0fdc d7e772cee186176b 7e68b68aec7ba23b",
    ),
    (
        "ffffffffffffffff ffffffffffffffff ffffffffffffffff ffffffffffffffff",
        "ffffffffffffffff ffffffffffffffff",
        "87b092c3013fe90b 438c3c67be8d0224 9cc7d7c69cd777b6 a09caebf594f0ba0",
    ),
    (
        "243f6a8885a308d3 13198a2e03707344 a4093822299f31d0 082efa98ec4e6c89",
        "452821e638d01377 be5466cf34e90c6c",
        "a528f45403e61d95 38c72dbd566e9788 a5a1610e72fd18b5 57bd43b5e52b7fe6",
    ),
]


@pytest.mark.parametrize(("counter", "key", "output"), KNOWN_ANSWERS)
def test_philox_gives_its_published_answers(counter, key, output):
    """Both the plain one of this file and numpy's, which steps its counter before each use."""
    counter, key, output = ([int(word, 16) for word in text.split()] for text in (counter, key, output))
    assert _philox(counter, key) == output
    start = (sum(word * WORD**k for k, word in enumerate(counter)) - 1) % WORD**4
    generator = np.random.Philox(counter=start, key=sum(word * WORD**k for k, word in enumerate(key)))
    assert generator.random_raw(4).tolist() == output


def _words(text: str, row: int, count: int) -> list[int]:
    """Words of one draw or repeat: key from SHA-256 of seed and names, a stretch of the counter for each row."""
    key = int.from_bytes(hashlib.sha256(text.encode("utf-8")).digest()[:16], "big")
    steps = (count + 3) // 4
    blocks = [_philox([row * steps + k + 1, 0, 0, 0], [key % WORD, key // WORD]) for k in range(steps)]
    return [word for block in blocks for word in block][:count]


@pytest.mark.parametrize("count", [5, 11, 12])
def test_draws_are_those_of_plain_philox(count):
    counts = _all(20260401, ("LS-101", "bootstrap"), count, 6)
    for draw in range(6):
        words = _words("20260401\x1fLS-101\x1fbootstrap", draw, count)
        # 53 bits of each word, as a number from 0 to 1
        picked = [int((word >> 11) / 2**53 * count) for word in words]
        assert counts[draw].tolist() == [picked.count(unit) for unit in range(count)]


def test_permutations_are_those_of_plain_philox():
    orders = permutations(20260401, ("LS-101", "k_fold"), 11, 4)
    for repeat, order in enumerate(orders):
        words = _words("20260401\x1fLS-101\x1fk_fold", repeat, 11)
        assert order.tolist() == sorted(range(11), key=words.__getitem__)


def test_a_stream_is_the_same_on_every_machine():
    """Written down once from plain Philox; a change would change published results."""
    assert _all(20260401, ("LS-101", "bootstrap"), 11, 2).tolist() == [
        [0, 0, 2, 1, 3, 0, 0, 3, 0, 0, 2],
        [1, 1, 1, 1, 2, 1, 1, 0, 1, 1, 1],
    ]
    assert permutations(20260401, ("LS-101", "k_fold"), 11, 1)[0].tolist() == [4, 5, 8, 10, 6, 9, 2, 3, 7, 1, 0]


def _all(seed: int, names: tuple, count: int, draws: int) -> np.ndarray:
    return np.concatenate(list(draw_counts(seed, names, count, draws)))


def test_a_stream_depends_on_seed_and_names_alone():
    first = _all(1, ("LC-1", "bootstrap"), 40, 3)
    _all(1, ("LC-2", "bootstrap"), 40, 100)
    assert np.array_equal(_all(1, ("LC-1", "bootstrap"), 40, 3), first)
    others = [(2, ("LC-1", "bootstrap")), (1, ("LC-2", "bootstrap")), (1, ("LC-1", "k_fold"))]
    for seed, names in others:
        assert not (_all(seed, names, 40, 3) == first).all(axis=1).any()


def test_names_are_kept_apart():
    def order(*names):
        return permutations(1, names, 40, 1)[0].tolist()

    assert order("ab", "c") != order("a", "bc")
    assert order("1", 2) != order("12")


def test_draws_are_whole_numbers_that_sum_to_the_units():
    counts = _all(5, ("LC-1", "bootstrap"), 11, 400)
    assert counts.shape == (400, 11)
    assert np.issubdtype(counts.dtype, np.integer)
    assert (counts.sum(axis=1) == 11).all()
    assert counts.min() == 0
    # About 1/e of the units is left out of a draw
    assert abs((counts == 0).mean() - (1 - 1 / 11) ** 11) < 0.02


def test_draws_are_different():
    assert np.unique(_all(5, ("x",), 40, 300), axis=0).shape == (300, 40)


def test_more_draws_leave_the_first_ones_as_they_were():
    assert np.array_equal(_all(5, ("x",), 7, 50)[:20], _all(5, ("x",), 7, 20))


@pytest.mark.parametrize("at_once", [1, 7, 100, 699])
def test_draws_do_not_depend_on_the_size_of_blocks(at_once, monkeypatch):
    whole = _all(5, ("x",), 7, 100)
    monkeypatch.setattr("fitlib.analysis.streams.NUMBERS_AT_ONCE", at_once)
    blocks = list(draw_counts(5, ("x",), 7, 100))
    assert len(blocks) > 1
    assert np.array_equal(np.concatenate(blocks), whole)


def test_permutations_are_different_for_each_repeat():
    orders = permutations(5, ("LC-1", "k_fold"), 11, 3)
    assert [sorted(order.tolist()) for order in orders] == [list(range(11))] * 3
    assert len({tuple(order.tolist()) for order in orders}) == 3


def test_more_repeats_leave_the_first_ones_as_they_were():
    few, many = permutations(5, ("x",), 11, 2), permutations(5, ("x",), 11, 9)
    assert [order.tolist() for order in many[:2]] == [order.tolist() for order in few]


def test_what_json_cannot_hold_is_missing():
    assert number(np.float64(0.1)) == 0.1
    assert type(number(np.float64(0.1))) is float
    assert numbers([1.0, np.nan, np.inf, -np.inf]) == [1.0, None, None, None]
    assert json.dumps(matrix(np.array([[1.0, np.nan]])), allow_nan=False) == "[[1.0, null]]"
