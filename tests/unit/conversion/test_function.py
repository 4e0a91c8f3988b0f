"""A reading becomes a value with its uncertainty, or a verdict that says why not."""

import math

import numpy as np
import pytest

from fitlib.conversion import load_function
from fitlib.errors import DecisionError, InputError

ENDS = [("rising", 0, "below_range"), ("rising", 1, "above_range")]
ENDS += [("falling", 0, "below_range"), ("falling", 1, "above_range")]


def outward(record, end):
    """The response one unit in the last place beyond an end."""
    here, there = record["response_at_ends"][end], record["response_at_ends"][1 - end]
    return math.nextafter(here, math.inf if here > there else -math.inf)


@pytest.mark.parametrize("kind", ["rising", "falling"])
def test_a_response_inside_is_inverted(kind, records, load):
    function = load(records[kind]())
    for stimulus in np.linspace(0, 10, 23):
        response = 4 + 1.6 * stimulus + 0.002 * stimulus**2
        response = response if kind == "rising" else 24 - response
        answer = function.convert(float(np.clip(response, *sorted(function.record["response_at_ends"]))))
        assert answer.verdict == "within_interval"
        assert answer.value == pytest.approx(stimulus, abs=1e-9)


@pytest.mark.parametrize(("kind", "end", "verdict"), ENDS)
def test_the_ends_are_inside_and_give_the_ends_of_the_interval(kind, end, verdict, records, load):
    function = load(records[kind]())
    answer = function.convert(function.record["response_at_ends"][end])
    assert (answer.verdict, answer.value) == ("within_interval", function.measuring_interval[end])


@pytest.mark.parametrize(("kind", "end", "verdict"), ENDS)
def test_one_unit_in_the_last_place_outside_is_refused_and_the_verdict_speaks_of_the_stimulus(
    kind, end, verdict, records, load
):
    function = load(records[kind]())
    answer = function.convert(outward(function.record, end))
    assert (answer.verdict, answer.value, answer.standard_uncertainty) == (verdict, None, None)
    assert answer.agrees_with_end is True
    shown, bound = answer.note.split(" mA lies beyond ")
    assert shown != bound.split(" mA")[0]


@pytest.mark.parametrize("kind", ["rising", "falling"])
@pytest.mark.parametrize("end", [0, 1])
def test_a_stored_end_a_few_last_places_off_still_converts(kind, end, records, load):
    """Another machine may evaluate the ends with other last bits; every response between them still has a value."""
    for step in (-4, 4, -(10**6), 10**6):
        record = records[kind]()
        here = record["response_at_ends"][end]
        record["response_at_ends"][end] = here + step * math.ulp(here)
        function = load(record)
        between = here + step / 2 * math.ulp(here)
        assert function.convert(record["response_at_ends"][end]).value == function.measuring_interval[end]
        for response in (record["response_at_ends"][end], between, here):
            answer = function.convert(response)
            inside = min(record["response_at_ends"]) <= response <= max(record["response_at_ends"])
            assert (answer.value is not None) == inside
            if inside:
                assert answer.value == pytest.approx(function.measuring_interval[end], abs=1e-8)


def test_a_refused_reading_says_whether_it_agrees_with_the_end(records, load):
    """The prediction interval at the end: t * sqrt(u(f)^2 + s_r^2 / m + s_L^2), Draper & Smith 1998, sec. 3.1."""
    function = load(records["rising"]())
    end = function.record["response_at_ends"][1]
    for readings in (1, 4):
        # The basis is 1, 1, 1 at the upper end and the coefficients are uncorrelated
        half = 2.228139 * math.sqrt(3 * 1e-6 + 0.004**2 / readings + 0.003**2)
        assert function.convert(end + 0.999 * half, readings).agrees_with_end is True
        assert function.convert(end + 1.001 * half, readings).agrees_with_end is False
    assert "does not agree with that end" in function.convert(end + 1).note
    assert "it agrees with that end" in function.convert(end + 1e-6).note


def straight_line():
    """Invented readings; covariance and standard deviation of the fit by the usual sums."""
    x = np.array([0.0, 1.0, 2.0, 3.0, 4.0, 5.0, 6.0, 7.0, 8.0, 9.0, 10.0, 5.0])
    y = 4 + 1.6 * x + 0.01 * np.array([1.0, -2, 1, 0, 2, -1, -1, 1, 0, -2, 1, 0.5])
    sxx = np.sum((x - x.mean()) ** 2)
    slope = np.sum((x - x.mean()) * y) / sxx
    intercept = y.mean() - slope * x.mean()
    s = math.sqrt(np.sum((y - intercept - slope * x) ** 2) / (x.size - 2))
    return x, y, sxx, slope, intercept, s


