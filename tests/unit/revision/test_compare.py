"""Comparison: each change is told, and nothing when nothing changed."""

import json

import pytest

from fitlib.errors import VerificationError
from fitlib.revision import compare_revisions, read_revision
from fitlib.revision.comparison import distinct


@pytest.fixture
def compare(shop):
    """Publish two bundles and compare them."""

    def act(before=None, after=None, **options):
        first = shop.publish(before)
        second = shop.publish(after, **options)
        assert second.new
        return compare_revisions(first.path, second.path)

    return act


def one(shop, study=None, **changes):
    result = shop.synthetic.make_result("TG-1", **changes)
    return shop.synthetic.make_bundle([result], study=study or shop.synthetic.make_study(["TG-1"]))


def test_nothing_is_told_when_nothing_changed(shop, tmp_path):
    first = shop.publish().path
    shop.results_dir = tmp_path / "elsewhere"
    comparison = compare_revisions(first, shop.publish().path)
    assert not comparison.changed and comparison.lines() == []
    assert comparison.unchanged == 2 and comparison.to_dict()["datasets"] == ()


def test_paths_and_open_revisions_give_the_same(shop):
    paths = shop.publish().path, shop.publish(one(shop)).path
    assert compare_revisions(*paths) == compare_revisions(*map(read_revision, paths))


def test_a_changed_data_file_is_told_with_rows_of_dataset_and_series(shop, compare):
    comparison = compare(one(shop), one(shop, series=["1", "2", "3"]))
    assert "Data file data/TG-1.csv changed: rows of TG-1 from 11 to 16 (series 3 from 0 to 5)." in comparison.lines()
    assert not comparison.settings


def test_a_data_file_of_the_same_length_is_told(shop, compare):
    comparison = compare(one(shop), one(shop, offset=0.25))
    assert comparison.lines()[0] == "Data file data/TG-1.csv changed: 11 rows of TG-1 as before, other content."


def test_an_added_and_a_removed_dataset_are_told_with_their_file(shop, compare):
    results = [shop.synthetic.make_result(name) for name in ("TG-1", "TG-3")]
    lines = compare(None, shop.synthetic.make_bundle(results)).lines()
    assert "Data file data/TG-3.csv was added: 11 rows of TG-3." in lines
    assert "Data file data/TG-2.csv was removed: 11 rows of TG-2." in lines
    assert "Dataset TG-3 was added to the study." in lines and "Dataset TG-2 was taken out of the study." in lines
    told = "polynomial-1 chosen, verdict adequate, loss 0.0002 (mA squared)."
    assert f"Dataset TG-3 is new: {told}" in lines
    assert f"Dataset TG-2 is gone; it had: {told}" in lines
    assert lines[-1] == "1 dataset has the same choice, verdict, loss and function as before."


def changed_study(shop, change):
    study = shop.synthetic.make_study(["TG-1"])
    change(study)
    return one(shop, study)


def rule(study):
    study["selection"]["rule"] = "smallest_loss"


def draws(study):
    study["validation"][1]["draws"] = 500


def degrees(study):
    study["families"][0]["degrees"] = [1, 2, 3]
    study["families"][0]["candidates"] = ["polynomial-1", "polynomial-2", "polynomial-3"]


def family(study):
    study["families"].append({"family": "polynomial", "degrees": [1], "fixed_points": [[0, 4]]})


def exclusion(study):
    study["datasets"][0]["exclusions"].append({"where": {"run": 2}, "reason": "cable moved"})


def scheme(study):
    del study["validation"][1]


def order(study):
    study["validation"].reverse()


def unset(study):
    del study["selection"]["degrees_of_freedom"]


def truth(study):
    study["random_seed"] = True


