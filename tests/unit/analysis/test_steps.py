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


def test_the_outer_loss_is_the_selection_repeated(made):
    """Without one level at a time: choose anew by hand through the very steps, and judge by that level."""
    x, y, run = made.load_cell(np.random.default_rng(9), levels=8, readings=2, deviation=5e-3)
    study = made.study((made.family([1, 2, 3]),), degrees_of_freedom=2, rule="smallest_loss")
    result = made.run(study, made.observations(x, y, run))
    eligible = {item["candidate"] for item in result["candidates"] if item["eligible"]}
    squares, taken = [], set()
    for level in np.unique(x):
        keep = x != level
        inner = made.run(study, made.observations(x[keep], y[keep], run[keep]))
        assert {item["candidate"] for item in inner["candidates"] if item["eligible"]} == eligible
        degree = int(inner["selection"]["candidate"].split("-")[1])
        taken.add(degree)
        fit = np.polynomial.Polynomial.fit(x[keep], y[keep], degree)
        squares.append(np.mean((y[~keep] - fit(level)) ** 2))
    assert len(taken) > 1  # else the test could not tell a choice made anew from the first one
    assert result["selection"]["outer_loss"] == pytest.approx(np.mean(squares), rel=1e-9)
    assert result["selection"]["outer_loss_interior"] == pytest.approx(np.mean(squares[1:-1]), rel=1e-9)


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


@pytest.mark.parametrize("function", ["calibration", "analysis"])
def test_a_constant_stimulus_is_a_plain_message(made, function):
    rows = made.observations(np.full(9, 3.0), np.linspace(1, 2, 9), np.tile([1, 2, 3], 3))
    result = made.run(made.study(validation=ALL_SCHEMES, function=function), rows)
    assert result["selection"]["verdict"] == "not_evaluated"
    assert {item["status"] for item in result["candidates"]} == {"not_fitted"}
    assert all(item["message"] for item in result["candidates"])
    if function == "calibration":
        assert result["candidates"][0]["message"] == "the stimulus is constant: no function of it can be fitted"


def test_a_constant_response_of_an_analysis_function_is_a_plain_message(made):
    x, _, run = made.load_cell(np.random.default_rng(1))
    result = made.run(made.study(function="analysis"), made.observations(x, np.full(x.size, 4.2), run))
    assert result["selection"]["verdict"] == "not_evaluated"
    assert result["candidates"][0]["message"] == "the response is constant: no function of it can be fitted"


def test_a_constant_response_has_no_inverse(made):
    x, _, run = made.load_cell(np.random.default_rng(1))
    result = made.run(made.study((made.family(range(4)),)), made.observations(x, np.full(x.size, 4.2), run))
    assert (result["selection"]["candidate"], result["selection"]["verdict"]) == (None, "inadequate")
    assert result["selection"]["verdict_reason"] == "none of the candidates is eligible"
    assert all("monotone" in item["reason"] for item in result["candidates"])


def test_one_observation(made):
    result = made.run(made.study(validation=ALL_SCHEMES), made.observations([1.0], [2.0], [1]))
    assert result["selection"]["verdict"] == "not_evaluated"
    assert result["design"] == {
        "observations": 1,
        "levels": 1,
        "series": 1,
        "replicates": False,
        "largest_supported_parameters": 0,
        "notes": [],
    }


EXACT = {
    "line": lambda x: 1 + 0.04 * x,
    "quadratic": lambda x: 1.7 + 0.0412345 * x + 1e-4 * x**2 / 3,
}


