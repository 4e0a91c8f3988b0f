"""A plan: digests, batches, what differs from another plan."""

import json
from dataclasses import replace

import pytest

from fitlib.errors import FitlibError
from fitlib.plan import batch_of, describe_changes, make, plan_from_dict


def with_versions(monkeypatch, **versions):
    known = make.numeric_versions()
    monkeypatch.setattr(make, "numeric_versions", lambda: {**known, **versions})


def test_library_versions_change_the_digest_and_not_the_content_digest(folder, monkeypatch):
    before = folder.plan()
    with_versions(monkeypatch, numpy="99.0")
    after = folder.plan()
    assert after.content_digest == before.content_digest
    assert after.digest != before.digest
    assert after.dataset("cell-1").fingerprint != before.dataset("cell-1").fingerprint


def test_content_changes_both_digests(folder):
    before = folder.plan()
    folder.edit("title: Trial", "title: Another")
    after = folder.plan()
    assert (after.digest, after.content_digest) != (before.digest, before.content_digest)
    assert after.content_digest != before.content_digest


def test_the_number_of_batches_changes_no_plan_digest(folder):
    few, many = folder.plan(batches=1), folder.plan(batches=64)
    assert few.digest == many.digest
    assert [batch.members for batch in few.batches] == [("cell-1", "cell-2")]
    assert sum(len(batch.members) for batch in many.batches) == 2


def test_only_the_batch_of_a_changed_dataset_changes(folder):
    before = {batch.members: batch.digest for batch in folder.plan().batches}
    assert len(before) == 2
    folder.write("cell-1.csv", (folder.root / "cell-1.csv").read_text().replace("0.501", "0.502"))
    after = {batch.members: batch.digest for batch in folder.plan().batches}
    assert after[("cell-2",)] == before[("cell-2",)]
    assert after[("cell-1",)] != before[("cell-1",)]


def test_adding_a_dataset_moves_no_other():
    batches = {name: batch_of(name, 16) for name in ("a", "b", "c")}
    assert {name: batch_of(name, 16) for name in ("a", "x", "b", "c")} == {**batches, "x": batch_of("x", 16)}


def test_batches_are_filled_evenly():
    """Common practice, no source: a hash deals 3200 names to 16 batches within a fifth of 200 each."""
    counts = {}
    for number in range(3200):
        name = batch_of(f"sensor {number}", 16)
        counts[name] = counts.get(name, 0) + 1
    assert sorted(counts) == [f"{number:02d}" for number in range(16)]
    assert all(160 <= count <= 240 for count in counts.values())


def test_a_plan_survives_its_file(folder):
    plan = folder.plan()
    again = plan_from_dict(json.loads(json.dumps(plan.to_dict(), sort_keys=True)))
    assert again.to_dict() == plan.to_dict()
    assert list(again.dataset("cell-1").steps) == list(plan.dataset("cell-1").steps)
    assert again.dataset("cell-2").fingerprint == plan.dataset("cell-2").fingerprint
    assert again.batches == plan.batches


@pytest.mark.parametrize("content", [{}, {"format": 99}, {"format": 1, "datasets": [{}], "batches": []}])
def test_what_is_no_plan_is_refused(content):
    with pytest.raises(FitlibError, match="run again"):
        plan_from_dict(content)


def test_an_unknown_batch_is_refused(folder):
    with pytest.raises(FitlibError, match="batch 99 is not part of the plan"):
        folder.plan().batch("99")


def test_fewer_than_one_batch_is_refused(folder):
    with pytest.raises(ValueError, match="batches is 0"):
        folder.plan(batches=0)


def test_a_plan_without_changes_says_nothing(folder):
    assert describe_changes(folder.plan(), folder.plan()) == []
    assert describe_changes(None, folder.plan()) == ["first run of this study"]


@pytest.mark.parametrize(
    ("old", "new", "sentence"),
    [
        ("degree: 1..2", "degree: 1..3", "cell-1, cell-2: families changed"),
        ("draws: 20", "draws: 30", "cell-1, cell-2: validation bootstrap changed"),
        ("serial_number: '2'", "serial_number: '3'", "cell-2: record changed"),
        ("  - {id: cell-1, files: [cell-1.csv]}\n", "", "cell-1: withdrawn"),
        ("id: cell-1,", "id: cell-9,", "cell-9: added"),
    ],
)
def test_changes_are_named(folder, old, new, sentence):
    before = folder.plan()
    folder.edit(old, new)
    lines = describe_changes(before, folder.plan())
    assert sentence in lines
    assert "validation changed" not in " ".join(lines)


def test_datasets_with_the_same_changes_share_a_sentence(folder):
    before = folder.plan()
    folder.edit("degree: 1..2", "degree: 1..3")
    folder.edit("weighting: none", "weighting: inverse_stimulus")
    assert describe_changes(before, folder.plan()) == ["cell-1, cell-2: families, weighting changed"]


def test_many_different_changes_are_counted(folder):
    before = folder.plan()
    many = [replace(before.datasets[0], id=f"cell {number}", files={f"{number}.csv": "0"}) for number in range(30)]
    after = [replace(each, files={name: "1" for name in each.files}) for each in many]
    lines = describe_changes(replace(before, datasets=tuple(many)), replace(before, datasets=tuple(after)))
    assert len(lines) == 11
    assert lines[0] == "cell 0: 0.csv has other content"
    assert lines[-1] == "and 20 more changes of this kind"


def test_a_changed_file_is_named(folder):
    before = folder.plan()
    folder.write("cell-1.csv", (folder.root / "cell-1.csv").read_text().replace("0.501", "0.502"))
    assert describe_changes(before, folder.plan()) == ["cell-1: cell-1.csv has other content"]


def test_a_changed_version_is_named(folder, monkeypatch):
    before = folder.plan()
    with_versions(monkeypatch, numpy="99.0")
    assert describe_changes(before, folder.plan()) == [f"numpy {before.versions['numpy']} → 99.0"]
