"""Analysis functions: the stimulus fitted over the response."""

import numpy as np
import pytest


def _by_name(result):
    return {item["candidate"]: item for item in result["candidates"]}


class TestAnalysisFunction:
    """Stimulus from response, as for a thermistor: folds are still by stimulus level."""

    @pytest.fixture
    def thermistor(self, made):
        rng = np.random.default_rng(4)
        temperature = np.repeat(np.linspace(-20, 80, 11), 3)
        log_r = 9.0 - 0.045 * temperature + 7e-5 * temperature**2 + rng.normal(0, 2e-4, 33)
        return made.observations(temperature, log_r, np.tile([1, 2, 3], 11))

    def test_levels_are_those_of_the_stimulus(self, made, thermistor):
        result = made.run(
            made.study(
                function="analysis", validation=("leave_one_level_out", "leave_one_series_out", "leave_one_out")
            ),
            thermistor,
        )
        assert len(result["schemes"][0]["folds"]) == 11
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