@pytest.mark.parametrize("readings", [1, 3])
@pytest.mark.parametrize("response", [4.5, 12.0, 19.5])
def test_uncertainty_of_a_straight_line_is_the_textbook_one(readings, response, records, load):
    """u(x0) = s/b * sqrt(1/m + 1/n + (y0 - mean y)^2 / (b^2 Sxx)): Miller & Miller, Statistics and Chemometrics for
    Analytical Chemistry, 6th ed. 2010, eq. 5.10."""
    x, y, sxx, slope, intercept, s = straight_line()
    design = np.column_stack([np.ones_like(x), (x - 5) / 5])
    function = load(
        records["of"](
            lambda v: intercept + slope * v,
            0.0,
            10.0,
            1,
            covariance=(s**2 * np.linalg.inv(design.T @ design)).tolist(),
            reading_standard_deviation=s,
            level_standard_deviation=0.0,
        )
    )
    answer = function.convert(response, readings)
    spread = 1 / readings + 1 / x.size + (response - y.mean()) ** 2 / (slope**2 * sxx)
    assert answer.value == pytest.approx((response - intercept) / slope, rel=1e-12)
    assert answer.standard_uncertainty == pytest.approx(s / slope * math.sqrt(spread), rel=1e-9)


@pytest.mark.parametrize(("degrees", "factor"), [(1, 12.71), (5, 2.57), (10, 2.23), (50, 2.01)])
def test_the_coverage_factor_is_that_of_the_guide(degrees, factor, records, load):
    """JCGM 100:2008, table G.2, column 95 %."""
    answer = load(records["rising"](degrees_of_freedom=float(degrees))).convert(12.0)
    assert round(answer.coverage_factor, 2) == factor
    assert answer.coverage_probability == 0.95
    assert answer.expanded_uncertainty == pytest.approx(answer.coverage_factor * answer.standard_uncertainty)


def test_averaging_divides_the_repeatability_only(records, load):
    function = load(records["rising"](covariance=np.zeros((3, 3)).tolist()))
    single, many = function.convert(12.0), function.convert(12.0, 10**12)
    slope = 1.6 + 2 * 0.002 * single.value
    assert single.standard_uncertainty == pytest.approx(0.005 / slope)  # 3-4-5: level, reading, both
    assert many.standard_uncertainty == pytest.approx(0.003 / slope, rel=1e-6)


@pytest.mark.parametrize("response", [math.nan, math.inf, -math.inf, "12.0", None, True, b"1", 10**400])
def test_what_is_no_number_gets_the_verdict_and_no_value(response, records, load):
    answer = load(records["rising"]()).convert(response)
    assert (answer.verdict, answer.value) == ("not_a_number", None)


@pytest.mark.parametrize("readings", [0, -1, 1.0, True, "2", None])
def test_a_bad_number_of_readings_is_refused(readings, records, load):
    function = load(records["rising"]())
    with pytest.raises(InputError, match="a whole number of 1 or more"):
        function.convert(12.0, readings)


def test_numpy_integers_count_as_readings(records, load):
    assert load(records["rising"]()).convert(np.float64(12.0), np.int64(3)).readings == 3


@pytest.mark.parametrize("verdict", ["inadequate", "not_evaluated"])
def test_a_function_that_is_not_adequate_converts_nothing(verdict, records, load):
    function = load(records["rising"](verdict=verdict, verdict_reason="smooth misfit of 0.2 m"))
    for act in (function.convert, function.invert, function.evaluate):
        with pytest.raises(DecisionError, match=f"{verdict}: smooth misfit of 0.2 m"):
            act(5.0)


def test_a_tie_is_known(records, load):
    assert load(records["rising"](choice="tie")).tie
    assert not load(records["rising"]()).tie


def test_cautions_carry_the_statement_on_uncertainty_once(records, load):
    record = records["rising"]()
    record["cautions"].append(record["uncertainty_statement"])
    assert load(record).cautions == tuple(record["cautions"])
    assert load(records["rising"]()).cautions == tuple(record["cautions"])


