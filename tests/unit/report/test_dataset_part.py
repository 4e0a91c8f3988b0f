"""The part of the report about one dataset."""

from __future__ import annotations

import pytest

from fitlib.report.candidates import candidates_table, fits_table, losses_table, shapes_table
from fitlib.report.front import front_part
from fitlib.report.function import function_part
from fitlib.report.observations import observations_part
from fitlib.report.quantities import Quantities
from fitlib.report.selection import selection_part
from fitlib.report.standing import choice_words, expanded_cell
from fitlib.report.table import MOST_ROWS


def text_of(table) -> list[list[str]]:
    """The texts of the cells of a table."""
    return [[cell.text for cell in row] for row in table.rows]


def chosen(result: dict) -> dict:
    """The entry of the chosen candidate."""
    return next(row for row in result["candidates"] if row["chosen"])


def test_coefficients_have_all_digits_and_their_units(result):
    part = function_part(result, Quantities(result))
    rows = text_of(part["coefficients"])
    assert [float(row[1]) for row in rows] == [term["estimate"] for term in chosen(result)["terms"]]
    assert [row[3] for row in rows][:3] == ["mA", "mA · m⁻¹", "mA · m⁻²"]
    assert part["equation"].startswith("loop current in mA = c0 + c1 · x + c2 · x^2")
    assert part["equation"].endswith("where x is water level in m.")


def test_an_analysis_function_gives_the_stimulus_from_the_response(result):
    result["settings"].update(function="analysis", fitted=result["settings"]["stimulus"])
    part = function_part(result, Quantities(result))
    assert part["equation"].startswith("water level in m = c0 + c1 · x")
    assert text_of(part["coefficients"])[1][3] == "m · mA⁻¹"


def test_band_and_interval_are_headed_apart_with_their_coverage_probability(result):
    heads = [column.text for column in function_part(result, Quantities(result))["points"].columns]
    assert "confidence band 0.95, lower / mA" in heads
    assert "prediction interval 0.95, upper / mA" in heads
    assert len(function_part(result, Quantities(result))["points"].rows) == 11


def test_without_a_choice_there_is_no_function(without_choice):
    assert function_part(without_choice, Quantities(without_choice)) is None


def test_losses_are_rounded_to_their_standard_error_in_sentences(result):
    row = chosen(result)
    row["losses"]["leave_one_level_out"].update(loss=2.7764e-05, standard_error=4.1243e-06)
    result["selection"]["loss"] = 2.7764e-05
    words = selection_part(result, Quantities(result))["losses"]
    assert words[0] == f"Root of the deciding loss of {row['candidate']}: 0.00527 mA, standard error 0.00039 mA."
    assert "optimistic" in words[1]


def test_a_weighted_loss_has_no_root_in_sentences_and_tables(result):
    result["settings"]["weighting"] = "inverse_stimulus"
    quantities = Quantities(result)
    assert "weighted" in selection_part(result, quantities)["losses"][0]
    heads = [column.text for column in losses_table(result, quantities).columns]
    assert not any("root" in head for head in heads)
    assert "leave_one_level_out (decides) / mA²" in heads
    assert "Above: the loss in mA²." in losses_table(result, quantities).note


def test_schemes_that_prefer_another_candidate_are_told_and_why_they_are_not_trusted(result):
    rankings, own = result["selection"]["rankings"], chosen(result)["candidate"]
    rankings.update(leave_one_series_out="polynomial-9", leave_one_out="polynomial-8")
    notes = selection_part(result, Quantities(result))["notes"]
    series = next(note for note in notes if note.startswith("leave_one_series_out prefers polynomial-9."))
    assert "every level of a series left out is still there" in series
    rows = next(note for note in notes if note.startswith("leave_one_out prefers polynomial-8."))
    assert "both sides of the split" in rows
    rankings.update(leave_one_series_out=own, leave_one_out=own)
    assert not any("prefers" in note for note in selection_part(result, Quantities(result))["notes"])


def test_the_interior_choice_is_noted_whether_it_differs_or_not(result):
    own = chosen(result)["candidate"]
    result["selection"]["interior_candidate"] = "polynomial-8"
    assert any(
        f"takes polynomial-8 instead of {own}" in note for note in selection_part(result, Quantities(result))["notes"]
    )
    result["selection"]["interior_candidate"] = own
    assert any(f"takes {own} as well" in note for note in selection_part(result, Quantities(result))["notes"])


def test_lack_of_fit_is_given_with_its_size_in_the_evaluated_unit(result):
    words = selection_part(result, Quantities(result))["lack_of_fit"]
    assert "F = 3.200 on " in words and "p = 0.0040 " not in words and "p = 0.0040." in words
    assert "0.0031 m." in words
    chosen(result)["lack_of_fit"] = None
    assert "not tested" in selection_part(result, Quantities(result))["lack_of_fit"]


