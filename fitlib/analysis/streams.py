"""Random streams named after what is drawn, so that job order and cores cannot change a number.

Philox (Salmon et al., Parallel random numbers: as easy as 1, 2, 3, SC11, 2011) is a function of key and counter: the
key is made of the study's seed and the names, and each draw or repeat has its own stretch of the counter. A draw is
therefore the same however many draws are made, in whatever blocks.
"""

from __future__ import annotations

import hashlib
from collections.abc import Iterator

import numpy as np

#: Numbers drawn at once; the results do not depend on it.
NUMBERS_AT_ONCE = 2_000_000


def _key(seed: int, names: tuple) -> int:
    text = "\x1f".join(str(part) for part in (seed, *names))
    return int.from_bytes(hashlib.sha256(text.encode("utf-8")).digest()[:16], "big")


def _words(key: int, first: int, rows: int, count: int) -> np.ndarray:
    """Random words of shape (rows, count); each row starts at its own place of the counter."""
    steps = -(-count // 4)  # one step of the counter gives four words
    generator = np.random.Philox(key=key, counter=first * steps)
    return generator.random_raw(rows * steps * 4).reshape(rows, steps * 4)[:, :count]


def permutations(seed: int, names: tuple, count: int, repeats: int) -> list[np.ndarray]:
    """One permutation of ``count`` units for each repeat.

    Parameters
    ----------
    seed : int
    names : tuple
        What is permuted, for example dataset and scheme.
    count, repeats : int

    Returns
    -------
    list of ndarray of shape (count,)
    """
    return list(np.argsort(_words(_key(seed, names), 0, repeats, count), axis=1, kind="stable"))


def draw_counts(seed: int, names: tuple, count: int, draws: int) -> Iterator[np.ndarray]:
    """How often each of ``count`` units is in each draw with replacement.

    Parameters
    ----------
    seed : int
    names : tuple
        What is drawn, for example dataset and scheme.
    count, draws : int

    Yields
    ------
    ndarray of shape (draws in the block, count), int
    """
    key, step = _key(seed, names), max(1, NUMBERS_AT_ONCE // count)
    for first in range(0, draws, step):
        rows = min(step, draws - first)
        words = _words(key, first, rows, count)
        picked = ((words >> np.uint64(11)) * 2.0**-53 * count).astype(np.int64)
        places = picked + count * np.arange(rows)[:, None]
        yield np.bincount(places.ravel(), minlength=rows * count).reshape(rows, count)