@pytest.mark.parametrize(
    "change, line",
    [
        (rule, "Setting selection.rule changed from one_standard_error to smallest_loss."),
        (draws, "Setting validation[bootstrap].draws changed from 200 to 500."),
        (degrees, "Setting families[polynomial].degrees changed from [1, 2] to [1, 2, 3]."),
        (
            family,
            "Setting families[polynomial-fixed] was added:"
            ' {"degrees": [1], "family": "polynomial", "fixed_points": [[0, 4]]}.',
        ),
        (
            exclusion,
            'Setting datasets[TG-1].exclusions was added: {"reason": "cable moved", "where": {"run": 2}}.',
        ),
        (
            scheme,
            "Setting validation[bootstrap] was removed:"
            ' {"draws": 200, "id": "bootstrap", "scheme": "bootstrap", "unit": "level"}.',
        ),
        (
            order,
            'Setting order of validation changed from ["leave_one_level_out", "bootstrap"] to'
            ' ["bootstrap", "leave_one_level_out"].',
        ),
        (unset, "Setting selection.degrees_of_freedom was removed: 3."),
        (truth, "Setting random_seed changed from 7 to true."),
    ],
)
def test_a_changed_setting_is_told_with_its_key(shop, compare, change, line):
    comparison = compare(one(shop), changed_study(shop, change))
    assert comparison.causes() == [line]
    assert comparison.effects() == ["1 dataset has the same choice, verdict, loss and function as before."]


def test_the_same_setting_of_many_datasets_is_one_line(shop, compare):
    study = shop.synthetic.make_study()
    for settings in study["datasets"]:
        settings["level_tolerance"] = 0.02
    comparison = compare(None, shop.synthetic.make_bundle(study=study))
    assert comparison.causes() == ["Setting datasets[*].level_tolerance was added: 0.02 (2 datasets: TG-1, TG-2)."]
    assert [change.dataset for change in comparison.settings] == ["TG-1", "TG-2"]


def test_different_settings_of_datasets_are_lines_of_their_own(shop, compare):
    study = shop.synthetic.make_study()
    for index, settings in enumerate(study["datasets"]):
        settings["level_tolerance"] = 0.02 + index
    assert compare(None, shop.synthetic.make_bundle(study=study)).causes() == [
        "Setting datasets[TG-1].level_tolerance was added: 0.02.",
        "Setting datasets[TG-2].level_tolerance was added: 1.02.",
    ]


def test_the_order_of_datasets_in_the_record_is_no_change_of_a_dataset(shop, compare):
    study = shop.synthetic.make_study(["TG-2", "TG-1"])
    comparison = compare(None, shop.synthetic.make_bundle(study=study))
    assert [change.key for change in comparison.settings] == ["order of datasets"]


def test_a_comment_in_the_study_is_told_apart_from_settings(shop, compare):
    inputs = shop.inputs(shop.synthetic.make_bundle())
    inputs["study.yaml"] += b"# checked by the shift lead\n"
    comparison = compare(inputs=inputs, facts={"plan_digest": "f" * 64})
    assert comparison.causes() == ["The study's text changed, its settings did not."]


def test_versions_and_code_are_told(shop, compare):
    facts = {
        "plan_digest": "f" * 64,
        "versions": {"fitlib": "0.2.0", "numpy": "2.0.0", "scipy": "1.17.0"},
        "code": {"numerics": "c" * 64, "rendering": "b" * 64},
        "plan_content_digest": "d" * 64,
    }
    assert compare(facts=facts).causes() == [
        "fitlib changed from 0.1.0 to 0.2.0.",
        "Version of python changed from 3.11.7 to none.",
        "Version of scipy changed from none to 1.17.0.",
        "The program's code changed: numerics.",
    ]


def test_another_candidate_is_told_with_loss_and_shift(shop, compare):
    comparison = compare(one(shop), one(shop, chosen="polynomial-2"))
    [line] = comparison.effects()
    assert line.startswith(
        "Dataset TG-1: candidate from polynomial-1 to polynomial-2; verdict adequate as before;"
        " loss from 0.0002 to 0.0004 (mA squared); the chosen function shifts by at most 0.001 mA (at "
    )


