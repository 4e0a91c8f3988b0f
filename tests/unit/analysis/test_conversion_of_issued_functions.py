"""What is issued is what a conversion states: uncertainties of a converted value, by hand from the observations."""

import json

import numpy as np
import pytest

from fitlib.conversion import load_function

SETTING = np.repeat(np.linspace(1.0, 9.0, 9), 4)
RUN = np.tile([1, 1, 2, 2], 9)


@pytest.fixture
def issue(made, tmp_path):
    """Run a study in memory, write its function and read it back."""

    def act(study, observations):
        result = made.run(study, observations)
        path = tmp_path / "LC-1.json"
        path.write_text(json.dumps(result["function"], sort_keys=True))
        return result, load_function(path)

    return act


def _noise(seed, size, deviation):
    return np.random.default_rng(seed).normal(0.0, deviation, size)


def _pooled(residual, cells):
    """Variance within cells."""
    groups = [residual[cells == cell] for cell in np.unique(cells)]
    left = sum(group.size - 1 for group in groups)
    return sum(float(np.sum((group - group.mean()) ** 2)) for group in groups) / left


class TestWhatAveragingDivides:
    """One new observation scatters by the residual standard deviation; averaging divides its repeatability only."""

    DEVIATION = 0.01

    def _study(self, made):
        return made.study((made.family([1]),))

    def _line(self):
        return 0.5 + 0.04 * SETTING

    def test_scatter_beyond_repeatability_is_not_divided(self, made, issue):
        """Each series met each setting with a deviation of its own: its two readings agree better than two series."""
        pair = np.repeat(_noise(3, 18, self.DEVIATION), 2)
        y = self._line() + pair + _noise(4, 36, self.DEVIATION / 4)
        result, function = issue(self._study(made), made.observations(SETTING, y, RUN))
        (line,) = result["candidates"]
        parts = result["selection"]["components"]
        assert not parts["level_deviation_found"] and not parts["series_deviation_found"]

        residual = y - np.polynomial.Polynomial.fit(SETTING, y, 1)(SETTING)
        single = float(np.sum(residual**2)) / 34
        repeat = _pooled(residual, 10 * SETTING + RUN)
        assert repeat < single / 4
        record = function.record
        assert record["reading_standard_deviation"] == pytest.approx(np.sqrt(repeat), rel=1e-9)
        assert record["level_standard_deviation"] == pytest.approx(np.sqrt(single - repeat), rel=1e-9)
        assert line["residual_standard_deviation"] == pytest.approx(np.sqrt(single), rel=1e-9)

        design = np.stack([np.ones(36), SETTING], axis=1)
        for readings in (1, 4, 10_000):
            found = function.convert(0.5 + 0.04 * 3.3, readings)
            at = np.array([1.0, found.value])
            mean = single * float(at @ np.linalg.inv(design.T @ design) @ at)
            slope = np.polynomial.Polynomial.fit(SETTING, y, 1).convert().coef[1]
            expected = np.sqrt(mean + repeat / readings + single - repeat) / slope
            assert found.standard_uncertainty == pytest.approx(expected, rel=1e-9)

    def test_without_repeats_within_a_series_nothing_is_divided(self, made, issue):
        setting, run = np.tile(np.linspace(1.0, 9.0, 9), 4), np.repeat([1, 2, 3, 4], 9)
        y = 0.5 + 0.04 * setting + _noise(6, 36, self.DEVIATION)
        result, function = issue(self._study(made), made.observations(setting, y, run))
        parts = result["selection"]["components"]
        assert parts["repeatability"] is None
        assert not parts["level_deviation_found"] and not parts["series_deviation_found"]
        residual = y - np.polynomial.Polynomial.fit(setting, y, 1)(setting)
        record = function.record
        assert record["reading_standard_deviation"] == 0.0
        assert record["level_standard_deviation"] == pytest.approx(np.sqrt(np.sum(residual**2) / 34), rel=1e-9)
        one, many = (function.convert(0.6, readings).standard_uncertainty for readings in (1, 100))
        assert one == many


@pytest.mark.parametrize(("weighting", "power"), [("inverse_stimulus", 0.5), ("inverse_stimulus_squared", 1.0)])
def test_scatter_of_an_analysis_function_follows_the_stimulus(made, issue, weighting, power):
    """The abscissa is the response, from 100 down to 20 here, while the scatter grows with the stimulus."""
    response = 110.0 - 10.0 * SETTING
    stimulus = SETTING * (1 + _noise(11, 36, 0.002))
    study = made.study((made.family([1]),), function="analysis", weighting=weighting)
    observations = made.observations(stimulus, response, RUN, level=SETTING)
    result, function = issue(study, observations)
    record = function.record
    assert function.record["function"] == "analysis"
    assert result["selection"]["verdict"] == "adequate"

    weights = stimulus ** (-2 * power)
    weights /= weights.mean()
    design = np.stack([np.ones(36), response], axis=1)
    inverse = np.linalg.inv(design.T @ (weights[:, None] * design))
    fitted = design @ inverse @ design.T @ (weights * stimulus)
    single = float(np.sum(weights * (stimulus - fitted) ** 2)) / 34
    reading, level = record["reading_standard_deviation"], record["level_standard_deviation"]
    assert reading**2 + level**2 == pytest.approx(single, rel=1e-9)
    assert reading > 0

    scale = np.sqrt(np.mean(stimulus ** (-2 * power)))
    for given in (25.0, 60.0, 97.0):
        found = function.convert(given, 3)
        at = np.array([1.0, given])
        assert found.value == pytest.approx(float(at @ inverse @ design.T @ (weights * stimulus)), rel=1e-9)
        factor = found.value**power * scale
        expected = np.sqrt(single * float(at @ inverse @ at) + factor**2 * (reading**2 / 3 + level**2))
        assert found.standard_uncertainty == pytest.approx(expected, rel=1e-9)


def test_test_vectors_rise_with_the_stimulus_where_the_function_turns(made, issue):
    """An analysis function that is not monotone, over responses that fall with the stimulus."""
    response = 110.0 - 10.0 * SETTING
    scaled = (SETTING - 5) / 4
    stimulus = 5 + 4 * (2 * scaled**3 - scaled)  # rises, falls and rises again
    study = made.study(
        (made.family([2, 3]),), function="analysis", evaluation="direct", monotone=False, rule="smallest_loss"
    )
    result, _ = issue(study, made.observations(stimulus, response, RUN, level=SETTING))
    inside = [item for item in result["function"]["test_vectors"] if item["verdict"] == "within_interval"]
    stimuli, responses = ([item[key] for item in inside] for key in ("stimulus", "response"))
    assert len(inside) == 21
    assert stimuli == sorted(stimuli)
    assert responses not in (sorted(responses), sorted(responses)[::-1])
