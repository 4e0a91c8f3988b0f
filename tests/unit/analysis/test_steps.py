"""The steps of a dataset from observations to result, on small made data; `made.run` demands plain JSON throughout."""

import numpy as np
import pytest

ALL_SCHEMES = ("leave_one_level_out", "leave_one_series_out", "leave_one_out")


@pytest.fixture
def rows(made):
    return made.observations(*made.load_cell(np.random.default_rng(1)))


def _by_name(result):
    return {item["candidate"]: item for item in result["candidates"]}


def _schemes(result):
    return {item["scheme"]: item for item in result["schemes"]}


def test_every_declared_candidate_is_kept_with_a_reason(made, rows):
    families = (made.family([0, 1, 2, 9, 12]), made.family([1, 2], [(0.0, 0.0)]))
    result = made.run(made.study(families), rows)
    names = [item["candidate"] for item in result["candidates"]]
    assert names == [
        "polynomial-0",
        "polynomial-1",
        "polynomial-2",
        "polynomial-9",
        "polynomial-12",
        "polynomial-1-fixed",
        "polynomial-2-fixed",
    ]
    assert all(item["reason"] for item in result["candidates"])
    found = _by_name(result)
    assert found["polynomial-12"]["status"] == "not_fitted"
    assert found["polynomial-12"]["message"] == "13 parameters need at least 15 levels; there are 11"
    assert found["polynomial-9"]["message"] == "10 parameters need at least 12 levels; there are 11"
    assert "not strictly monotone" in found["polynomial-0"]["reason"]
    assert [item["group"] for item in result["candidates"]] == [0] * 5 + [1] * 2
    assert found["polynomial-2-fixed"]["parameters"] == 2
    assert sum(item["chosen"] for item in result["candidates"]) == 1


def test_two_families_compete_under_the_same_folds(made, rows):
    """A bow through the origin needs one parameter less, and the rule prefers it where both will do."""
    families = (made.family([1, 2, 3]), made.family([1, 2, 3], [(0.0, 0.0)]))
    both = made.run(made.study(families), rows)
    alone = made.run(made.study(families[1:]), rows)
    for name, item in _by_name(alone).items():
        assert item["losses"] == _by_name(both)[name]["losses"]
    assert both["selection"]["candidate"] == "polynomial-2-fixed"
    curve = both["curves"]["candidates"]["polynomial-2-fixed"]
    assert abs(curve[0]) < 1e-12


def test_all_schemes_beside_each_other(made, rows):
    validation = (
        *ALL_SCHEMES,
        made.scheme("k_fold", folds=5, repeats=3),
        made.scheme("k_fold", "observation", folds=7, repeats=1),
        made.scheme("bootstrap", draws=40),
        made.scheme("bootstrap", "series", draws=40),
    )
    result = made.run(made.study(validation=validation, seed=7), rows)
    schemes = _schemes(result)
    assert list(schemes) == [
        *ALL_SCHEMES,
        "k_fold",
        "k_fold_observation",
        "bootstrap",
        "bootstrap_series",
    ]
    assert {name for name, item in schemes.items() if item["row_wise"]} == {"leave_one_out", "k_fold_observation"}
    assert [len(item["folds"]) for item in schemes.values()] == [11, 3, 99, 15, 7, 11, 3]
    for name, item in schemes.items():
        assert item["status"] == "evaluated"
        for candidate, levels in item["level_losses"].items():
            loss = _by_name(result)[candidate]["losses"][name]["loss"]
            assert loss == pytest.approx(np.mean(levels), rel=1e-12)  # equal numbers at each level
    shares = [item["bootstrap_share"] for item in result["candidates"]]
    assert sum(shares) + result["selection"]["draws_without_choice"] / 40 == pytest.approx(1)


