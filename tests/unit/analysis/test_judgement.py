"""The verdict on a chosen candidate, sign by sign, on records made by hand."""

import pytest

from fitlib.analysis.judgement import judge


def _lack(p):
    if p is None:
        return None
    degrees = {"numerator_df": 8, "denominator_df": 22}
    return {"f": 5.0, "p": p, "sum_of_squares": 1.0, "pure_error_sum_of_squares": 0.1} | degrees


def _record(p=None, serial=None, gain=None, misfit=0.02, exact=False, within_series=None):
    return {
        "exact": exact,
        "lack_of_fit": _lack(p),
        "lack_of_fit_within_series": _lack(within_series),
        "serial": None if serial is None else {"ratio": 0.7, "p": serial},
        "probe_gain": gain,
        "misfit": misfit,
    }


@pytest.mark.parametrize(
    "signs, verdict",
    [
        ({"p": 0.06, "serial": 1e-6, "gain": 9.0}, "adequate"),  # no lack of fit: nothing to explain
        ({"p": 1e-9, "serial": 0.02, "gain": 1.9}, "adequate"),  # irregular: a deviation of the levels
        ({"p": 1e-9, "serial": 0.009, "gain": 0.0}, "inadequate"),
        ({"p": 1e-9, "serial": 0.5, "gain": 2.1}, "inadequate"),
        ({"p": 1e-9, "serial": None, "gain": None}, "adequate"),
        ({"serial": 0.009}, "inadequate"),  # no replicates: the smooth signs speak alone
        ({"serial": 0.5, "gain": -1.0}, "adequate"),
        ({"p": 1e-9, "serial": 1e-6, "gain": 9.0, "exact": True}, "adequate"),
    ],
)
def test_inadequate_needs_a_smooth_misfit(signs, verdict):
    assert judge(_record(**signs), 11, "p" in signs, None, "kN")[0] == verdict


@pytest.mark.parametrize("target, verdict", [(0.019, "inadequate"), (0.021, "adequate"), (None, "inadequate")])
def test_a_smooth_misfit_smaller_than_the_target_is_accepted(target, verdict):
    found, reason = judge(_record(p=1e-9, gain=3.0), 11, True, target, "kN")
    assert found == verdict
    assert "two orders more lower the level loss by 3 paired standard errors" in reason


def test_a_misfit_without_size_is_never_smaller_than_the_target():
    assert judge(_record(p=1e-9, gain=3.0, misfit=None), 11, True, 1e9, "kN")[0] == "inadequate"


def test_differences_between_whole_series_do_not_hide_a_misfit():
    verdict, reason = judge(_record(p=0.9, within_series=1e-9, gain=3.0), 11, True, None, "kN")
    assert verdict == "inadequate"
    assert "differences between whole series taken out" in reason


@pytest.mark.parametrize(
    "levels, target, verdict", [(6, None, "not_evaluated"), (6, 0.03, "adequate"), (7, None, "adequate")]
)
def test_an_excess_with_few_levels_is_not_called_irregular(levels, target, verdict):
    assert judge(_record(p=1e-9, misfit=0.02), levels, True, target, "kN")[0] == verdict


@pytest.mark.parametrize("levels, verdict", [(6, "not_evaluated"), (7, "adequate")])
def test_few_levels_without_replicates_are_not_judged(levels, verdict):
    assert judge(_record(), levels, False, None, "kN")[0] == verdict
