"""A study proposed from a data file passes the loader and the reader, and says what it guessed."""

from __future__ import annotations

import numpy as np
import pytest

from fitlib.errors import InputError
from fitlib.observations import check_observations
from fitlib.observations.run_columns import words
from fitlib.start import propose_study, write_new
from fitlib.start.headers import split_unit
from fitlib.start.proposal import study_name
from fitlib.start.writing import scalar, support, within
from fitlib.study import load_study


def table(header, rows, mark=",", decimal="."):
    lines = [mark.join(str(cell).replace(".", decimal) for cell in row) for row in rows]
    return mark.join(header) + "\n" + "\n".join(lines) + "\n"


def scattered():
    rng = np.random.default_rng(20260401)
    return [
        (run, round(level + 0.005 * rng.normal(), 4), round(4 + 1.6 * level + 0.01 * rng.normal(), 4))
        for run in (1, 2, 3)
        for level in range(11)
    ]


FILES = {
    "exact levels, named columns": table(
        ["level_m", "current_mA", "run", "way"],
        [(x, 4 + 1.6 * x + 0.001 * run, run, way) for run, way in ((1, "up"), (2, "down")) for x in range(9)],
    ),
    "setting scatter": table(["run", "reference [kPa]", "reading (V)"], scattered()),
    "semicolons, decimal commas, names that say nothing": table(
        ["a", "b"], [(0.5 * n, 20.25 - 0.7 * n) for n in range(7) for _ in range(3)], ";", ","
    ),
    "nominal beside actual, tabs": table(
        ["nominal_N", "actual_N", "deflection", "time"],
        [(x, x + 0.013 * k + 0.001 * x, 2 * x + k, 100 * k + x) for k in range(3) for x in range(0, 60, 10)],
        "\t",
    ),
    "blocks without a named series, quotes, trailing column": table(
        ["#", "p / kPa", "U in mV", "who", '"x, extra"'],
        [(n, x, 3 * x + 0.01 * n, who, "") for n, (who, x) in enumerate((w, x) for w in "AB" for x in range(5))],
    ),
    "four levels": table(["x", "y"], [(x, 2 * x + 1) for x in range(4)]),
    "two levels, hard names": table(["yes", "no: way #1"], [(0, 1), (5, 9)]),
    "nothing repeats, nothing gathers": table(
        ["run", "x", "y"],
        [(run, round(x, 4), round(3 * x, 4)) for run in (1, 2) for x in np.random.default_rng(run).random(9)],
    ),
    "decimal commas in quotes": 'x,y\n"0,5","1,5"\n"1,5","2,5"\n"2,5","4,5"\n',
}


@pytest.fixture
def folder(tmp_path, monkeypatch):
    monkeypatch.chdir(tmp_path)
    return tmp_path


def propose(folder, text, name="Batch 7.csv"):
    data = text if isinstance(text, bytes) else text.encode("utf-8")
    (folder / name).write_bytes(data)
    proposed = propose_study(name)
    assert (folder / name).read_bytes() == data, "the data file is only read"
    write_new(proposed, "study.yaml")
    study = load_study("study.yaml")
    return proposed, study


@pytest.mark.parametrize("kind", FILES)
def test_a_proposal_passes_the_loader_and_the_reader_unchanged(folder, kind):
    _, study = propose(folder, FILES[kind])
    problems, (observations,) = check_observations(study)
    assert [problem for problem in problems if problem.severity == "error"] == []
    assert set(observations.state) == {"used"}
    assert len(observations.row) == FILES[kind].count("\n") - 1
    assert study.datasets[0].files == ("Batch 7.csv",)


def test_columns_series_direction_and_units_are_taken_from_names(folder):
    text, study = propose(folder, FILES["exact levels, named columns"])
    columns = study.datasets[0].columns
    assert (columns.stimulus, columns.response, columns.series, columns.direction) == (
        "level_m",
        "current_mA",
        "run",
        "way",
    )
    assert (study.stimulus.quantity, study.stimulus.unit) == ("level", "m")
    assert (study.response.quantity, study.response.unit) == ("current", "mA")
    assert "18 rows, 9 levels from 0 to 8, 2 series" in text
    assert "stimulus: level_m  # by its name (sure)" in text
    assert study.families[0].degrees == (1, 2, 3, 4, 5)
    schemes = [scheme.scheme for scheme in study.validation]
    assert schemes == ["leave_one_level_out", "leave_one_series_out", "leave_one_out", "bootstrap"]
    assert (study.selection.rule, study.selection.loss) == ("supported_gain", "leave_one_level_out")