@pytest.mark.parametrize("rule", ["one_standard_error", "aicc"])
def test_draws_cut_into_blocks_give_the_same_result(made, rows, rule, monkeypatch):
    """The same draws in blocks of three: the same folds, failures and shares; losses to rounding."""
    study = made.study(validation=("leave_one_level_out", made.scheme("bootstrap", draws=100)), rule=rule, seed=4)
    whole = made.run(study, rows)
    monkeypatch.setattr("fitlib.analysis.streams.NUMBERS_AT_ONCE", 33)
    parts = made.run(study, rows)
    one, other = _schemes(whole)["bootstrap"], _schemes(parts)["bootstrap"]
    assert one["rank_deficient_draws"] == other["rank_deficient_draws"]
    assert [fold["draws"] for fold in one["folds"]] == [fold["draws"] for fold in other["folds"]]
    for name, item in _by_name(whole).items():
        again = _by_name(parts)[name]
        assert item["bootstrap_share"] == again["bootstrap_share"]
        assert again["losses"]["bootstrap"]["loss"] == pytest.approx(item["losses"]["bootstrap"]["loss"], rel=1e-12)
    assert max(item["bootstrap_share"] for item in whole["candidates"]) > 0.5
    assert whole["selection"] == parts["selection"]


def test_level_folds_never_leave_a_replicate_behind(made, rows):
    folds = _schemes(made.run(made.study(), rows))["leave_one_level_out"]["folds"]
    assert {fold["observations"] for fold in folds} == {9}
    assert folds[1]["fold"] == "level 5.0"


@pytest.mark.parametrize("rule", ["one_standard_error", "smallest_loss", "aicc", "bic", "f_test"])
def test_every_rule_gives_a_choice_and_an_outer_loss(made, rows, rule):
    result = made.run(made.study(rule=rule), rows)
    selection = result["selection"]
    assert selection["candidate"] in _by_name(result)
    assert selection["outer_loss"] > 0
    assert selection["outer_loss_interior"] > 0
    assert sum(selection["outer_choices"].values()) == 11
    assert selection["choice"] in ("decided", "tie")


def test_rows_in_any_order_give_the_same_bytes(made):
    x, y, run = made.load_cell(np.random.default_rng(2))
    study = made.study(validation=(*ALL_SCHEMES, made.scheme("bootstrap", draws=30)), seed=3)
    one = made.observations(x, y, run)
    order = np.argsort(np.random.default_rng(0).random(x.size))
    from dataclasses import replace

    other = made.observations(x[order], y[order], run[order])
    other = replace(other, row=one.row[order])
    first, second = made.run(study, one), made.run(study, other)
    assert first["candidates"] == second["candidates"]
    assert first["function"] == second["function"]
    assert first["selection"] == second["selection"]


def test_one_series_leaves_that_scheme_out_and_does_not_stop(made):
    x, y, _ = made.load_cell(np.random.default_rng(1), series=1)
    result = made.run(made.study(validation=ALL_SCHEMES), made.observations(x, y))
    scheme = _schemes(result)["leave_one_series_out"]
    assert (scheme["status"], scheme["message"]) == ("not_evaluated", "needs at least two series; there is one")
    assert scheme["folds"] == []
    assert result["selection"]["candidate"] is not None
    assert result["candidates"][0]["losses"]["leave_one_series_out"]["loss"] is None
    assert any("leave_one_series_out was not evaluated" in line for line in result["warnings"])


def test_four_levels_cannot_decide(made):
    x, y, run = made.load_cell(np.random.default_rng(1), levels=4)
    result = made.run(made.study((made.family([1]),), degrees_of_freedom=2), made.observations(x, y, run))
    selection = result["selection"]
    assert (selection["candidate"], selection["verdict"]) == (None, "not_evaluated")
    assert "has 4 folds; at least 5 are needed" in selection["verdict_reason"]
    assert result["function"] is None
    assert result["candidates"][0]["status"] == "fitted"


