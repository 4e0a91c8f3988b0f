"""Each step's fingerprint follows what the step uses, and nothing else."""

import os
from dataclasses import fields

import pytest

from fitlib.plan import fingerprints
from fitlib.plan.fingerprints import hash_files, step_fingerprints
from fitlib.study import DatasetSettings, Study

FITS = {"fits"}
SCHEMES = {"scheme:leave_one_level_out", "scheme:bootstrap"}
ALL = FITS | SCHEMES | {"selection", "result"}


def changed_steps(before, after, dataset="cell-1"):
    old, new = before.dataset(dataset).steps, after.dataset(dataset).steps
    return {step for step in {**old, **new} if old.get(step) != new.get(step)}


def test_steps_are_named_in_the_order_of_the_study(folder):
    steps = list(folder.plan().dataset("cell-1").steps)
    assert steps == ["fits", "scheme:leave_one_level_out", "scheme:bootstrap", "selection", "result"]


@pytest.mark.parametrize(
    ("old", "new", "expected"),
    [
        ("degree: 1..2", "degree: 1..3", ALL),
        ("weighting: none", "weighting: inverse_stimulus", ALL),
        ("series: run}", "series: run}\n  level_tolerance: 0.01", ALL),
        ("draws: 20", "draws: 21", {"scheme:bootstrap", "selection", "result"}),
        ("random_seed: 7", "random_seed: 8", {"scheme:bootstrap", "selection", "result"}),
        ("rule: one_standard_error", "rule: smallest_loss", {"selection", "result"}),
        ("title: Trial", "title: Another", {"result"}),
        ("unit: kN", "unit: N", {"selection", "result"}),
        ("serial_number: '2'", "serial_number: '3'", set()),
    ],
)
def test_a_setting_reaches_the_steps_that_use_it(folder, old, new, expected):
    before = folder.plan()
    folder.edit(old, new)
    assert changed_steps(before, folder.plan()) == expected


def test_a_record_reaches_only_the_result_of_its_own_dataset(folder):
    before = folder.plan()
    folder.edit("serial_number: '2'", "serial_number: '3'")
    after = folder.plan()
    assert changed_steps(before, after, "cell-2") == {"result"}
    assert changed_steps(before, after, "cell-1") == set()


def test_data_reach_every_step_of_their_dataset_alone(folder):
    before = folder.plan()
    text = (folder.root / "cell-1.csv").read_text()
    folder.write("cell-1.csv", text.replace("0.501", "0.502"))
    after = folder.plan()
    assert changed_steps(before, after) == ALL
    assert changed_steps(before, after, "cell-2") == set()


@pytest.mark.parametrize(
    ("old", "new"),
    [
        ("weighting: none", "# a comment\nweighting: none"),
        ("{id: cell-1, files: [cell-1.csv]}", "{files: [cell-1.csv], id: cell-1}"),
        ("weighting: none", "weighting: 'none'"),
        ("format: 1\nstudy: trial\n", "study: trial\nformat: 1\n"),
    ],
)
def test_what_means_the_same_gives_the_same_plan(folder, old, new):
    before = folder.plan()
    folder.edit(old, new)
    assert folder.plan().to_dict() == before.to_dict()


def test_order_of_datasets_does_not_count(folder):
    before = folder.plan()
    first, second = "  - {id: cell-1, files: [cell-1.csv]}\n", "  - {id: cell-2, files: [cell-2.csv]"
    folder.edit(first, "")
    folder.edit(second, "  - {id: cell-2, files: [cell-2.csv]")
    folder.edit("families:", first + "families:")
    assert folder.plan().to_dict() == before.to_dict()


def test_order_of_files_counts(folder):
    folder.edit("files: [cell-1.csv]", "files: [cell-1.csv, cell-2.csv]")
    before = folder.plan()
    folder.edit("files: [cell-1.csv, cell-2.csv]", "files: [cell-2.csv, cell-1.csv]")
    assert changed_steps(before, folder.plan()) == ALL


def test_time_stamps_do_not_count_and_older_content_is_noticed(folder):
    path = folder.root / "cell-1.csv"
    before = folder.plan()
    os.utime(path)
    assert folder.plan().to_dict() == before.to_dict()
    path.write_text(path.read_text().replace("0.501", "0.502"))
    os.utime(path, (0, 0))
    assert changed_steps(before, folder.plan()) == ALL


def test_a_missing_file_is_named_with_its_place(folder):
    from fitlib.errors import InputError
    from fitlib.study import load_study

    study = load_study(str(folder.root / "study.yaml"))
    (folder.root / "cell-2.csv").unlink()
    with pytest.raises(InputError, match=r"study\.yaml:12: datasets\[1\]\.files: cell-2\.csv: cannot be read"):
        hash_files(study, study.datasets[1])


def test_code_and_versions_reach_every_step():
    settings = {"fits": {"families": "f"}, "result": {"families": "f"}}
    base = step_fingerprints("a", {"f.csv": "1"}, settings, "code", {"numpy": "2.0"})
    others = [
        step_fingerprints("a", {"f.csv": "1"}, settings, "other code", {"numpy": "2.0"}),
        step_fingerprints("a", {"f.csv": "1"}, settings, "code", {"numpy": "2.1"}),
        step_fingerprints("a", {"g.csv": "1"}, settings, "code", {"numpy": "2.0"}),
        step_fingerprints("b", {"f.csv": "1"}, settings, "code", {"numpy": "2.0"}),
    ]
    for other in others:
        assert not set(base.values()) & set(other.values())
    assert base["fits"] != base["result"]


def test_every_field_that_is_left_out_exists():
    """A misspelt name here would let a setting count that should not, or hide a renamed one."""
    of_study = {field.name for field in fields(Study)}
    of_dataset = {field.name for field in fields(DatasetSettings)}
    assert {
        *fingerprints.WITHOUT_EFFECT,
        *fingerprints.ONLY_SHOWN,
        *fingerprints.UNITS,
        *fingerprints.DECISIONS,
    } <= of_study
    assert set(fingerprints.FITS_UNUSED) <= of_dataset
