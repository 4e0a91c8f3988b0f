"""Does a column look like the number of a run? By its name, or by how its values go with the stimulus."""

from __future__ import annotations

import re
from collections.abc import Sequence

import numpy as np

SERIES_WORDS = {"series", "run", "pass", "cycle", "sweep", "repeat", "trial"}
LEAST_VALUES_PASSED = 3


def words(header: str) -> set[str]:
    """Words of a column's name in small letters: ``refLevel_m`` gives ref, level and m."""
    split = re.sub(r"([a-z])([A-Z])", r"\1 \2", header)
    return set(re.findall(r"[^\W\d_]+", split.lower()))


def named_as_series(name: str, cells: Sequence[str]) -> bool:
    """Whether a column has the name of a series, no empty field, and values that repeat."""
    return bool(words(name) & SERIES_WORDS) and 0 < len(set(cells)) < len(cells) and all(cells)


def comes_in_blocks(cells: Sequence[str], stimulus: np.ndarray) -> bool:
    """Whether a column stays the same while the stimulus passes through three values or more, block by block.

    Parameters
    ----------
    cells : sequence of str
        Fields of the column.
    stimulus : ndarray of float, shape (n_rows,)
        NaN where a field is no number.

    Returns
    -------
    bool
    """
    values = list(dict.fromkeys(cells))
    blocks = 1 + sum(a != b for a, b in zip(cells, cells[1:], strict=False))
    if not all(values) or not 2 <= len(values) == blocks:
        return False
    held = np.array(cells)
    return all(np.unique(stimulus[held == value]).size >= LEAST_VALUES_PASSED for value in values)