def test_fixed_points_hold_in_the_issued_function(made, rows):
    study = made.study((made.family([2, 3], [(0.0, 0.001), (60.0, 2.41)]),))
    result = made.run(study, rows)
    from fitlib.numerics.families import restore

    curve = restore(result["function"]["scaled"])
    np.testing.assert_allclose(curve.evaluate(np.array([0.0, 60.0])), [0.001, 2.41], rtol=1e-12)
    # A fixed point never extends the interval
    assert result["function"]["measuring_interval"] == [0.0, 50.0]
    assert result["function"]["scaled"]["fixed_points"] == [[0.0, 0.001], [60.0, 2.41]]


def test_verification_rows_change_no_coefficient(made):
    x, y, run = made.load_cell(np.random.default_rng(3))
    state = np.where(np.arange(x.size) % 10 == 5, "verification", "used")
    moved = np.where(state == "verification", y + 1.0, y)
    first = made.run(made.study(), made.observations(x, y, run, state=state))
    second = made.run(made.study(), made.observations(x, moved, run, state=state))
    assert first["candidates"] == second["candidates"]
    assert len(first["verification"]) == 10
    for one, two in zip(first["verification"], second["verification"], strict=True):
        assert two["residual"] - one["residual"] == pytest.approx(1.0, rel=1e-9)
        assert one["evaluated_deviation"] == pytest.approx(one["residual"] / 0.04, rel=0.05)


def test_excluded_rows_are_shown_and_not_used(made):
    x, y, run = made.load_cell(np.random.default_rng(3))
    state = np.array(["used"] * x.size, dtype=object)
    state[[4, 50]] = "excluded"
    wild = y.copy()
    wild[[4, 50]] = np.nan, 99.0
    result = made.run(made.study(), made.observations(x, wild, run, state=state))
    keep = state == "used"
    fit = np.polynomial.Polynomial.fit(x[keep], y[keep], 2)
    expected = fit(np.linspace(0, 50, 201))
    np.testing.assert_allclose(result["curves"]["candidates"]["polynomial-2"], expected, atol=1e-12)
    assert result["observations"]["response"][4] is None
    assert result["observations"]["residual"][50] is None
    assert result["observations"]["reason"][50].startswith("cable moved")


def test_eligibility_counts_levels_less_parameters(made):
    x, y, run = made.load_cell(np.random.default_rng(1), levels=6)
    found = _by_name(made.run(made.study((made.family(range(1, 6)),)), made.observations(x, y, run)))
    assert [name for name, item in found.items() if item["eligible"]] == ["polynomial-1", "polynomial-2"]
    assert "levels less parameters is 2; 3 is required" in found["polynomial-3"]["reason"]
    assert found["polynomial-5"]["message"] == "6 parameters need at least 8 levels; there are 6"


def test_a_droop_is_refused_for_inverse_and_allowed_for_direct_evaluation(made):
    """Pump: head from flow over the whole range, flow from head never over a turning point, which is named."""
    flow = np.repeat(np.linspace(0, 120, 12), 3)
    head = 48 + 0.0597 * flow - 0.0019 * flow**2 - 4e-6 * flow**3
    head += np.random.default_rng(2).normal(0, 0.05, 36)
    rows = made.observations(flow, head, np.tile([1, 2, 3], 12))
    families = (made.family(range(1, 5)),)
    direct = made.run(made.study(families, evaluation="direct", monotone=False), rows)
    assert direct["selection"]["candidate"] == "polynomial-3"
    inverse = _by_name(made.run(made.study(families), rows))
    assert not inverse["polynomial-3"]["eligible"]
    (turning,) = inverse["polynomial-3"]["turning_points"]
    assert 13 < turning < 17
    assert f"the slope changes sign at {turning:.4g} kN" in inverse["polynomial-3"]["reason"]


def test_a_target_larger_than_the_misfit_accepts_it(made):
    x = np.repeat(np.linspace(0, 50, 11), 3)
    rng = np.random.default_rng(0)
    y = 0.04 * x + 8e-6 * x * (50 - x) + rng.normal(0, 1e-5, 33)
    rows = made.observations(x, y)
    strict = made.run(made.study((made.family([1]),)), rows)
    assert strict["selection"]["verdict"] == "inadequate"
    misfit = _by_name(strict)["polynomial-1"]["misfit"]
    for factor, verdict in ((0.99, "inadequate"), (1.01, "adequate")):
        judged = made.run(made.study((made.family([1]),), target=factor * misfit), rows)
        assert judged["selection"]["verdict"] == verdict


