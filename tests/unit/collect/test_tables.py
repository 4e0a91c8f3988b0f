"""Tables: every row there, every column explained, every digit kept."""

import copy
import csv
import io
import json
import random

import pytest

from fitlib.collect import build_tables

NAMES = {
    "account.csv",
    "candidates.csv",
    "chosen.csv",
    "coefficients.csv",
    "columns.csv",
    "components.csv",
    "datasets.csv",
    "folds.csv",
    "levels.csv",
    "observations.csv",
    "record.csv",
    "schemes.csv",
    "verification.csv",
}

DESIGN = {
    "observations.csv": "dataset file row series level stimulus response state reason fitted residual leverage"
    " studentized_residual flag",
    "candidates.csv": "dataset family candidate parameters degrees_of_freedom residual_sum_of_squares"
    " residual_standard_deviation aicc bic condition_number monotone loss_leave_one_level_out"
    " loss_leave_one_level_out_se loss_leave_one_level_out_interior loss_bootstrap loss_bootstrap_se bootstrap_share"
    " eligible chosen reason fitted_point_loss aicc_levels bic_levels lack_of_fit_f lack_of_fit_p"
    " lack_of_fit_numerator_df lack_of_fit_denominator_df excursion_stimulus turning_points misfit",
    "chosen.csv": "dataset candidate verdict choice runner_up margin loss outer_loss outer_loss_interior lack_of_fit_f"
    " lack_of_fit_p largest_residual verdict_reason choice_reason threshold interior_candidate",
    "coefficients.csv": "dataset candidate basis term estimate standard_uncertainty",
    "folds.csv": "dataset candidate scheme fold loss",
    "components.csv": "dataset component value value_evaluated",
    "datasets.csv": "dataset file_name levels used interval_lower interval_upper stimulus_unit response_unit",
    "columns.csv": "table column unit meaning",
}


def read(text):
    return list(csv.DictReader(io.StringIO(text, newline=""), strict=True))


@pytest.fixture
def bundle(synthetic):
    return synthetic.make_bundle()


@pytest.fixture
def tables(bundle):
    return build_tables(bundle)


def test_the_tables_are_those_of_the_contract(tables):
    assert set(tables) == NAMES


@pytest.mark.parametrize("name", DESIGN)
def test_a_table_has_the_columns_of_the_design(tables, name):
    header = tables[name].split("\n", 1)[0].split(",")
    assert set(DESIGN[name].split()) <= set(header)
    assert len(header) == len(set(header))


def test_every_column_of_every_table_is_explained_once(tables):
    told = [(row["table"], row["column"]) for row in read(tables["columns.csv"])]
    headers = [(name, column) for name, text in tables.items() for column in text.split("\n", 1)[0].split(",")]
    assert sorted(told) == sorted(headers)
    assert all(row["meaning"].endswith(".") and row["type"] for row in read(tables["columns.csv"]))


def test_a_number_has_a_unit_and_a_word_has_none(tables):
    for row in read(tables["columns.csv"]):
        if row["type"] in ("number", "whole_number"):
            assert row["unit"], row
        elif row["column"] != "turning_points":
            assert not row["unit"], row


def test_units_follow_the_study(tables):
    units = {(row["table"], row["column"]): row["unit"] for row in read(tables["columns.csv"])}
    assert units["observations.csv", "stimulus"] == "m"
    assert units["observations.csv", "residual"] == "mA"
    assert units["candidates.csv", "loss_leave_one_level_out"] == "mA²"
    assert units["candidates.csv", "misfit"] == "m"
    assert units["coefficients.csv", "centre"] == "m"


def test_units_that_differ_between_datasets_point_to_the_table_of_datasets(bundle):
    bundle["results"][1]["settings"]["fitted"]["unit"] = "K"
    units = {(row["table"], row["column"]): row["unit"] for row in read(build_tables(bundle)["columns.csv"])}
    assert units["observations.csv", "residual"] == "fitted_unit of datasets.csv"


@pytest.mark.parametrize(
    "unit, square", [("mA", "mA²"), ("°C", "°C²"), ("m/s", "(m/s)²"), ("(none)", "(none)²"), ("1", "1"), ("", "")]
)
def test_a_unit_is_squared_without_doubt(bundle, unit, square):
    for result in bundle["results"]:
        result["settings"]["fitted"]["unit"] = unit
    rows = read(build_tables(bundle)["columns.csv"])
    assert next(row["unit"] for row in rows if row["column"] == "outer_loss") == square


def test_rows_are_ordered_by_id_and_then_as_the_study_says(synthetic):
    results = [synthetic.make_result(name) for name in ("b", "C", "a-2", "a-10")]
    rows = read(build_tables(synthetic.make_bundle(results))["candidates.csv"])
    pairs = [(row["dataset"], row["candidate"]) for row in rows]
    names = ["a-10", "a-2", "b", "C"]
    assert pairs == [(name, f"polynomial-{degree}") for name in names for degree in (1, 2)]


