"""Rules between keys, and settings that would have no effect: every one refuses, and what it allows still loads."""

from __future__ import annotations

import pytest

SEED = "random_seed: 1\n"


def study(
    valid: str, validation: str = "", selection: str = "", families: str = "", dataset: str = "", top: str = ""
) -> str:
    """Return the small study with parts of it replaced."""
    text = valid if not selection else valid[: valid.index("selection:")] + f"selection: {{{selection}}}\n"
    if families:
        start, end = text.index("families:"), text.index("selection:")
        text = f"{text[:start]}families: [{families}]\n{text[end:]}"
    if validation:
        top += f"validation: [{validation}]\n"
    if dataset:
        text = text.replace("    columns:", f"    {dataset}\n    columns:")
    return text.replace("families:", f"{top}families:")


SERIES = "leave_one_series_out"
LEVELS = "{scheme: leave_one_level_out}"
TWO_FAMILIES = "{family: polynomial, degree: 1}, {family: polynomial, degree: 2, fixed_points: [[0, 4]]}"
EXCLUDED = "{where: {run: 2}, reason: cable, person: lead, date: 2026-04-03}"

REFUSED = {
    "seed missing for k_fold": (
        {"validation": f"{LEVELS}, {{scheme: k_fold, folds: 5}}"},
        "random_seed",
        "this key is missing; k_fold draws at random",
    ),
    "seed missing for bootstrap": (
        {"validation": f"{LEVELS}, {{scheme: bootstrap, draws: 100}}"},
        "random_seed",
        "bootstrap draws at random",
    ),
    "seed without effect": ({"top": SEED}, "random_seed", "this has no effect"),
    "loss missing": (
        {"selection": "rule: smallest_loss"},
        "selection.loss",
        "missing; the rule smallest_loss",
    ),
    "loss not declared": (
        {"selection": "rule: smallest_loss, loss: leave_one_out"},
        "selection.loss",
        "'leave_one_out' is not declared in validation; leave_one_level_out",
    ),
    "loss by another unit": (
        {
            "top": SEED,
            "validation": "{scheme: k_fold, folds: 5, unit: observation}",
            "selection": "rule: smallest_loss, loss: k_fold",
        },
        "selection.loss",
        "'k_fold' is not declared in validation; k_fold_observation",
    ),
    "series decide": (
        {
            "validation": "{scheme: leave_one_series_out}",
            "selection": "rule: smallest_loss, loss: leave_one_series_out",
        },
        "selection.loss",
        "leave_one_series_out cannot decide",
    ),
    "drawn series decide": (
        {
            "top": SEED,
            "validation": "{scheme: bootstrap, draws: 100, unit: series}",
            "selection": "rule: smallest_loss, loss: bootstrap_series",
        },
        "selection.loss",
        "bootstrap_series cannot decide",
    ),
    "four folds decide": (
        {
            "top": SEED,
            "validation": "{scheme: k_fold, folds: 4}",
            "selection": "rule: smallest_loss, loss: k_fold",
        },
        "validation[0].folds",
        "4 is not allowed for the deciding scheme; a whole number of 5 or more",
    ),
    "loss with aicc": (
        {"selection": "rule: aicc, loss: leave_one_level_out"},
        "selection.loss",
        "no effect with the rule",
    ),
    "loss with bic": (
        {"selection": "rule: bic, loss: leave_one_level_out"},
        "selection.loss",
        "no effect with the rule",
    ),
    "loss with f_test": (
        {"selection": "rule: f_test, loss: leave_one_level_out"},
        "selection.loss",
        "no effect with the rule f_test",
    ),
    "alpha without f_test": (
        {"selection": "rule: aicc, alpha: 0.05"},
        "selection.alpha",
        "no effect with the rule",
    ),
    "alpha of one": ({"selection": "rule: f_test, alpha: 1"}, "selection.alpha", "a number above 0 and below 1"),
    "f_test over two entries": (
        {"selection": "rule: f_test", "families": TWO_FAMILIES},
        "selection.rule",
        "this study has 2",
    ),
    "inverse without monotone": (
        {"selection": "rule: aicc, require: {monotone: false}"},
        "selection.require.monotone",
        "datasets[0] has inverse evaluation",
    ),
    "tolerance beside level": (
        {"dataset": "level_tolerance: 0.1\n    columns: {level: x, stimulus: flow, response: hertz}\n    unused:"},
        "datasets[0].level_tolerance",
        "no effect beside columns.level",
    ),
    "comma twice": ({"dataset": "{delimiter: comma, decimal: comma}"}, "datasets[0].delimiter", "cannot be both"),
    "scheme twice": ({"validation": f"{LEVELS}, {LEVELS}"}, "validation[1]", "declared already by validation[0]"),
    "bootstrap twice": (
        {
            "top": SEED,
            "validation": f"{LEVELS}, {{scheme: bootstrap, draws: 100}}, {{scheme: bootstrap, draws: 200}}",
        },
        "validation[2]",
        "bootstrap is declared already by validation[1]",
    ),
    "candidate twice": (
        {"families": "{family: polynomial, degree: 0..3}, {family: polynomial, degree: [2, 3]}"},
        "families[1].degree",
        "polynomial-2 (and 1 more) is declared already by families[0]",
    ),
    "fixed candidate twice": (
        {
            "families": "{family: polynomial, degree: 1, fixed_points: [[0, 4]]}, "
            "{family: polynomial, degree: 1, fixed_points: [[1, 4]]}"
        },
        "families[1].degree",
        "polynomial-1-fixed is declared already",
    ),
    "fixed points at one stimulus": (
        {"families": "{family: polynomial, degree: 3, fixed_points: [[0, 4], [0.0, 5]]}"},
        "families[0].fixed_points",
        "two fixed points at the stimulus 0",
    ),
    "nothing left to fit": (
        {"families": "{family: polynomial, degree: 1..3, fixed_points: [[0, 4], [1, 5]]}"},
        "families[0].fixed_points",
        "2 fixed points leave nothing to fit at degree 1; the lowest degree allowed is 2",
    ),
    "fixed constant": (
        {"families": "{family: polynomial, degree: 0..3, fixed_points: [[0, 4]]}"},
        "families[0].fixed_points",
        "1 fixed point leaves nothing to fit at degree 0",
    ),
    "fixed points at one response of an analysis function": (
        {
            "families": "{family: polynomial, degree: 3, fixed_points: [[0, 4], [1, 4]]}",
            "dataset": "function: analysis",
        },
        "families[0].fixed_points",
        "two fixed points at the response 4",
    ),
    "exclusion twice": (
        {"dataset": f"exclusions: [{EXCLUDED}, {EXCLUDED}]"},
        "datasets[0].exclusions[1].where",
        "an earlier exclusion says the same",
    ),
    "verification excluded": (
        {"dataset": f"exclusions: [{EXCLUDED}]\n    verification_points: {{where: {{run: 2}}}}"},
        "datasets[0].verification_points.where",
        "the same rows are in exclusions",
    ),
    "default replaced by all": (
        {"dataset": "decimal: comma", "top": "dataset_defaults: {decimal: point}\n"},
        "dataset_defaults.decimal",
        "every dataset sets it itself",
    ),
    "default column replaced by all": (
        {"top": "dataset_defaults: {columns: {stimulus: q}}\n"},
        "dataset_defaults.columns.stimulus",
        "every dataset sets it itself",
    ),
}