def test_direct_evaluation_gives_the_response(records, load):
    function = load(records["pump"]())
    for flow in (0.0, 15.0, 29.6, 120.0):
        answer = function.convert(flow)
        assert answer.value == pytest.approx(48 + 0.0597 * flow - 0.0019 * flow**2 - 4e-6 * flow**3, rel=1e-12)
        assert (answer.given_unit, answer.unit) == ("m3/h", "m")
    assert answer.standard_uncertainty == pytest.approx(math.sqrt(4e-6 + 0.004**2 + 0.003**2))


def test_direct_evaluation_outside_the_interval_is_refused(records, load):
    function = load(records["pump"]())
    below, above = function.convert(-5e-324), function.convert(math.nextafter(120, 121))
    assert (below.verdict, below.value) == ("below_range", None)
    assert (above.verdict, above.value) == ("above_range", None)
    assert "120.00000000000001" in above.note


def pump_flow_at_shut_off_head():
    """The other flow at which the head is that of no flow: the positive zero of 0.0597 - 0.0019 q - 4e-6 q^2."""
    return (-0.0019 + math.sqrt(0.0019**2 + 4 * 4e-6 * 0.0597)) / (2 * 4e-6)


def test_a_response_taken_twice_is_refused_with_both_values_and_the_turning_point(records, load):
    function = load(records["pump"]())
    answer = function.invert(48.2)
    assert (answer.verdict, answer.value) == ("not_unique", None)
    turning = (-0.0019 + math.sqrt(0.0019**2 + 3 * 4e-6 * 0.0597)) / (3 * 4e-6)
    assert answer.turning_points == pytest.approx((turning,), rel=1e-9)
    assert len(answer.competing) == 2 and answer.competing[0] < turning < answer.competing[1]
    for flow in answer.competing:
        assert 48 + 0.0597 * flow - 0.0019 * flow**2 - 4e-6 * flow**3 == pytest.approx(48.2, abs=1e-9)
        assert f"{flow:.6g} m3/h" in answer.note
    assert f"{turning:.6g} m3/h" in answer.note


def test_the_response_at_an_end_that_is_taken_again_inside_is_not_unique(records, load):
    function = load(records["pump"]())
    answer = function.invert(function.record["response_at_ends"][0])
    assert answer.verdict == "not_unique"
    assert answer.competing == pytest.approx((0.0, pump_flow_at_shut_off_head()), abs=1e-6)


@pytest.mark.parametrize("step", [-4, 4])
def test_such_an_end_is_a_solution_also_where_this_machine_evaluates_it_a_few_last_places_off(step, records, load):
    record = records["pump"]()
    record["response_at_ends"][0] += step * math.ulp(48.0)
    answer = load(record).invert(record["response_at_ends"][0])
    assert (answer.verdict, answer.competing[0]) == ("not_unique", 0.0)


def test_below_the_shut_off_head_the_flow_is_unique(records, load):
    function = load(records["pump"]())
    flow = 80.0
    answer = function.invert(48 + 0.0597 * flow - 0.0019 * flow**2 - 4e-6 * flow**3)
    assert (answer.verdict, answer.value) == ("within_interval", pytest.approx(flow, rel=1e-9))


def test_above_the_largest_response_there_is_no_value(records, load):
    answer = load(records["pump"]()).invert(48.6)
    assert (answer.verdict, answer.value, answer.agrees_with_end) == ("not_evaluated", None, None)
    assert "does not take the response 48.6 m" in answer.note


def test_beyond_the_end_of_the_falling_branch_the_stimulus_is_above_range(records, load):
    function = load(records["pump"]())
    end = function.record["response_at_ends"][1]
    assert function.invert(end).value == pytest.approx(120.0)
    assert function.invert(math.nextafter(end, 0)).verdict == "above_range"


def test_a_level_function_is_not_inverted(records, load):
    function = load(records["of"](lambda x: 5.0 + 0 * x, 0.0, 10.0, 0, evaluation="direct"))
    assert function.convert(3.0).value == pytest.approx(5.0)
    answer = function.invert(function.record["response_at_ends"][0])
    assert (answer.verdict, answer.note) == (
        "not_evaluated",
        "the function is level: every stimulus of its interval gives this response",
    )


def test_where_the_slope_vanishes_no_value_is_given(records, load):
    record = records["rising"]()
    record["scaled"]["coefficients"] = [0.0, 0.75, 0.0, 0.25]  # u^3, level at u = 0
    record["covariance"] = (1e-6 * np.eye(4)).tolist()
    record["response_at_ends"] = [-1.0, 1.0]
    record["test_vectors"] = [{"stimulus": 5.0, "response": 0.0, "verdict": "within_interval"}]
    answer = load(record).convert(0.0)
    assert (answer.verdict, answer.value) == ("not_evaluated", None)
    assert load(record).convert(0.001).value == pytest.approx(5.5)