def test_a_verdict_is_told_without_a_shift(shop, compare):
    comparison = compare(one(shop), one(shop, verdict="inadequate"))
    assert comparison.effects() == [
        "Dataset TG-1: candidate polynomial-1 as before; verdict from adequate to inadequate."
    ]


def test_the_shift_of_a_curve_is_its_largest_distance(shop, compare):
    # The slope is 1.6 mA/m: an offset of 0.25 mA is 0.15625 m in a converted value.
    shift = compare(one(shop), one(shop, offset=0.25)).datasets[0].shift
    assert shift.amount == pytest.approx(0.25, rel=1e-12)
    assert shift.amount_evaluated == pytest.approx(0.15625, rel=1e-12)
    assert (shift.unit, shift.unit_evaluated) == ("mA", "m")


def test_the_shift_is_looked_for_only_where_both_functions_hold(shop, compare):
    after = one(shop)
    function = after["results"][0]["function"]
    function["scaled"] = {**function["scaled"], "coefficients": [12.0, 8.0 * 1.25]}
    after["results"][0]["settings"]["measuring_interval"] = function["measuring_interval"] = [2.5, 7.5]
    comparison = compare(one(shop), after)
    # 2 mA per half span of 5 m: 1 mA at the ends of the interval that both cover.
    assert comparison.datasets[0].shift.amount == pytest.approx(1.0, rel=1e-12)
    assert "measuring interval from 0 to 10 m to 2.5 to 7.5 m" in comparison.effects()[0]


def test_functions_of_another_kind_have_no_shift(shop, compare):
    after = one(shop, offset=0.25)
    for part in ("function", "settings"):
        after["results"][0][part]["evaluation"] = "direct"
    comparison = compare(one(shop), after)
    assert comparison.datasets[0].shift is None
    assert "use from calibration, inverse to calibration, direct" in comparison.effects()[0]


def test_an_analysis_function_is_compared_over_its_responses(shop, compare):
    bundles = []
    for offset in (0.0, 0.5):
        bundle = one(shop)
        function = bundle["results"][0]["function"]
        function.update(function="analysis", response_at_ends=[20.0, 4.0])
        function["scaled"] = {**function["scaled"], "centre": 12.0, "half_span": 8.0, "coefficients": [5 + offset, 5.0]}
        bundles.append(bundle)
    shift = compare(*bundles).datasets[0].shift
    assert shift.amount == pytest.approx(0.5, rel=1e-12)
    assert (shift.unit, shift.at_unit, shift.amount_evaluated) == ("m", "mA", None)
    assert 4.0 <= shift.at <= 20.0


def test_rounding_is_no_change(shop, compare):
    after = one(shop)
    after["results"][0]["selection"]["loss"] *= 1 + 1e-12
    after["results"][0]["function"]["scaled"]["coefficients"][0] += 1e-13
    comparison = compare(one(shop), after, facts={"code": {"numerics": "c" * 64}})
    assert comparison.datasets == () and comparison.unchanged == 1


def test_an_uncertainty_that_changed_alone_is_told(shop, compare):
    after = one(shop)
    after["results"][0]["function"]["level_standard_deviation"] = 0.02
    line = compare(one(shop), after).effects()[0]
    assert line.endswith("; standard deviation that averaging does not divide from 0 to 0.02 mA.")
    after = one(shop)
    after["results"][0]["function"]["reading_standard_deviation"] *= 2
    line = compare(one(shop), after).effects()[0]
    assert "; standard deviation of a reading from " in line and "repeatability" not in line


def test_losses_of_different_schemes_are_not_set_side_by_side(shop, compare):
    after = one(shop)
    after["results"][0]["settings"]["loss"] = "bootstrap"
    line = compare(one(shop), after).effects()[0]
    assert "loss from 0.0002 by leave_one_level_out to 0.0002 by bootstrap, which cannot be compared" in line