@pytest.mark.parametrize("replicates", [1, 3])
@pytest.mark.parametrize("rule", ["one_standard_error", "smallest_loss", "aicc", "bic", "f_test"])
@pytest.mark.parametrize("shape", EXACT)
def test_exact_data_are_adequate_and_warned_of(made, shape, rule, replicates):
    """What is left is rounding: it decides nothing, flags nothing, and is not held against the function."""
    x = np.repeat(np.linspace(0, 50, 11), replicates)
    result = made.run(made.study((made.family(range(1, 7)),), rule=rule), made.observations(x, EXACT[shape](x)))
    selection = result["selection"]
    assert selection["candidate"] == {"line": "polynomial-1", "quadratic": "polynomial-2"}[shape]
    assert (selection["verdict"], selection["choice"]) == ("adequate", "decided")
    assert any("look computed" in line for line in result["warnings"])
    assert not any(result["observations"]["flag"])
    assert not any("residual standard deviations" in line for line in result["warnings"])
    assert not selection["components"]["level_deviation_found"]


def test_exact_data_that_bend_beyond_the_candidates_are_inadequate(made):
    x = np.repeat(np.linspace(0, 50, 11), 3)
    result = made.run(made.study((made.family([1]),)), made.observations(x, EXACT["quadratic"](x)))
    assert result["selection"]["verdict"] == "inadequate"
    assert not any("look computed" in line for line in result["warnings"])


def test_replicates_that_agree_exactly_do_not_hide_a_misfit(made):
    x = np.repeat(np.linspace(0, 10, 11), 2)
    wave = made.observations(x, x + 0.3 * np.sin(0.628 * x))
    result = made.run(made.study((made.family([1]),)), wave)
    assert result["selection"]["verdict"] == "inadequate"
    few = np.repeat(np.arange(6.0), 2)
    result = made.run(made.study((made.family([1]),)), made.observations(few, few + 0.3 * np.sin(few)))
    assert result["selection"]["verdict"] != "adequate"
    assert "there are no replicates" not in result["selection"]["verdict_reason"]


def test_fixed_points_hold_in_the_issued_function(made, rows):
    study = made.study((made.family([2, 3], [(0.0, 0.001), (60.0, 2.41)]),))
    result = made.run(study, rows)
    from fitlib.numerics.families import restore

    curve = restore(result["function"]["scaled"])
    np.testing.assert_allclose(curve.evaluate(np.array([0.0, 60.0])), [0.001, 2.41], rtol=1e-12)
    # A fixed point never extends the interval
    assert result["function"]["measuring_interval"] == [0.0, 50.0]
    assert result["function"]["scaled"]["fixed_points"] == [[0.0, 0.001], [60.0, 2.41]]