def test_setting_scatter_gives_a_level_tolerance_to_be_checked(folder):
    text, study = propose(folder, FILES["setting scatter"])
    assert 0.02 < study.datasets[0].level_tolerance < 0.95
    assert "CHECK: 33 distinct stimulus values form 11 groups" in text
    assert (study.stimulus.unit, study.response.unit) == ("kPa", "V")


def test_behaviour_decides_where_names_say_nothing(folder):
    text, study = propose(folder, FILES["semicolons, decimal commas, names that say nothing"])
    dataset = study.datasets[0]
    assert (dataset.delimiter, dataset.decimal) == ("semicolon", "comma")
    assert dataset.columns.stimulus == "a"
    assert "stimulus: a  # CHECK: it has the fewest distinct values (a guess, please check)" in text
    assert 'unit: "1"}  # CHECK: unit to be filled in' in text
    assert "the response falls with it" in text
    assert [scheme.scheme for scheme in study.validation] == ["leave_one_level_out", "leave_one_out"]


def test_the_column_with_few_repeated_values_is_the_stimulus_wherever_it_stands(folder):
    rng = np.random.default_rng(20260401)
    rows = [(round(5 * level + rng.normal(), 5), level) for _ in range(4) for level in range(6)]
    text, study = propose(folder, table(["p", "q"], rows))
    assert (study.datasets[0].columns.stimulus, study.datasets[0].columns.response) == ("q", "p")
    assert "(fairly sure)" in text


def test_a_nominal_column_becomes_the_level_beside_the_actual_stimulus(folder):
    _, study = propose(folder, FILES["nominal beside actual, tabs"])
    columns = study.datasets[0].columns
    assert (columns.stimulus, columns.level, columns.response) == ("actual_N", "nominal_N", "deflection")
    assert study.datasets[0].level_tolerance is None


def test_blocks_of_rows_are_taken_for_series_as_a_guess(folder):
    text, study = propose(folder, FILES["blocks without a named series, quotes, trailing column"])
    assert study.datasets[0].columns.series == "who"
    assert "series: who  # CHECK: its rows come in blocks" in text
    assert study.datasets[0].columns.stimulus == "p / kPa"


def test_a_counter_of_readings_is_not_taken_for_the_response(folder):
    rows = [(x, reading, 4 + 1.6 * x + 0.01 * reading) for x in range(6) for reading in (1, 2)]
    _, study = propose(folder, table(["level", "reading", "current"], rows))
    assert study.datasets[0].columns.response == "current"


@pytest.mark.parametrize(
    ("levels", "expected"), [(2, (1, 2)), (4, (1, 2)), (5, (1, 3)), (6, (2, 3)), (9, (5, 3)), (30, (6, 3))]
)
def test_the_highest_degree_leaves_degrees_of_freedom(levels, expected):
    highest, freedom = support(levels)
    assert (highest, freedom) == expected
    assert levels < 4 or levels - (highest + 1) >= freedom


def test_rows_that_cannot_be_read_are_told_and_left_to_the_check(folder):
    text, study = propose(folder, "x,y\n" + "".join(f"{n},{2 * n}\n" for n in range(8)) + "8,NA\n9\n")
    assert "CHECK: 2 rows cannot be read as numbers" in text
    problems, _ = check_observations(study)
    assert [problem.line for problem in problems if problem.severity == "error"] == [10, 11]


@pytest.mark.parametrize(
    ("data", "told"),
    [
        (b"", "the file is empty"),
        (b"x,y\n", "a header line only"),
        (b"x,note\n1,a\n2,b\n", 'two columns of numbers are needed, stimulus and response; only "x" found'),
        (b"x,y\n1,2\n1,3\n", "fewer than two levels"),
        (b"x,y,x\n1,2,3\n", 'column name "x" occurs 2 times'),
        (b"x,y\n1,\xff\n", "is not UTF-8 text"),
        (b"0,4.1\n1,5.2\n2,6.3\n", "the first row holds numbers and no names; a header row is expected"),
        (b"0;4,1\n1;5,2\n2;6,3\n", "the first row holds numbers and no names; a header row is expected"),
        (b"x" * 101 + b",y\n1,2\n2,3\n", "at most 100 characters long"),
    ],
)
def test_a_file_without_a_study_in_it_is_told_plainly(folder, data, told):
    (folder / "a.csv").write_bytes(data)
    with pytest.raises(InputError, match="a.csv") as caught:
        propose_study("a.csv")
    assert told in str(caught.value)


