"""Differences between whole series where the series are not of one size."""

import numpy as np
import pytest
from scipy import stats

from fitlib.numerics.components import series_effect

#: Observations of each series at one level.
UNBALANCED = [[10.1, 10.4, 10.2], [9.6, 9.9], [10.9], [10.0, 10.3, 9.8, 10.1, 10.2]]


def _one_level(groups):
    values = np.concatenate(groups)
    series = np.repeat(np.arange(len(groups)), [len(group) for group in groups])
    return series_effect(values, np.ones(values.size), np.zeros(values.size, dtype=int), series)


def test_one_level_is_a_one_way_analysis_of_variance():
    """Searle, Casella & McCulloch, Variance Components (1992), sec. 3.6: estimators for data that are not balanced."""
    effect = _one_level(UNBALANCED)
    f, p = stats.f_oneway(*UNBALANCED)
    assert effect.f == pytest.approx(f, rel=1e-9)
    assert effect.p == pytest.approx(p, rel=1e-9)
    assert (effect.numerator_df, effect.denominator_df) == (3, 7)
    within = sum(np.var(group) * len(group) for group in UNBALANCED) / 7
    assert effect.rest_variance == pytest.approx(within, rel=1e-9)
    number = (11 - (3**2 + 2**2 + 1**2 + 5**2) / 11) / 3
    assert number == pytest.approx(82 / 33, rel=1e-12)
    assert effect.deviation**2 == pytest.approx((f - 1) * within / number, rel=1e-9)


@pytest.mark.parametrize("sizes", [(3, 3, 3), (3, 2, 1, 5), (1, 9), (7, 2, 2), (1, 1, 40)])
def test_a_deviation_of_series_is_estimated_without_bias(sizes):
    """Independent deviations of variance 1 and no other scatter: the expected square is the sum over single ones."""
    singles = [
        _one_level([np.full(size, float(k == one)) for k, size in enumerate(sizes)]) for one in range(len(sizes))
    ]
    assert [effect.rest_variance for effect in singles] == pytest.approx([0.0] * len(sizes), abs=1e-30)
    assert sum(effect.deviation**2 for effect in singles) == pytest.approx(1.0, rel=1e-9)


def test_series_that_agree_have_no_deviation():
    effect = _one_level([[1.0, 3.0], [1.5, 2.5], [2.0]])
    assert (effect.f, effect.deviation) == (0.0, 0.0)
    assert effect.rest_variance == pytest.approx(2.5 / 2, rel=1e-12)