@pytest.mark.parametrize("name", sorted(REFUSED))
def test_a_rule_between_keys_refuses_with_the_key_and_the_reason(bench, valid, name):
    parts, key, word = REFUSED[name]
    text = study(valid, **parts)
    text = text.replace("    {delimiter: comma, decimal: comma}\n", "    delimiter: comma\n    decimal: comma\n")
    text = text.replace("    unused:\n    columns: {stimulus: flow, response: hertz}\n", "")
    _, found, message = bench.only(text)
    assert found == key and word in message


ALLOWED = {
    "seed for k_fold": {"top": SEED, "validation": f"{LEVELS}, {{scheme: k_fold, folds: 2}}"},
    "five folds decide": {
        "top": SEED,
        "validation": "{scheme: k_fold, folds: 5}",
        "selection": "rule: smallest_loss, loss: k_fold",
    },
    "one scheme over two units": {
        "top": SEED,
        "validation": f"{LEVELS}, {{scheme: bootstrap, draws: 100}}, {{scheme: bootstrap, draws: 100, unit: series}}",
    },
    "f_test over one entry": {"selection": "rule: f_test, alpha: 0.01"},
    "aicc over two entries": {"selection": "rule: aicc", "families": TWO_FAMILIES},
    "direct without monotone": {
        "selection": "rule: bic, require: {monotone: false}",
        "dataset": "evaluation: direct",
    },
    "decimal comma and semicolon": {"dataset": "decimal: comma\n    delimiter: semicolon"},
    "as many fixed points as the lowest degree": {
        "families": "{family: polynomial, degree: 2..3, fixed_points: [[0, 4], [1, 5]]}"
    },
    "a fixed point beside free candidates of one degree": {
        "families": "{family: polynomial, degree: 1}, {family: polynomial, degree: 1, fixed_points: [[0, 4]]}"
    },
    "two fixed points at one response of a calibration function": {
        "families": "{family: polynomial, degree: 3, fixed_points: [[0, 4], [1, 4]]}"
    },
}