@pytest.mark.parametrize(("weighting", "power"), [("inverse_stimulus", 0.5), ("inverse_stimulus_squared", 1.0)])
def test_relative_weights_make_the_spread_grow_with_the_stimulus(weighting, power, records, load):
    settings = {"weighting": weighting, "weight_scale": 0.25, "covariance": np.zeros((3, 3)).tolist()}
    function = load(records["rising"](**settings))
    for stimulus in (2.0, 8.0):
        answer = function.convert(4 + 1.6 * stimulus + 0.002 * stimulus**2)
        expected = 0.005 * 0.25 * stimulus**power / (1.6 + 0.004 * stimulus)
        assert answer.standard_uncertainty == pytest.approx(expected, rel=1e-9)


def analysis(records, fall):
    """A thermometer: temperature from the logarithm of a resistance; the response falls as the stimulus rises."""
    sign = -1 if fall else 1
    record = records["of"](lambda y: 20 + sign * (10 * y + 0.5 * y**2), -2.0, 2.0, 2)
    stimuli = sorted(20 + sign * (10 * y + 0.5 * y**2) for y in (-2.0, 2.0))
    ends = [2.0, -2.0] if fall else [-2.0, 2.0]
    vectors = [
        {"stimulus": vector["response"], "response": vector["stimulus"], "verdict": vector["verdict"]}
        for vector in record["test_vectors"]
    ]
    units = {"stimulus": record["response"], "response": record["stimulus"]}
    return {
        **record,
        **units,
        "function": "analysis",
        "measuring_interval": stimuli,
        "response_at_ends": ends,
        "test_vectors": vectors,
    }


@pytest.mark.parametrize("fall", [False, True])
def test_an_analysis_function_is_evaluated_for_the_stimulus_and_inverted_for_the_response(fall, records, load):
    function = load(analysis(records, fall))
    expected = 20 + (-1 if fall else 1) * (10 * 1.2 + 0.5 * 1.2**2)
    answer = function.convert(1.2)
    assert (answer.verdict, answer.value) == ("within_interval", pytest.approx(expected, rel=1e-12))
    assert answer.standard_uncertainty >= 0.005  # of the fitted quantity: no slope enters
    back = function.evaluate(expected)
    assert (back.verdict, back.value) == ("within_interval", pytest.approx(1.2, rel=1e-9))
    high, low = (math.nextafter(2.0, 3), math.nextafter(-2.0, -3))
    assert function.convert(high).verdict == ("below_range" if fall else "above_range")
    assert function.convert(low).verdict == ("above_range" if fall else "below_range")
    assert function.convert(high).agrees_with_end is True
    # Half the prediction interval is one of the stimulus; the slope at the end is 12, all three basis functions are 1
    half = 2.228139 * math.sqrt(3e-6 + 0.004**2 + 0.003**2) / 12
    assert function.convert(2.0 + 0.999 * half).agrees_with_end is True
    assert function.convert(2.0 + 1.001 * half).agrees_with_end is False


def test_the_order_of_the_stored_ends_of_an_analysis_function_does_not_matter(records, load):
    record = analysis(records, fall=True)
    record["response_at_ends"].reverse()
    assert load(record).convert(2.5).verdict == "below_range"


def test_fixed_points_are_kept(records, load):
    """Through (0, 4): 4 + u-weighted free part; numbers by hand from the definition of the basis."""
    record = records["rising"]()
    record["scaled"]["fixed_points"] = [[0.0, 4.0]]
    record["scaled"]["coefficients"] = [8.0]  # 4 + (u + 1) * 8 = 4 + 1.6 x
    record["covariance"] = [[1e-6]]
    record["response_at_ends"] = [4.0, 20.0]
    record["test_vectors"] = [{"stimulus": 5.0, "response": 12.0, "verdict": "within_interval"}]
    function = load(record)
    assert function.convert(8.0).value == pytest.approx(2.5)
    assert function.convert(4.0).value == 0.0


def test_loading_names_the_file_that_is_missing(tmp_path):
    with pytest.raises(InputError, match="nowhere.json: does not exist"):
        load_function(tmp_path / "nowhere.json")
