"""Series over the same interval: from exactly half of the values repeated on, they count as levels."""

import numpy as np
import pytest

from fitlib.observations.clusters import find_clusters

COMMON = (0.0, 30.0)
OWN = ((4.1, 13.3, 17.9, 21.2), (7.7, 10.2, 19.6, 26.4))


def _sign(common, *own):
    values = [[*common, *part] for part in own]
    series = [number for number, part in enumerate(values) for _ in part]
    found = find_clusters(np.concatenate(values), np.array(series))
    return None if found is None else found.sign


@pytest.mark.parametrize("extra", range(1, 4))
def test_half_of_the_values_are_enough(extra):
    """Two series of ``count`` values each, ``count / 2`` of them in common; then one repeat less."""
    inner = (15.5, 23.0, 28.1)[:extra]
    common, count = (*COMMON, *inner), 2 + extra
    own = [part[:count] for part in OWN]
    if count > 4:
        own = [(*part, 2.2 + number) for number, part in enumerate(own)]
    assert [len(common), *map(len, own)] == [count] * 3
    assert _sign(common, *own) is None
    less = ([*own[0], common[-1]], [*own[1], common[-1] + 0.9])
    assert _sign(common[:-1], *less) == "few repeats"