def test_components_stand_in_the_fitted_and_the_evaluated_unit(result):
    table = selection_part(result, Quantities(result))["components"]
    assert [column.text for column in table.columns] == ["component", "loop current / mA", "water level / m"]
    assert ["level deviation", "0.004", "0.0025"] in text_of(table)
    assert "counted once" in selection_part(result, Quantities(result))["components_words"]


def test_exclusions_stand_with_reason_person_and_date(result):
    rows = text_of(observations_part(result, Quantities(result))["exclusions"])
    assert [row[-1] for row in rows] == ["cable moved (shift lead, 2026-04-03)"]


def test_suspects_and_verification_points_have_their_tables(result):
    part = observations_part(result, Quantities(result))
    assert len(part["suspects"].rows) == 1
    assert "kept" in part["suspects"].note
    assert len(part["verification"].rows) == len(result["verification"])


def test_long_lists_are_cut_and_say_where_the_rest_is(result):
    result["verification"] *= 40
    table = observations_part(result, Quantities(result))["verification"]
    assert len(table.rows) == MOST_ROWS
    assert f"of {len(result['verification'])} rows; all of them stand in tables/verification.csv" in table.note


def test_what_is_missing_is_a_dash_and_never_none(result):
    for row in result["candidates"]:
        for key in ("aicc", "bic", "misfit", "serial", "excursion", "lack_of_fit", "monotone", "condition_number"):
            row[key] = None
        row["losses"] = {}
    for table in (f(result, Quantities(result)) for f in (candidates_table, losses_table, shapes_table)):
        assert all("None" not in cell for row in text_of(table) for cell in row)


@pytest.mark.parametrize(("folds", "shown"), [(2, True), (0, False)])
def test_failed_folds_are_counted_beside_the_loss(result, folds, shown):
    result["candidates"][3]["losses"]["leave_one_level_out"]["failed_folds"] = folds
    small = " ".join(cell.small for cell in losses_table(result, Quantities(result)).rows[3])
    assert (f"failed folds: {folds}" in small) == shown


def test_schemes_that_did_not_apply_stay_in_the_table_with_their_message(result):
    result["schemes"][1].update(status="not_evaluated", message="there is only one series", folds=[])
    rows = text_of(selection_part(result, Quantities(result))["schemes"])
    assert ["leave_one_series_out", "whole series", "not evaluated", "0", "–", "There is only one series."] in rows


def test_both_tests_of_lack_of_fit_are_shown_where_whole_series_differ(result):
    alone = selection_part(result, Quantities(result))["lack_of_fit"]
    assert "series" not in alone
    chosen(result)["lack_of_fit_within_series"] = {"f": 12345.6, "p": 1.0, "numerator_df": 7, "denominator_df": 53,
                                                   "sum_of_squares": 1.0, "pure_error_sum_of_squares": 1.0}  # fmt: skip
    words = selection_part(result, Quantities(result))["lack_of_fit"]
    assert "F = 3.200 on" in words
    assert "taken out: F = 12350 on 7 and 53 degrees of freedom, p = 1.0; this test decides." in words
    at = next(number for number, row in enumerate(result["candidates"]) if row["chosen"])
    row = text_of(fits_table(result, Quantities(result)))[at]
    assert row[4:8] == ["3.200", "0.0040", "12350", "1.0"]
    assert text_of(fits_table(result, Quantities(result)))[at - 1][6:8] == ["–", "–"]


@pytest.mark.parametrize(
    ("found", "words"), [(True, "the function runs between them"), (False, "no difference between the directions was")]
)
def test_rising_less_falling_is_told_where_the_directions_are_known(result, found, words):
    assert selection_part(result, Quantities(result))["direction"] == ""
    result["selection"]["components"]["direction_difference"] = {"largest": 0.00719, "at": 5.0, "f": 1.1797,
                                                                 "p": 0.357, "found": found}  # fmt: skip
    told = selection_part(result, Quantities(result))["direction"]
    assert "Rising less falling" in told and "0.0072 m, at 5 m (F = 1.180, p = 0.36)" in told
    assert words in told