def test_a_function_that_is_gone_is_told(shop, compare):
    after = one(shop)
    selection = {"candidate": None, "verdict": "not_evaluated", "choice": None, "runner_up": None, "loss": None}
    after["results"][0]["selection"].update(selection)
    after["results"][0]["function"] = None
    line = compare(one(shop), after).effects()[0]
    assert "candidate from polynomial-1 to none; verdict from adequate to not_evaluated" in line
    assert "loss from 0.0002 to none" in line


def test_every_change_is_in_the_dict_which_is_json(shop, compare):
    comparison = compare(None, one(shop, offset=0.25))
    told = json.loads(json.dumps(comparison.to_dict()))
    assert told["changed"] is True
    assert [change["kind"] for change in told["datasets"]] == ["changed", "removed"]
    assert told["datasets"][0]["shift"]["amount"] == pytest.approx(0.25)
    assert {change["file"] for change in told["data"]} == {"data/TG-1.csv", "data/TG-2.csv"}


@pytest.mark.parametrize("name", ["=1+1", "../x", "<b>", "a;rm -rf b", "Füllstand Ω", "`code`", "[x](http://y)", "a_b"])
def test_a_strange_id_is_text_in_lines_and_in_changes(shop, compare, name):
    bundles = [
        shop.synthetic.make_bundle([shop.synthetic.make_result(name, "d~0123456789abcdef", offset=offset)])
        for offset in (0.0, 0.25)
    ]
    first = shop.publish(bundles[0], inputs={"study.yaml": b"x", "data/a.csv": b"1"})
    second = shop.publish(bundles[1], inputs={"study.yaml": b"x", "data/a.csv": b"2"})
    assert any(line.startswith(f"Dataset {name}: ") for line in compare_revisions(first.path, second.path).lines())
    text = (second.path / "CHANGES.md").read_text()
    assert not any(mark in text for mark in ("<b>", "[x](", " `code`"))
    if name == "a_b":
        assert "Dataset a_b: " in text


def test_an_id_cannot_act_on_a_terminal(shop, compare):
    study = shop.synthetic.make_study(["TG-1"], title="a\x1b[2J\u202eb")
    [line] = compare(one(shop), one(shop, study)).causes()
    assert line == "Setting title changed from Tank gauges to a\\u001b[2J\\u202eb."


def test_a_long_value_is_cut(shop, compare):
    [line] = compare(one(shop), one(shop, shop.synthetic.make_study(["TG-1"], title="x" * 5000))).causes()
    assert line.endswith("x....") and len(line) < 500


def test_changes_tell_causes_and_effects_apart(shop):
    shop.publish()
    text = (shop.publish(one(shop, offset=0.25)).path / "CHANGES.md").read_text()
    head, causes, effects = text.split("## ")
    assert head.startswith("# tank-gauges, rev-0002\n") and "Compared with rev-0001." in head
    assert causes.startswith("What changed\n") and "Data file data/TG-1.csv changed" in causes
    assert effects.startswith("What it did\n") and "Dataset TG-2 is gone" in effects
    assert text.endswith("\n") and not text.endswith("\n\n")


def test_an_altered_revision_is_not_compared(shop):
    first, second = shop.publish().path, shop.publish(one(shop)).path
    (first / "resolved.json").chmod(0o644)
    (first / "resolved.json").write_text("{}")
    with pytest.raises(VerificationError, match="altered"):
        compare_revisions(first, second)


@pytest.mark.parametrize(
    "before, after, texts",
    [
        (1.0, 2.0, ("1", "2")),
        (0.00012341, 0.00012342, ("0.00012341", "0.00012342")),
        (None, 1.5, ("none", "1.5")),
        (1.0, 1.0 + 2**-52, ("1", "1.0000000000000002")),
    ],
)
def test_two_numbers_are_shown_with_the_digits_that_tell_them_apart(before, after, texts):
    assert distinct(before, after) == texts