def test_the_order_of_results_does_not_change_a_byte(synthetic):
    results = [synthetic.make_result(name) for name in ("b", "C", "a")]
    study = synthetic.make_study(["a", "b", "C"])
    first = build_tables(synthetic.make_bundle(results, study=study))
    random.Random(1).shuffle(results)
    assert build_tables(synthetic.make_bundle(results[::-1], study=study)) == first


def test_numbers_come_back_with_every_digit(bundle):
    value = 0.1 + 0.2
    bundle["results"][0]["observations"]["response"][3] = value
    cell = read(build_tables(bundle)["observations.csv"])[3]["response"]
    assert cell == repr(value) and float(cell) == value


def test_whole_numbers_from_the_study_are_written_as_numbers(tables):
    row = read(tables["datasets.csv"])[0]
    assert (row["interval_lower"], row["interval_upper"]) == ("0.0", "10.0")
    assert row["target_coverage_factor"] == "2.0"


def test_none_is_an_empty_cell_and_truth_is_a_word(tables):
    row = read(tables["candidates.csv"])[0]
    assert row["aicc_levels"] == ""
    assert (row["monotone"], row["chosen"]) == ("true", "true")
    assert read(tables["candidates.csv"])[1]["chosen"] == "false"


def test_every_observation_has_a_row(bundle, tables):
    rows = read(tables["observations.csv"])
    assert len(rows) == sum(len(result["observations"]["row"]) for result in bundle["results"])
    assert [row["state"] for row in rows if row["dataset"] == "TG-1"][-1] == "verification"
    account = read(tables["account.csv"])
    assert sum(int(row["read"]) for row in account) == len(rows)


def test_a_candidate_that_was_not_fitted_keeps_its_row_and_has_no_coefficients(bundle):
    item = bundle["results"][0]["candidates"][1]
    empty = {"status": "not_fitted", "message": "Too few levels.", "terms": [], "scaled": None, "losses": {}}
    item.update(empty, lack_of_fit=None, excursion=None, serial=None, turning_points=None, monotone=None)
    tables = build_tables(bundle)
    row = read(tables["candidates.csv"])[1]
    assert (row["status"], row["message"], row["loss_bootstrap"]) == ("not_fitted", "Too few levels.", "")
    names = {(row["dataset"], row["candidate"]) for row in read(tables["coefficients.csv"])}
    assert ("TG-1", "polynomial-2") not in names and ("TG-2", "polynomial-2") in names


def test_coefficients_are_given_in_both_bases(tables):
    rows = [row for row in read(tables["coefficients.csv"]) if row["dataset"] == "TG-1"]
    terms = [(row["candidate"], row["basis"], row["term"]) for row in rows]
    assert terms[:4] == [
        ("polynomial-1", "power", "x^0"),
        ("polynomial-1", "power", "x^1"),
        ("polynomial-1", "scaled", "T0"),
        ("polynomial-1", "scaled", "T1"),
    ]
    scaled = [row for row in rows if row["basis"] == "scaled"]
    assert scaled[0]["standard_uncertainty"] == repr(0.002)  # root of the covariance of the issued function
    assert scaled[2]["standard_uncertainty"] == ""
    assert {row["centre"] for row in scaled} == {"5.0"}
    assert {(row["candidate"], row["verdict"]) for row in rows} == {("polynomial-1", "adequate"), ("polynomial-2", "")}


def test_fixed_points_stand_beside_the_scaled_coefficients(bundle):
    bundle["results"][0]["candidates"][0]["scaled"]["fixed_points"] = [[0, 4], [10.0, 20.5]]
    rows = read(build_tables(bundle)["coefficients.csv"])
    assert rows[2]["fixed_points"] == "0.0 : 4.0; 10.0 : 20.5"


def test_losses_of_each_scheme_have_their_own_columns(tables):
    row = read(tables["candidates.csv"])[1]
    assert row["loss_leave_one_level_out"] == "0.0004"
    assert row["loss_leave_one_level_out_se"] == "3e-05"
    assert row["loss_leave_one_level_out_interior"] == "0.00015"
    assert row["loss_bootstrap_rank_deficient_draws"] == "3"
    assert row["outer_choices"] == "0"


def test_a_scheme_that_did_not_apply_keeps_its_row(bundle):
    scheme = bundle["results"][0]["schemes"][0]
    scheme.update(status="not_evaluated", message="One series only.", folds=[], level_losses={})
    row = read(build_tables(bundle)["schemes.csv"])[0]
    assert (row["status"], row["message"], row["folds"]) == ("not_evaluated", "One series only.", "0")


def test_folds_show_failed_fits_as_empty_losses(tables):
    rows = [row for row in read(tables["folds.csv"]) if row["dataset"] == "TG-1"]
    assert len(rows) == 2 * 5 * 2
    assert rows[0]["loss"] == "0.0001" and rows[1]["loss"] == ""
    assert {row["draws"] for row in rows} == {"", "70"}


def test_levels_show_the_loss_of_the_chosen_candidate(tables):
    rows = read(tables["levels.csv"])
    assert [row["loss_leave_one_level_out"] for row in rows[:5]] == [repr(0.0001 * (k + 1)) for k in range(5)]


