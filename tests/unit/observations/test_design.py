"""What a person may want to change before a run: warnings of the check, none of them an error."""

import pytest

from fitlib.observations import check_observations
from fitlib.study import load_study

COLUMNS = "stimulus: x, response: y, series: run"


def rows(levels=range(9), runs=(1, 2, 3), leave=()):
    """A table in which every run meets every level once, but for the (run, level) left out."""
    lines = [f"{level},{4 + level}.{run},{run}" for run in runs for level in levels if (run, level) not in leave]
    return "\n".join(["x,y,run", *lines]) + "\n"


@pytest.fixture
def warnings(load):
    """Warnings on the data of a study that has no faults."""

    def run(text, extra="", columns=COLUMNS):
        found, readable = check_observations(load({"a.csv": text}, extra, columns))
        assert len(readable) == 1 and {problem.severity for problem in found} <= {"warning"}
        return found

    return run


def test_a_sound_design_is_not_warned_of(warnings):
    assert warnings(rows()) == []


@pytest.mark.parametrize(("level", "word"), [(0, "first"), (8, "last")])
def test_an_end_that_rests_on_one_series_is_told(warnings, level, word):
    (found,) = warnings(rows(leave=[(1, level), (3, level)]))
    assert found.message.startswith(f'dataset "A-1": the {word} level, {level}, rests on 1 observation of one series')
    assert found.message.endswith("it sets the measuring interval")


def test_an_end_that_rests_on_one_observation_is_told(warnings):
    text = "x,y\n" + "".join(f"{level},{level}.{n}\n" for n in range(2) for level in range(9 - n))
    (found,) = warnings(text, columns="stimulus: x, response: y")
    assert "the last level, 8, rests on one observation, where other levels have several" in found.message


def test_an_end_outside_the_declared_interval_does_not_set_it(warnings):
    assert warnings(rows(leave=[(1, 8), (3, 8)]), "measuring_interval: [0, 7]") == []


def test_levels_read_once_each_have_no_weak_end(warnings):
    assert warnings(rows(runs=(1,))) == []


@pytest.mark.parametrize("name", ["run", "who"])
def test_a_column_that_looks_like_a_run_is_pointed_at(warnings, name):
    text = rows().replace("x,y,run", f"x,y,{name}")
    (found,) = warnings(text, columns="stimulus: x, response: y")
    assert found.key == "datasets[0].columns" and f'column "{name}" looks like the number of a run' in found.message


def test_a_column_is_no_run_where_no_level_repeats_or_it_runs_on(warnings):
    columns = "stimulus: x, response: y"
    assert warnings(rows(runs=(1,)), columns=columns) == []
    lines = rows().splitlines()
    counter = "\n".join(["x,y,n", *(f"{line.rsplit(',', 1)[0]},{n}" for n, line in enumerate(lines[1:]))]) + "\n"
    assert warnings(counter, columns=columns) == []


@pytest.mark.parametrize(("levels", "told"), [(6, True), (7, False)])
def test_fewer_than_seven_levels_are_told(warnings, levels, told):
    messages = [problem.message for problem in warnings(rows(range(levels)))]
    expected = f'dataset "A-1": {levels} levels are used; with fewer than 7 a verdict may be not_evaluated'
    assert (expected in messages) == told


def degrees(load, tmp_path, degree, levels):
    load({"a.csv": rows(range(levels))}, columns=COLUMNS)
    path = tmp_path / "bench" / "study.yaml"
    path.write_text(path.read_text().replace("degree: 1..2", f"degree: {degree}"))
    found, _ = check_observations(load_study("bench/study.yaml"))
    return [problem for problem in found if problem.key == "families"]


def test_candidates_that_the_levels_cannot_support_are_told_together(load, tmp_path):
    (found,) = degrees(load, tmp_path, "1..7", 9)  # eight parameters and three degrees of freedom are eleven levels
    wanted = "polynomial-6 needs at least 10 levels, polynomial-7 11; with 9 levels they cannot be chosen"
    assert found.message == f'dataset "A-1": {wanted}'
    (found,) = degrees(load, tmp_path, "6", 9)
    assert found.message == 'dataset "A-1": polynomial-6 needs at least 10 levels; with 9 levels it cannot be chosen'
    (found,) = degrees(load, tmp_path, "1..12", 9)
    assert "polynomial-8 12 and 4 others more; with 9 levels they" in found.message
    assert degrees(load, tmp_path, "1..5", 9) == []


def test_a_fixed_point_needs_one_level_less(load, tmp_path):
    assert degrees(load, tmp_path, "6, fixed_points: [[0, 4]]", 9) == []


@pytest.mark.parametrize(("kept", "told"), [("{run: 1}", False), ("{x: 1}", False)])
def test_few_verification_points_are_not_told(warnings, kept, told):
    assert warnings(rows(), f"verification_points: {{where: {kept}}}") == []


def test_half_of_the_observations_kept_for_verification_are_told(warnings):
    text = rows(runs=(1, 2))
    (found,) = warnings(text, "verification_points: {where: {run: 2}}")
    assert found.key == "datasets[0].verification_points"
    assert "9 of 18 observations are kept as verification points, 9 are used; is that meant?" in found.message


def test_the_same_advice_on_many_datasets_is_one_warning(load, tmp_path):
    load({"a.csv": rows(range(6))}, columns=COLUMNS)
    for number in range(7):
        (tmp_path / "bench" / f"b{number}.csv").write_text(rows(range(6)))
    path = tmp_path / "bench" / "study.yaml"
    text = path.read_text().replace("  - id: A-1\n    files: [a.csv]\n", '  - ids_from: "b*.csv"\n')
    path.write_text(text)
    (found,) = check_observations(load_study("bench/study.yaml"))[0]
    assert found.message.startswith('datasets "b0", "b1", "b2", "b3", "b4" and 2 more: 6 levels are used')


def test_faults_are_told_without_advice(load):
    found, _ = check_observations(load({"a.csv": rows(range(5)) + "x,y,1\n"}, columns=COLUMNS))
    assert not any("levels are used" in problem.message for problem in found)