class TestAnalysisFunction:
    """Stimulus from response, as for a thermistor: folds are still by stimulus level."""

    @pytest.fixture
    def thermistor(self, made):
        rng = np.random.default_rng(4)
        temperature = np.repeat(np.linspace(-20, 80, 11), 3)
        log_r = 9.0 - 0.045 * temperature + 7e-5 * temperature**2 + rng.normal(0, 2e-4, 33)
        return made.observations(temperature, log_r, np.tile([1, 2, 3], 11))

    def test_levels_are_those_of_the_stimulus(self, made, thermistor):
        result = made.run(made.study(function="analysis", validation=ALL_SCHEMES), thermistor)
        assert len(_schemes(result)["leave_one_level_out"]["folds"]) == 11
        assert result["settings"]["fitted"] == result["settings"]["stimulus"]
        assert result["settings"]["evaluated"] == result["settings"]["stimulus"]
        assert result["curves"]["abscissa"]["quantity"] == "ratio"

    def test_losses_are_those_of_the_reversed_roles(self, made, thermistor):
        result = made.run(made.study(function="analysis"), thermistor)
        x, y = thermistor.response, thermistor.stimulus
        squares = []
        for level in np.unique(y):
            keep = y != level
            fit = np.polynomial.Polynomial.fit(x[keep], y[keep], 2)
            squares.append(np.mean((y[~keep] - fit(x[~keep])) ** 2))
        loss = _by_name(result)["polynomial-2"]["losses"]["leave_one_level_out"]["loss"]
        assert loss == pytest.approx(np.mean(squares), rel=1e-9)

    def test_fixed_points_stay_pairs_of_stimulus_and_response(self, made, thermistor):
        from fitlib.numerics.families import restore

        result = made.run(made.study((made.family([2, 3], [(25.0, 7.9187)]),), function="analysis"), thermistor)
        curve = restore(result["function"]["scaled"])
        np.testing.assert_allclose(curve.evaluate(np.array([7.9187])), [25.0], rtol=1e-12)

    def test_test_vectors_and_ends_speak_of_stimulus_and_response(self, made, thermistor):
        from fitlib.numerics.families import restore

        result = made.run(made.study(function="analysis"), thermistor)
        function = result["function"]
        curve = restore(function["scaled"])
        inside = [item for item in function["test_vectors"] if item["verdict"] == "within_interval"]
        assert len(inside) == 21
        for item in inside:
            assert curve.evaluate(np.array([item["response"]]))[0] == pytest.approx(item["stimulus"], abs=1e-9)
        stimuli = [item["stimulus"] for item in inside]
        assert stimuli == sorted(stimuli)
        assert function["response_at_ends"][0] > function["response_at_ends"][1]
        assert [item["verdict"] for item in function["test_vectors"][21:]] == ["below_range", "above_range"]

    @pytest.mark.parametrize("interval", [(-15.0, 75.0), (41.0, 44.0)])
    def test_an_interval_between_levels_is_covered_to_its_ends(self, made, thermistor, interval):
        from fitlib.numerics.families import restore

        result = made.run(made.study(function="analysis", measuring_interval=interval), thermistor)
        function = result["function"]
        assert function["measuring_interval"] == list(interval)
        ends = restore(function["scaled"]).evaluate(np.array(function["response_at_ends"]))
        np.testing.assert_allclose(ends, interval, atol=0.05)


def test_inverse_stimulus_weights_reach_losses_and_covariance(made):
    rng = np.random.default_rng(6)
    x = np.repeat([1.0, 3, 10, 30, 100, 300, 1000, 3000], 4)
    y = 2 * x * (1 + 0.05 * rng.normal(size=x.size))
    rows = made.observations(x, y, np.tile([1, 2, 3, 4], 8))
    results = {
        weighting: made.run(made.study((made.family([1, 2]),), weighting=weighting), rows)
        for weighting in ("none", "inverse_stimulus", "inverse_stimulus_squared")
    }
    for weighting, power in (("none", 0), ("inverse_stimulus", 1), ("inverse_stimulus_squared", 2)):
        weights = x**-power
        squares = np.zeros(x.size)
        for level in np.unique(x):
            keep = x != level
            fit = np.polynomial.Polynomial.fit(x[keep], y[keep], 1, w=np.sqrt(weights[keep]))
            squares[~keep] = (y[~keep] - fit(x[~keep])) ** 2
        loss = _by_name(results[weighting])["polynomial-1"]["losses"]["leave_one_level_out"]["loss"]
        assert loss == pytest.approx(np.average(squares, weights=weights), rel=1e-8)
    widths = [
        np.subtract(*(np.array(results["inverse_stimulus_squared"]["curves"]["prediction_interval"][k]) for k in names))
        for names in (("upper", "lower"),)
    ][0]
    assert widths[-1] > 100 * widths[0]  # a constant relative standard deviation over more than three decades


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


def _variances(x, y, degree, level, run):
    """Moments by hand for balanced data: scatter within levels, without series, and about the curve of level means."""
    levels, series = np.unique(level).size, np.unique(run).size
    count, n = x.size // levels, x.size
    means = np.array([y[level == k].mean() for k in np.unique(level)])
    pure = sum(np.sum((y[level == k] - y[level == k].mean()) ** 2) for k in np.unique(level))
    offsets = np.array([y[run == k].mean() for k in np.unique(run)])
    of_series = n / series * offsets.var(ddof=1)
    rest = (pure - (series - 1) * of_series) / (n - levels - series + 1)
    fit = np.polynomial.Polynomial.fit(np.unique(x), means, degree)
    about = count * np.sum((means - fit(np.unique(x))) ** 2) / (levels - degree - 1)
    return pure / (n - levels), rest, max(0.0, of_series - rest) / (n / series), about, count