def test_the_choice_carries_reasons_and_cautions(tables):
    row = read(tables["chosen.csv"])[0]
    assert row["verdict_reason"] == "No smooth misfit."
    assert row["cautions"] == "Use inside the interval only. | Local codes come first."
    assert row["uncertainty_statement"].startswith("fit-only")
    assert row["largest_residual"] == "-0.01" and row["largest_residual_row"] == "3"


def test_lack_of_fit_within_series_stands_beside_the_other(bundle):
    item = bundle["results"][0]["candidates"][0]
    item["lack_of_fit_within_series"] = dict(item["lack_of_fit"], f=2.5, p=0.0625)
    bundle["results"][1]["candidates"][0]["lack_of_fit_within_series"] = None
    tables = build_tables(bundle)
    for name, step in (("candidates.csv", 2), ("chosen.csv", 1)):
        rows = read(tables[name])
        assert (rows[0]["lack_of_fit_within_series_f"], rows[0]["lack_of_fit_within_series_p"]) == ("2.5", "0.0625")
        assert (rows[0]["lack_of_fit_f"], rows[step]["lack_of_fit_within_series_f"]) == ("1.125", "")


@pytest.mark.parametrize(("met", "cell"), [(True, "true"), (False, "false"), (None, "")])
def test_the_target_and_the_largest_uncertainty_are_in_the_choice(bundle, met, cell):
    largest = {"value": 0.0125, "at": 7.5}
    bundle["results"][0]["selection"].update(target_met=met, largest_expanded_uncertainty=largest)
    rows = read(build_tables(bundle)["chosen.csv"])
    assert rows[0]["target_met"] == cell
    assert rows[0]["largest_expanded_uncertainty"] == "0.0125" and rows[0]["largest_expanded_uncertainty_at"] == "7.5"
    assert rows[1]["target_met"] == rows[1]["largest_expanded_uncertainty"] == ""


def test_verification_points_stand_with_their_prediction_interval(bundle):
    point = {"prediction_lower": 8.75, "prediction_upper": 8.8125, "within_prediction_interval": True}
    bundle["results"][0]["verification"][0].update(point)
    rows = read(build_tables(bundle)["verification.csv"])
    assert [rows[0][name] for name in point] == ["8.75", "8.8125", "true"]
    assert [rows[1][name] for name in point] == ["", "", ""]


def test_a_dataset_without_any_fit_is_in_every_list(bundle):
    result = bundle["results"][0]
    selection = {"candidate": None, "verdict": "not_evaluated", "choice": None, "runner_up": None, "margin": None}
    result["selection"].update(selection, largest_residual=None, components=None, loss=None, outer_choices=None)
    result["function"] = None
    for item in result["candidates"]:
        item["chosen"] = False
    tables = build_tables(bundle)
    assert read(tables["chosen.csv"])[0]["verdict"] == "not_evaluated"
    assert read(tables["datasets.csv"])[0]["function_file"] == ""
    assert {row["dataset"] for row in read(tables["components.csv"])} == {"TG-2"}


def test_a_failed_dataset_is_named_with_its_reason(synthetic):
    study = synthetic.make_study(["TG-1", "TG-2"])
    failures = [{"dataset": "TG-2", "message": "The fit stopped."}]
    tables = build_tables(synthetic.make_bundle([synthetic.make_result("TG-1")], failures, study))
    row = read(tables["datasets.csv"])[1]
    assert (row["dataset"], row["file_name"], row["failure"]) == ("TG-2", "TG-2", "The fit stopped.")
    assert read(tables["chosen.csv"])[1]["verdict"] == "not_evaluated"


def test_a_study_without_results_still_has_tables(synthetic):
    failures = [{"dataset": "TG-1", "message": "The fit stopped."}]
    tables = build_tables(synthetic.make_bundle([], failures, synthetic.make_study(["TG-1"])))
    assert tables["observations.csv"].count("\n") == 1
    assert read(tables["columns.csv"])


@pytest.mark.parametrize("name", ["=1+1", "../x", "<b>", "a;rm -rf b", "Füllstand Ω", "-5", "@x", 'a"b, c'])
def test_an_id_is_a_harmless_cell_that_can_be_read_back(synthetic, name):
    result = synthetic.make_result(name, file_name="d~0123456789abcdef")
    tables = build_tables(synthetic.make_bundle([result]))
    for table, text in tables.items():
        for row in read(text):
            if "dataset" in row:
                assert row["dataset"] == (f"'{name}" if name[0] in "=-@" else name), table


def test_an_entry_without_a_column_is_an_error_and_not_dropped(bundle):
    bundle["results"][0]["levels"][0]["surprise"] = 1
    with pytest.raises(ValueError, match="levels.csv: no column is declared for surprise"):
        build_tables(bundle)


@pytest.mark.parametrize("value", [float("nan"), float("inf"), "1.0", True])
def test_a_number_that_is_none_is_an_error(bundle, value):
    bundle["results"][0]["candidates"][0]["misfit"] = value
    with pytest.raises(ValueError, match="candidates.csv: misfit"):
        build_tables(bundle)


def test_results_that_went_through_json_give_the_same_bytes(bundle, tables):
    assert build_tables(json.loads(json.dumps(copy.deepcopy(bundle)))) == tables
