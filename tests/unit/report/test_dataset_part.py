"""The part of the report about one dataset."""

from __future__ import annotations

import pytest

from fitlib.report.candidates import candidates_table, losses_table, shapes_table
from fitlib.report.front import front_part
from fitlib.report.function import function_part
from fitlib.report.observations import observations_part
from fitlib.report.quantities import Quantities
from fitlib.report.selection import selection_part
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
    assert words[0] == f"Root of the deciding loss of {row['candidate']}: 0.00527 mA (standard error 0.00039 mA)."
    assert "optimistic" in words[1]


def test_a_weighted_loss_has_no_root_in_sentences_and_tables(result):
    result["settings"]["weighting"] = "inverse_stimulus"
    quantities = Quantities(result)
    assert "weighted" in selection_part(result, quantities)["losses"][0]
    heads = [column.text for column in losses_table(result, quantities).columns]
    assert not any("root" in head for head in heads)
    assert "leave_one_level_out (decides)" in heads
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
    assert "F = 3.2 on " in words and "p = 0.004" in words
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


def test_a_record_that_is_not_given_says_so_on_the_front(make_bundle, result):
    result["settings"]["record"] = {}
    table = front_part(make_bundle(result), "rev-0001", [])["record"]
    assert text_of(table)[0][2:] == ["not given"] * 3