@pytest.mark.parametrize("offset", [0.0, 5e-4])
def test_what_the_issued_function_says_of_new_readings(made, offset):
    """Variance of one reading, and of the mean response, from the moments of balanced data written out."""
    rng = np.random.default_rng(14)
    x, y, run = made.load_cell(rng)
    y = y + rng.normal(0, offset, 3)[run - 1]
    rows = made.observations(x, y, run)
    result = made.run(made.study((made.family([2]),)), rows)
    pure, rest, of_series, about, count = _variances(x, y, 2, x, run)
    components = result["selection"]["components"]
    assert components["level_deviation_found"]
    assert components["series_deviation_found"] == (offset > 0)
    within = rest if offset else pure
    of_level = (about - within) / count
    total = within + of_level + (of_series if offset else 0.0)
    function = result["function"]
    single = function["reading_standard_deviation"] ** 2 + function["level_standard_deviation"] ** 2
    assert single == pytest.approx(total, rel=1e-9)
    # The mean response at the centre: level means scatter by `about / count`; a series offset only by a third of it
    basis = np.polynomial.chebyshev.chebvander(np.linspace(-1, 1, 11), 2)
    centre = np.array([1.0, 0.0, -1.0])
    variance = about / count * centre @ np.linalg.inv(basis.T @ basis) @ centre + (of_series / 3 if offset else 0.0)
    assert centre @ np.array(function["covariance"]) @ centre == pytest.approx(variance, rel=1e-9)


def test_share_of_resamples_by_hand(made):
    """Every draw of levels: leave each drawn level out, refit with copies counted, take the smallest loss.

    The stimulus scatters within its levels, so that a curve through two levels alone could be had, and must not be.
    """
    from fitlib.analysis.streams import draw_counts

    rng = np.random.default_rng(3)
    level = np.repeat(np.arange(6), 3)
    x = 10.0 * level + rng.normal(0, 0.05, 18)
    y = 0.04 * x + 2e-5 * x**2 + rng.normal(0, 0.004, 6)[level] + rng.normal(0, 0.002, 18)
    study = made.study(
        (made.family([1, 2, 3]),),
        validation=("leave_one_level_out", made.scheme("bootstrap", draws=80)),
        rule="smallest_loss",
        seed=12,
        degrees_of_freedom=2,
    )
    result = made.run(study, made.observations(x, y, np.tile([1, 2, 3], 6), level=10.0 * level))
    assert all(item["eligible"] for item in result["candidates"])
    taken = {1: 0, 2: 0, 3: 0, None: 0}
    for draw in draw_counts(12, ("LC-1", "bootstrap"), 6, 80):
        weights, drawn = draw[level], np.flatnonzero(draw)
        losses = {}
        for degree in (1, 2, 3):
            if degree + 1 >= drawn.size:
                continue
            squares = 0.0
            for k in drawn:
                keep = (level != k) & (weights > 0)
                fit = np.polynomial.Polynomial.fit(x[keep], y[keep], degree, w=np.sqrt(weights[keep]))
                squares += np.sum(weights[level == k] * (y[level == k] - fit(x[level == k])) ** 2)
            losses[degree] = squares
        taken[min(losses, key=losses.get) if losses else None] += 1
    assert min(taken[1], taken[2]) > 5
    shares = {item["degree"]: item["bootstrap_share"] for item in result["candidates"]}
    assert shares == {degree: taken[degree] / 80 for degree in (1, 2, 3)}
    assert result["selection"]["draws_without_choice"] == taken[None]