def test_a_file_that_does_not_exist_is_told_plainly(folder):
    with pytest.raises(InputError, match="no.csv: there is no such file"):
        propose_study("no.csv")


def test_an_existing_study_is_never_overwritten(folder):
    (folder / "study.yaml").write_text("mine")
    with pytest.raises(InputError, match="exists already and is left as it is"):
        write_new("other", "study.yaml")
    assert (folder / "study.yaml").read_text() == "mine"


def test_the_same_file_gives_the_same_text(folder):
    (folder / "a.csv").write_text(FILES["setting scatter"])
    assert propose_study("a.csv") == propose_study(folder / "a.csv")


def test_a_given_name_is_used_for_the_study(folder):
    (folder / "a.csv").write_text(FILES["four levels"])
    assert 'study: "spring-batch"' in propose_study("a.csv", name="Spring Batch")


@pytest.mark.parametrize(
    ("text", "name"), [("Änderung 3", "anderung-3"), ("--", "study"), ("a" * 99, "a" * 60), ("水位", "study")]
)
def test_any_text_makes_a_name_that_the_format_allows(text, name):
    assert study_name(text) == name


@pytest.mark.parametrize(
    ("header", "quantity", "unit"),
    [
        ("level_m", "level", "m"),
        ("current_mA", "current", "mA"),
        ("pressure [kPa]", "pressure", "kPa"),
        ("Pressure (hPa)", "Pressure", "hPa"),
        ("p / kPa", "p", "kPa"),
        ("U in mV", "U", "mV"),
        ("temp_degC", "temp", "°C"),
        ("ratio [-]", "ratio", "1"),
        ("run_a", "run a", None),
        ("level", "level", None),
        ("[m]", "[m]", "m"),
        ("x []", "x", None),
    ],
)
def test_units_are_taken_from_headers_only_where_they_are_written(header, quantity, unit):
    assert split_unit(header) == (quantity, unit)


def test_names_are_split_into_words():
    assert words("refLevel_m2 [kPa]") == {"ref", "level", "m", "k", "pa"}


@pytest.mark.parametrize(("text", "yaml"), [("run", "run"), ("no", '"no"'), ("a: b", '"a: b"'), ("1", '"1"')])
def test_text_that_yaml_could_misread_is_quoted(text, yaml):
    assert scalar(text) == yaml


def strayed():
    """Three runs over nine levels, twice each; three of the set values are a little off."""
    off = {5: 0.02, 30: -0.01, 50: 0.03}
    rows = [(2 * level, 4 + 1.6 * level + 0.001 * k, run) for run in (1, 2, 3) for level in range(9) for k in (0, 1)]
    return [(round(x + off.get(n, 0), 2), round(y, 4), run) for n, (x, y, run) in enumerate(rows)]


def test_set_values_that_stray_give_a_level_tolerance_that_restores_the_levels(folder):
    text, study = propose(folder, table(["level_m", "current_mA", "run"], strayed()))
    assert "CHECK: 3 rows set beside a level that other rows meet exactly, at most 0.03 off (9 levels)" in text
    assert "not needed" not in text and 0.03 < study.datasets[0].level_tolerance < 1.9
    _, (observations,) = check_observations(study)
    assert observations.level_index.max() == 8 and observations.notes == ()


def test_the_interval_proposed_is_that_of_the_levels_and_can_be_taken_as_it_stands(folder):
    text, study = propose(folder, table(["run", "reference [kPa]", "reading (V)"], scattered()))
    line = next(line for line in text.splitlines() if "# measuring_interval: [" in line)
    assert line.endswith("# the default: from the first to the last level; never wider")
    _, (observations,) = check_observations(study)
    levels = np.unique(observations.level)
    low, high = (float(end) for end in line.split("[")[1].split("]")[0].split(","))
    assert levels[0] <= low < levels[0] + 1e-5 and levels[-1] - 1e-4 < high <= levels[-1]


@pytest.mark.parametrize(
    ("low", "high", "expected"),
    [
        (0.0, 10.0, ("0", "10")),
        (1.0000004, 2.0000006, ("1.0000004", "2")),
        (1234567.0, 7654321.0, ("1.23457e+06", "7.65432e+06")),
        (1234563.0, 7654326.0, ("1234563.0", "7654326.0")),
    ],
)
def test_ends_are_shortened_inwards_only(low, high, expected):
    shown = within(low, high)
    assert low <= float(shown[0]) and float(shown[1]) <= high
    assert shown == expected