def test_bands_and_function_agree_with_each_other(made, rows):
    """The record of the function gives the band of the figures again; mean and new observation are kept apart."""
    from scipy import stats

    from fitlib.numerics.families import restore
    from fitlib.numerics.uncertainty import mean_standard_uncertainty

    result = made.run(made.study(), rows)
    function, curves = result["function"], result["curves"]
    grid = np.array(curves["stimulus"])
    curve = restore(function["scaled"])
    t = stats.t.isf(0.025, function["degrees_of_freedom"])
    mean = mean_standard_uncertainty(curve, np.array(function["covariance"]), grid)
    np.testing.assert_allclose(curves["confidence_band"]["upper"], curve.evaluate(grid) + t * mean, rtol=1e-12)
    single = np.sqrt(mean**2 + function["reading_standard_deviation"] ** 2 + function["level_standard_deviation"] ** 2)
    np.testing.assert_allclose(curves["prediction_interval"]["lower"], curve.evaluate(grid) - t * single, rtol=1e-9)
    assert function["degrees_of_freedom"] == 11 - _by_name(result)[function["candidate"]]["parameters"]


def test_steps_are_named_in_order(made):
    from fitlib.analysis import run_step, step_names

    study = made.study(validation=ALL_SCHEMES)
    assert step_names(study) == ["fits", *(f"scheme:{name}" for name in ALL_SCHEMES), "selection"]
    with pytest.raises(KeyError):
        run_step("scheme:other", study, study.datasets[0], made.observations([0.0, 1.0], [0.0, 1.0]), {})


def test_k_fold_with_as_many_folds_as_levels_still_has_an_outer_loss(made):
    x, y, run = made.load_cell(np.random.default_rng(1), levels=6)
    validation = (made.scheme("k_fold", folds=6, repeats=2),)
    result = made.run(made.study(validation=validation, loss="k_fold", seed=1), made.observations(x, y, run))
    assert result["selection"]["outer_loss"] > 0
    assert result["selection"]["outer_message"] == ""


def test_more_folds_than_levels_is_not_evaluated(made):
    x, y, run = made.load_cell(np.random.default_rng(1), levels=6)
    validation = (made.scheme("k_fold", folds=7, repeats=1),)
    result = made.run(made.study(validation=validation, loss="k_fold", seed=1), made.observations(x, y, run))
    assert result["schemes"][0]["message"] == "7 folds need at least 7 levels; there are 6"
    assert result["selection"]["verdict"] == "not_evaluated"


def test_row_wise_deciding_is_warned_of(made, rows):
    result = made.run(made.study(validation=("leave_one_out",), loss="leave_one_out"), rows)
    assert any("separates observations of one level" in line for line in result["warnings"])


@pytest.mark.parametrize("unit", [1e-90, 1e-20, 1e20, 1e70])
def test_units_of_the_response_do_not_decide(made, unit):
    """The same study in a unit of another size: same choice, verdict and test, no warning of the machine."""
    x, y, run = made.load_cell(np.random.default_rng(8))
    plain = made.run(made.study(), made.observations(x, y, run))
    other = made.run(made.study(), made.observations(x, unit * y, run))
    assert other["selection"]["candidate"] == plain["selection"]["candidate"]
    assert other["selection"]["verdict"] == plain["selection"]["verdict"]
    for one, two in zip(plain["candidates"], other["candidates"], strict=True):
        assert two["lack_of_fit"]["f"] == pytest.approx(one["lack_of_fit"]["f"], rel=1e-6)
        assert two["losses"]["leave_one_level_out"]["loss"] == pytest.approx(
            unit**2 * one["losses"]["leave_one_level_out"]["loss"], rel=1e-6
        )
