"""Random streams named after what is drawn, so that job order and cores cannot change a number."""

from __future__ import annotations

import hashlib

import numpy as np


def stream(seed: int, *names: object) -> np.random.Generator:
    """A generator that depends on the study's seed and the names alone.

    Parameters
    ----------
    seed : int
    *names : object
        For example dataset, scheme, ``"draw"``, 17.

    Returns
    -------
    numpy.random.Generator
    """
    text = "\x1f".join(str(part) for part in (seed, *names))
    digest = hashlib.sha256(text.encode("utf-8")).digest()
    return np.random.Generator(np.random.PCG64(int.from_bytes(digest[:16], "big")))


def permutations(seed: int, names: tuple, count: int, repeats: int) -> list[np.ndarray]:
    """One permutation of ``count`` units for each repeat, each from its own stream."""
    return [stream(seed, *names, "repeat", repeat).permutation(count) for repeat in range(repeats)]


def draw_counts(seed: int, names: tuple, count: int, draws: int) -> np.ndarray:
    """How often each of ``count`` units is in each draw, shape (draws, count), each draw from its own stream."""
    counts = np.empty((draws, count), dtype=np.int64)
    for draw in range(draws):
        picked = stream(seed, *names, "draw", draw).integers(0, count, size=count)
        counts[draw] = np.bincount(picked, minlength=count)
    return counts