@pytest.mark.parametrize("name", sorted(ALLOWED))
def test_what_a_rule_allows_still_loads(bench, valid, name):
    assert bench.load(study(valid, **ALLOWED[name])).name == "flow-meters"


def test_the_significance_level_is_five_per_cent_unless_written(bench, valid):
    assert bench.load(study(valid, selection="rule: f_test")).selection.alpha == 0.05
    assert bench.load(study(valid, selection="rule: f_test, alpha: 0.01")).selection.alpha == 0.01


def test_scheme_ids_carry_the_unit_where_it_is_not_the_level(bench, valid):
    schemes = "{scheme: k_fold, folds: 5, unit: observation}, {scheme: bootstrap, draws: 100, unit: series}"
    found = bench.load(study(valid, top=SEED, validation=f"{LEVELS}, {schemes}, {{scheme: k_fold, folds: 3}}"))
    assert [scheme.id for scheme in found.validation] == [
        "leave_one_level_out",
        "k_fold_observation",
        "bootstrap_series",
        "k_fold",
    ]
    assert [scheme.repeats for scheme in found.validation] == [None, 1, None, 1]
    assert [scheme.unit for scheme in found.validation] == [None, "observation", "series", "level"]


def test_folds_over_single_observations_are_warned_about(bench, valid):
    schemes = f"{LEVELS}, {{scheme: k_fold, folds: 5, unit: observation}}"
    (warning,) = bench.load(study(valid, top=SEED, validation=schemes)).warnings
    assert warning.key == "validation[1].unit" and warning.severity == "warning" and warning.line == 11
    assert "both sides" in warning.message


def test_a_deciding_scheme_over_single_observations_is_warned_about(bench, valid):
    text = study(valid, validation="{scheme: leave_one_out}", selection="rule: smallest_loss, loss: leave_one_out")
    assert [warning.key for warning in bench.load(text).warnings] == ["selection.loss"]


def test_monotone_follows_the_evaluation_where_the_study_says_nothing(bench, valid):
    inverse, direct = bench.load(), bench.load(study(valid, dataset="evaluation: direct"))
    assert inverse.requires_monotone(inverse.datasets[0]) and inverse.selection.monotone
    assert not direct.requires_monotone(direct.datasets[0]) and not direct.selection.monotone


def test_monotone_can_be_asked_for_in_direct_evaluation(bench, valid):
    asked = bench.load(study(valid, dataset="evaluation: direct", selection="rule: aicc, require: {monotone: true}"))
    assert asked.requires_monotone(asked.datasets[0])


SECOND = "datasets:\n  - {id: FM-2, files: [data/fm-2.csv], evaluation: direct, columns: {stimulus: a, response: b}}"


def test_inverse_evaluation_stays_monotone_beside_direct_evaluation(bench, valid):
    mixed = bench.load(valid, ("datasets:", SECOND))
    assert {dataset.id: mixed.requires_monotone(dataset) for dataset in mixed.datasets} == {"FM-1": True, "FM-2": False}


def test_a_target_in_two_units_is_refused(bench, valid):
    target = ("rule:", "target_uncertainty: {expanded: 1, coverage_factor: 2}\n  rule:")
    _, key, message = bench.only(valid, ("datasets:", SECOND), target)
    assert key == "selection.target_uncertainty" and "('L/min')" in message and "('Hz')" in message
    assert bench.load(valid, target).selection.target.expanded == 1.0


@pytest.mark.parametrize(
    ("columns", "key", "word"),
    [
        ("{stimulus: flow}", "columns.response", "missing here and in dataset_defaults"),
        ("{stimulus: flow, response: flow}", "columns.response", "'flow' is the stimulus already"),
        ("{stimulus: a, response: b, series: c, direction: c}", "columns.direction", "'c' is the series already"),
    ],
)
def test_each_column_has_one_role(bench, valid, columns, key, word):
    _, found, message = bench.only(valid, ("{stimulus: flow, response: hertz}", columns))
    assert found == f"datasets[0].{key}" and word in message


@pytest.mark.parametrize(("purpose", "warned"), [('"to be filled in: what for"', 1), ("Fill tanks to the mark.", 0)])
def test_a_purpose_that_nobody_wrote_is_warned_of(bench, valid, purpose, warned):
    study = bench.load(valid, ("stimulus: {quantity", f"purpose: {purpose}\nstimulus: {{quantity"))
    found = [warning for warning in study.warnings if warning.key == "purpose"]
    assert len(found) == warned
    assert all(warning.severity == "warning" and warning.line == 4 for warning in found)