@pytest.mark.parametrize(("verdict", "shown"), [("adequate", True), ("not_evaluated", True), ("inadequate", False)])
def test_bands_and_uncertainty_are_shown_only_where_they_can_hold(result, verdict, shown):
    result["selection"].update(verdict=verdict, largest_expanded_uncertainty={"value": 0.0083, "at": 10.0})
    heads = [column.text for column in function_part(result, Quantities(result))["points"].columns]
    assert any("band" in head for head in heads) == shown
    assert ("0.0083 m, at 10 m" in selection_part(result, Quantities(result))["need"]) == shown
    cell = expanded_cell(result, result["settings"]["evaluated"], result["settings"]["stimulus"])
    assert (cell.text, cell.small) == (("0.0083 m", "at 10 m") if shown else ("–", ""))


@pytest.mark.parametrize("verdict", ["inadequate", "not_evaluated"])
def test_every_table_of_a_function_that_must_not_be_used_says_so(result, verdict):
    result["selection"]["verdict"] = verdict
    part = function_part(result, Quantities(result))
    mark = f"verdict {verdict.replace('_', ' ')}: must not be used"
    assert part["mark"] == mark
    assert all(part[name].caption.endswith(mark) for name in ("coefficients", "points", "scaled"))
    told = [row[6] for row in text_of(candidates_table(result, Quantities(result)))]
    assert told.count(f"chosen, {mark}") == 1


@pytest.mark.parametrize(("share", "stable"), [(0.499, False), (0.5, True), (None, True)])
def test_a_choice_that_the_resamples_do_not_repeat_is_not_stable(result, share, stable):
    chosen(result)["bootstrap_share"] = share
    assert choice_words(result) == ("decided" if stable else "decided by the rule, not stable")
    result["selection"]["choice"] = "tie"
    assert choice_words(result) == "tie"


def test_verification_points_stand_beside_their_prediction_interval(result):
    plain = observations_part(result, Quantities(result))["verification"]
    for point in result["verification"]:
        point.update(prediction_lower=point["fitted"] - 0.01, prediction_upper=point["fitted"] + 0.01,
                     within_prediction_interval=True)  # fmt: skip
    result["verification"][2]["within_prediction_interval"] = False
    table = observations_part(result, Quantities(result))["verification"]
    assert len(table.columns) == len(plain.columns) + 3
    assert [row[-1] for row in text_of(table)].count("outside") == 1 and text_of(table)[2][-1] == "outside"
    result["selection"]["verdict"] = "inadequate"
    table = observations_part(result, Quantities(result))["verification"]
    assert len(table.columns) == len(plain.columns)
    assert "does not hold" in table.note


@pytest.mark.parametrize(
    ("amount", "words"),
    [(0.0, "nowhere leaves the observations of its neighbouring levels"), (0.02, "at most 0.020 mA")],
)
def test_an_excursion_is_explained_and_none_is_said_in_words(result, amount, words):
    chosen(result)["excursion"] = {"stimulus": 6.5, "amount": amount, "in_residual_sd": amount / 0.01, "in_span": 0.0}
    told = function_part(result, Quantities(result))["excursion"]
    assert words in told
    assert ("between two neighbouring levels" in told) == (amount > 0)
    cell = next(
        row for row in text_of(shapes_table(result, Quantities(result))) if row[0] == chosen(result)["candidate"]
    )
    assert cell[7] == ("none" if amount == 0 else "0.02")


def test_losses_in_heads_and_reasons_carry_their_unit(result):
    chosen(result)["reason"] = "not chosen: loss 2.271e-05 is above the one-standard-error threshold 2.2e-05"
    heads = {column.text: column.small for column in candidates_table(result, Quantities(result)).columns}
    assert heads["root of deciding loss / mA"] == "below: loss / mA²"
    assert heads["reason"] == "losses in mA²"
    chosen(result)["reason"] = "not chosen: its gain is not supported (loss lower by 0.5 paired standard errors)"
    heads = {column.text: column.small for column in candidates_table(result, Quantities(result)).columns}
    assert heads["reason"] == ""


def test_units_in_brackets_do_not_get_two_pairs(result):
    for key in ("stimulus", "response", "fitted", "evaluated"):
        result["settings"][key]["unit"] = "(unit not stated)"
    result["curves"]["abscissa"]["unit"] = "(unit not stated)"
    part, quantities = function_part(result, Quantities(result)), Quantities(result)
    told = [cell for row in text_of(part["coefficients"]) for cell in row]
    told += [column.text + column.small for column in losses_table(result, quantities).columns]
    told += selection_part(result, quantities)["losses"] + [selection_part(result, quantities)["largest_residual"]]
    assert any("(unit not stated)²" in words for words in told)
    assert not any("((" in words or "))" in words for words in told)


def test_a_record_that_is_not_given_says_so_on_the_front(make_bundle, result):
    result["settings"]["record"] = {}
    table = front_part(make_bundle(result), "rev-0001", [])["record"]
    assert text_of(table)[0][2:] == ["not given"] * 3
