"""Reading a revision: typed tables, real ids, nothing that was altered."""

import dataclasses
import json
import os

import pytest

from fitlib.collect.cells import safe_text
from fitlib.errors import InputError, VerificationError
from fitlib.revision import read_revision
from fitlib.revision.frames import unguarded


@pytest.fixture
def revision(shop):
    return read_revision(shop.publish().path)


def test_a_revision_tells_its_names(revision):
    assert (revision.name, revision.study) == ("rev-0001", "tank-gauges")
    assert "chosen" in revision.table_names and len(revision.table_names) == 13


def test_a_revision_cannot_be_changed(revision):
    with pytest.raises(dataclasses.FrozenInstanceError):
        revision.name = "rev-0002"


def test_tables_come_with_their_types(revision):
    chosen = revision.chosen
    assert list(chosen["candidate"]) == ["polynomial-1", "polynomial-1"]
    assert chosen["loss"].dtype == "float64" and chosen["loss"][0] == 0.0002
    candidates = revision.table("candidates")
    assert candidates["chosen"].dtype == "boolean" and bool(candidates["chosen"][0])
    assert candidates["parameters"].dtype == "Int64" and candidates["aicc_levels"].isna().all()


def test_words_stay_words(shop):
    result = shop.synthetic.make_result("NA", series=["007", "1"])
    revision = read_revision(shop.publish(shop.synthetic.make_bundle([result])).path)
    assert list(revision.chosen["dataset"]) == ["NA"]
    assert revision.table("observations")["series"][0] == "007"
    assert revision.table("observations")["reason"][0] == ""
    assert list(revision.table("record")["content"]) == ["23 °C", "0042"]


def test_numbers_come_back_with_every_digit(shop):
    bundle = shop.synthetic.make_bundle()
    bundle["results"][0]["selection"]["loss"] = 0.1 + 0.2
    assert read_revision(shop.publish(bundle).path).chosen["loss"][0] == 0.1 + 0.2


@pytest.mark.parametrize("text", ["=1", "'=1", "''=1", "-", "x", "'x", "", "@", "\uff1d"])
def test_the_guard_of_a_cell_is_taken_off(text):
    assert unguarded(safe_text(text)) == text


def test_functions_are_found_by_id(revision):
    assert list(revision.functions) == ["TG-1", "TG-2"]
    assert revision.functions["TG-2"]["response_at_ends"] == [4.5, 20.5]


def test_an_altered_file_is_not_read(shop):
    path = shop.publish().path
    table = path / "tables/chosen.csv"
    table.chmod(0o644)
    table.write_bytes(table.read_bytes().replace(b"polynomial-1", b"polynomial-9", 1))
    revision = read_revision(path)
    with pytest.raises(VerificationError, match=r"tables/chosen\.csv: altered"):
        revision.table("chosen")
    assert len(revision.table("candidates")) == 4


def test_a_link_on_the_way_is_not_followed(shop, tmp_path):
    path = shop.publish().path
    os.rename(path / "functions", tmp_path / "functions")
    (path / "functions").symlink_to(tmp_path / "functions")
    with pytest.raises(VerificationError, match="link"):
        _ = read_revision(path).functions


@pytest.mark.parametrize("name", ["../../secret", "nothing", "chosen.csv"])
def test_a_table_that_is_not_part_of_the_revision_is_refused(revision, name):
    with pytest.raises(VerificationError, match="not part of the revision"):
        revision.table(name)


def test_a_folder_that_is_no_revision_is_told(tmp_path):
    with pytest.raises(VerificationError, match="missing; without it"):
        read_revision(tmp_path)
    with pytest.raises(InputError, match="no such folder"):
        read_revision(tmp_path / "nothing")


def test_a_manifest_without_a_name_is_refused(shop):
    path = shop.publish().path / "manifest.json"
    manifest = json.loads(path.read_text())
    manifest["history"]["revision"] = "../../x"
    path.chmod(0o644)
    path.write_text(json.dumps(manifest))
    with pytest.raises(VerificationError, match="names no revision"):
        read_revision(path.parent)
