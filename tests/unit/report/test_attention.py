"""What needs a person."""

from __future__ import annotations

import copy
from pathlib import Path

import pytest

import fitlib.analysis.warnings
from fitlib.report.attention import KINDS, SAID_ALREADY, attention_part, needs, other_warnings
from fitlib.report.front import front_part


def quiet(result: dict) -> dict:
    """The result without anything that needs a person."""
    result["observations"]["flag"] = [""] * len(result["observations"]["flag"])
    result["warnings"] = []
    return result


def test_a_quiet_result_needs_nobody(result):
    assert needs(quiet(result)) == {}
    assert attention_part([result], []) == []


def test_results_that_lack_the_newer_fields_are_read(result):
    for row in result["candidates"]:
        del row["bootstrap_share"]
    assert set(needs(result)) == {"suspect"}


@pytest.mark.parametrize("verdict", ["inadequate", "not_evaluated"])
def test_a_verdict_that_is_not_adequate_stands_with_its_reason(result, verdict):
    quiet(result)["selection"].update(verdict=verdict, verdict_reason="the levels follow one another")
    assert needs(result) == {"verdict": f"{verdict.replace('_', ' ').capitalize()}. The levels follow one another."}


def test_a_tie_names_what_cannot_be_told_apart(result):
    quiet(result)["selection"].update(choice="tie", tied=["polynomial-7", "polynomial-8"])
    assert needs(result)["tie"].endswith("polynomial-7 and polynomial-8 cannot be told apart from it.")


def test_a_target_that_is_not_met_names_the_size_above_it(result):
    quiet(result)["selection"].update(target_met=False, largest_expanded_uncertainty={"value": 0.0123, "at": 0.0})
    expected = "0.01 m is needed; the expanded uncertainty of one converted reading reaches 0.012 m."
    assert needs(result) == {"target": expected}
    result["selection"]["target_met"] = True
    assert needs(result) == {}
    result["selection"]["target_met"] = None
    assert needs(result) == {}


def test_the_uncertainty_of_an_inadequate_function_is_not_held_against_the_target(result):
    selection = quiet(result)["selection"]
    selection.update(target_met=False, largest_expanded_uncertainty={"value": 0.05, "at": 0.0}, verdict="inadequate")
    for row in result["candidates"]:
        row["misfit"] = 0.034
    assert needs(result)["target"] == "0.01 m is needed; the largest mean deviation of a level is 0.034 m."


def test_a_choice_that_is_not_stable_stands_with_both_shares(result):
    quiet(result)
    for row in result["candidates"]:
        row["bootstrap_share"] = 0.27 if row["chosen"] else 0.0
    result["candidates"][-1]["bootstrap_share"] = 0.35
    name = result["selection"]["candidate"]
    assert needs(result) == {"unstable": f"The rule takes {name} in 27 % of the bootstrap draws, polynomial-9 in 35 %."}


def test_verification_points_outside_are_counted_and_named_unless_the_interval_does_not_hold(result):
    quiet(result)
    for point in result["verification"]:
        point["within_prediction_interval"] = point["row"] % 2 == 0
    outside = [point["row"] for point in result["verification"] if point["row"] % 2]
    text = needs(result)["verification"]
    assert text.startswith(f"{len(outside)} of {len(result['verification'])} points lie outside: data/spring.csv row ")
    assert f"row {outside[0]}" in text
    result["selection"]["verdict"] = "inadequate"
    assert "verification" not in needs(result)


def test_suspects_are_named_and_beyond_five_counted(result):
    assert needs(result)["suspect"] == "1 observation: data/spring.csv row 17."
    result["observations"]["flag"][:8] = ["suspect"] * 8
    assert needs(result)["suspect"].endswith("row 6 and 4 more.")


def test_groups_come_in_order_of_urgency_with_every_dataset(result):
    other = copy.deepcopy(result) | {"dataset": "LS-102"}
    other["selection"]["verdict"] = "inadequate"
    groups = attention_part([result, other], [{"dataset": "LS-103", "message": "nothing could be read"}])
    heads = [KINDS[kind] for kind in ("failed", "verdict", "suspect")]
    assert [group["head"] for group in groups] == heads
    assert [entry["name"] for group in groups for entry in group["entries"]] == ["LS-103", "LS-102", "LS-101", "LS-102"]


def test_a_warning_is_not_repeated_but_never_lost(result, make_bundle):
    result["warnings"] = ["1 observation flagged as suspect, and kept: row 17", "levels carry their own deviation"]
    assert other_warnings(result) == ["levels carry their own deviation"]
    assert [one["text"] for one in front_part(make_bundle(result), "rev-0001", [])["warnings"]] == result["warnings"][
        1:
    ]
    result["observations"]["flag"] = [""] * len(result["observations"]["flag"])
    assert other_warnings(result) == result["warnings"]


def test_the_words_that_a_warning_is_known_by_are_those_of_the_analysis():
    source = Path(fitlib.analysis.warnings.__file__).read_text()
    assert [words for words in SAID_ALREADY.values() if words not in source] == []
