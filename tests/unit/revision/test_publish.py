"""Publishing: all or nothing, never twice the same number, never the same results twice."""

import contextlib
import errno
import json
import os
import shutil
import stat

import pytest

from fitlib.errors import FitlibError
from fitlib.revision import latest_revision, next_revision, publish, read_revision, verify_revision


def other(shop, offset=0.25):
    return shop.synthetic.make_bundle([shop.synthetic.make_result("TG-1", offset=offset)])


def names(folder):
    return sorted(path.name for path in folder.iterdir())


def test_a_first_revision_holds_inputs_results_and_facts(shop):
    published = shop.publish()
    assert (published.revision, published.new) == ("rev-0001", True)
    found = {path.relative_to(published.path).as_posix() for path in published.path.rglob("*") if path.is_file()}
    assert {"manifest.json", "run.json", "run.sha256", "CHANGES.md", "resolved.json"} <= found
    assert {"inputs/study.yaml", "inputs/data/TG-1.csv", "functions/TG-1.json", "figures/TG-2/data.svg"} <= found
    assert json.loads((published.path / "run.json").read_text()) == shop.run_facts
    assert "First revision." in (published.path / "CHANGES.md").read_text()
    assert verify_revision(published.path) == []


def test_inputs_are_kept_byte_for_byte(shop, tmp_path):
    text = b"study: x\r\n# \xc3\xbc\r\n"
    (tmp_path / "a.csv").write_bytes(b"1;2\r\n")
    published = shop.publish(inputs={"study.yaml": text, "data/a.csv": tmp_path / "a.csv"})
    assert (published.path / "inputs/study.yaml").read_bytes() == text
    assert (published.path / "inputs/data/a.csv").read_bytes() == b"1;2\r\n"


def test_the_same_inputs_give_the_same_bytes_elsewhere_but_for_the_run(shop, tmp_path, synthetic, snapshot):
    first = snapshot(shop.publish().path)
    shop.results_dir = tmp_path / "elsewhere" / "deeper"
    second = snapshot(shop.publish(run_facts={"user": "somebody else", "started": "2027-01-01T00:00:00Z"}).path)
    differing = {path for path in first if first[path] != second[path]}
    assert first.keys() == second.keys()
    assert differing == {"run.json", "run.sha256"}


def test_only_the_history_of_the_manifest_depends_on_earlier_revisions(shop):
    first = shop.publish()
    shop.publish(other(shop))
    third = shop.publish()
    manifests = [json.loads((item.path / "manifest.json").read_text()) for item in (first, third)]
    assert manifests[0]["history"]["previous"] is None
    assert manifests[1]["history"]["previous"]["revision"] == "rev-0002"
    for manifest in manifests:
        del manifest["history"]
    assert manifests[0] == manifests[1]


def test_no_path_of_this_machine_is_in_a_revision(shop, snapshot):
    shop.publish()
    published = shop.publish(other(shop))
    for path, data in snapshot(published.path).items():
        assert str(shop.results_dir).encode() not in data, path


def test_a_run_that_changes_nothing_makes_no_revision(shop, snapshot):
    first = shop.publish()
    before = snapshot(shop.folder)
    again = shop.publish(run_facts={"user": "another"})
    assert (again.revision, again.new) == ("rev-0001", False)
    assert again.path == first.path and "rev-0001" in again.note
    assert snapshot(shop.folder) == before


def test_going_back_to_an_earlier_study_makes_a_new_revision(shop):
    revisions = [shop.publish(bundle).revision for bundle in (None, other(shop), None)]
    assert revisions == ["rev-0001", "rev-0002", "rev-0003"]


def test_an_altered_latest_revision_is_told_when_nothing_is_new(shop):
    path = shop.publish().path / "tables/chosen.csv"
    path.chmod(0o644)
    path.write_text("gone")
    again = shop.publish()
    assert not again.new
    assert "tables/chosen.csv" in again.note and "move it away" in again.note


def new_library(shop, **changes):
    versions = {**shop.facts["versions"], "numpy": "2.1.0"}
    return {"versions": versions, "plan_digest": "f" * 64, **changes}


def test_a_new_library_that_changes_no_number_makes_no_revision(shop):
    shop.publish()
    again = shop.publish(facts=new_library(shop))
    assert (again.new, again.revision) == (False, "rev-0001")
    assert "libraries" in again.note and names(shop.folder) == [".revisions", "rev-0001"]


def test_another_plan_with_the_same_program_and_results_makes_no_revision(shop):
    shop.publish()
    again = shop.publish(facts={"plan_digest": "f" * 64})
    assert not again.new and "libraries" not in again.note


def test_a_new_library_that_changes_a_number_makes_a_revision(shop):
    shop.publish()
    bundle = shop.synthetic.make_bundle()
    bundle["results"][0]["selection"]["loss"] *= 1 + 1e-6
    inputs = shop.inputs(shop.synthetic.make_bundle())
    assert shop.publish(bundle, inputs=inputs, facts=new_library(shop)).new


@pytest.mark.parametrize("change", ["code", "fitlib", "no code told"])
def test_a_new_program_makes_a_revision_even_if_no_number_changed(shop, change):
    if change == "no code told":
        del shop.facts["code"]
    shop.publish()
    facts = new_library(shop)
    if change == "code":
        facts["code"] = {"numerics": "c" * 64, "rendering": "b" * 64}
    if change == "fitlib":
        facts["versions"]["fitlib"] = "0.2.0"
    assert shop.publish(facts=facts).revision == "rev-0002"


def test_the_lock_is_held_while_publishing(shop):
    seen = []

    @contextlib.contextmanager
    def lock():
        seen.append(shop.folder.exists())
        yield
        seen.append((shop.folder / "rev-0001").exists())

    shop.publish(lock=lock())
    assert seen == [False, True]


def test_files_are_read_only(shop):
    published = shop.publish()
    for path in published.path.rglob("*"):
        if path.is_file():
            assert not stat.S_IMODE(path.stat().st_mode) & 0o222, path


def test_history_is_rendered_with_the_name_and_the_changes(shop):
    shop.publish()
    told = []

    def render(revision, changes):
        told.append((revision, changes))
        return {"report.html": f"<p>{revision}".encode()}

    published = shop.publish(other(shop), render=render)
    assert told[0][0] == "rev-0002" and len(told) == 1
    assert any("TG-2" in line for line in told[0][1])
    manifest = json.loads((published.path / "manifest.json").read_text())
    assert set(manifest["history"]["files"]) == {"CHANGES.md", "report.html"}
    assert verify_revision(published.path) == []


def test_a_leftover_of_a_killed_run_is_swept(shop):
    shop.folder.mkdir(parents=True)
    leftover = shop.folder / ".new-0123" / "tables"
    leftover.mkdir(parents=True)
    (leftover / "half.csv").write_text("a")
    (leftover / "half.csv").chmod(0o444)
    shop.publish()
    assert names(shop.folder) == [".revisions", "rev-0001"]


def test_a_link_among_leftovers_is_removed_and_not_followed(shop, tmp_path):
    shop.folder.mkdir(parents=True)
    (tmp_path / "precious").mkdir()
    (tmp_path / "precious" / "data.csv").write_text("a")
    (shop.folder / ".new-link").symlink_to(tmp_path / "precious")
    shop.publish()
    assert (tmp_path / "precious" / "data.csv").exists()
    assert ".new-link" not in names(shop.folder)


def test_every_file_and_folder_is_on_the_disk_before_the_rename(shop, monkeypatch):
    events = []
    real = os.rename
    monkeypatch.setattr(os, "fsync", lambda descriptor: events.append(os.readlink(f"/proc/self/fd/{descriptor}")))
    monkeypatch.setattr(os, "rename", lambda *paths: (events.append("rename"), real(*paths)))
    published = shop.publish()
    before = events[: events.index("rename")]
    staging = next(path for path in before if path.endswith("manifest.json")).removesuffix("/manifest.json")
    synced = {os.path.relpath(path, staging) for path in before}
    assert {path.relative_to(published.path).as_posix() for path in published.path.rglob("*")} <= synced
    assert str(shop.folder) in events[events.index("rename") :]


@pytest.mark.parametrize("call", ["rename", "fsync", "open"])
@pytest.mark.parametrize("first", [True, False])
def test_an_error_leaves_nothing_half_written(shop, monkeypatch, snapshot, call, first):
    if not first:
        shop.publish(other(shop))
    before = snapshot(shop.folder) if shop.folder.exists() else {}
    real, calls = getattr(os, call), []

    def broken(*arguments, **options):
        calls.append(arguments)
        if (
            call == "rename"
            or (call == "fsync" and len(calls) > 5)
            or (call == "open" and "chosen" in str(arguments[0]))
        ):
            raise OSError(errno.ENOSPC, os.strerror(errno.ENOSPC))
        if call == "chmod":
            raise PermissionError(errno.EPERM, "no rights here")
        return real(*arguments, **options)

    monkeypatch.setattr(os, call, broken)
    if call == "chmod":  # a share that knows no rights still takes a revision
        assert verify_revision(shop.publish().path) == []
        return
    with pytest.raises(FitlibError, match="No space left on device"):
        shop.publish()
    monkeypatch.undo()
    assert calls
    assert snapshot(shop.folder) == before
    assert shop.publish().revision == ("rev-0001" if first else "rev-0002")


def test_a_share_that_knows_no_rights_still_takes_a_revision(shop, monkeypatch):
    def refuse(*arguments, **options):
        raise PermissionError(errno.EPERM, "no rights here")

    monkeypatch.setattr(os, "chmod", refuse)
    assert verify_revision(shop.publish().path) == []


@pytest.mark.parametrize("error", [KeyboardInterrupt, MemoryError])
def test_an_interruption_leaves_nothing_half_written(shop, error):
    def render(revision, changes):
        raise error

    with pytest.raises(error):
        shop.publish(render=render)
    assert names(shop.folder) == []


def test_a_missing_input_is_named_and_nothing_is_published(shop, tmp_path):
    with pytest.raises(FitlibError, match=r"data/a\.csv: cannot be read: No such file"):
        shop.publish(inputs={"study.yaml": b"x", "data/a.csv": tmp_path / "a.csv"})
    assert names(shop.folder) == []


def test_data_that_changed_while_the_study_ran_are_refused(shop, tmp_path):
    (tmp_path / "a.csv").write_text("new")
    with pytest.raises(FitlibError, match=r"data/a\.csv: changed while the study ran"):
        shop.publish(inputs={"data/a.csv": tmp_path / "a.csv"}, input_digests={"data/a.csv": "0" * 64})
    assert names(shop.folder) == []


@pytest.mark.parametrize("path", ["../x", "/etc/x", "a/../../x", "a//b", "", "a\\b", "C:/x", "a\0b", "./a"])
def test_a_path_that_leaves_the_revision_is_refused(shop, path):
    with pytest.raises(ValueError, match="not a place in a revision"):
        shop.publish(files={path: b""})
    with pytest.raises(ValueError, match="not a place in a revision"):
        shop.publish(inputs={path: b""})
    assert not shop.folder.exists()


@pytest.mark.parametrize("path", ["manifest.json", "run.json", "run.sha256", "CHANGES.md", "inputs/study.yaml"])
def test_a_name_that_publishing_writes_itself_is_refused(shop, path):
    with pytest.raises(ValueError, match="not a place in a revision"):
        shop.publish(files={path: b""})


@pytest.mark.parametrize("study", ["../x", "", "A", "a/b", ".work", "x" * 61])
def test_a_study_whose_name_leads_elsewhere_is_refused(tmp_path, study):
    with pytest.raises(FitlibError, match="cannot name a folder"):
        publish(tmp_path, study, {}, {}, {}, {})


def test_a_fact_may_not_take_a_name_of_the_manifest(shop):
    with pytest.raises(ValueError, match="outputs"):
        shop.publish(facts={"outputs": {}})
    assert names(shop.folder) == []


def test_a_number_is_not_used_again_after_its_folder_was_removed(shop):
    shop.publish()
    shutil.rmtree(shop.publish(other(shop)).path)
    assert next_revision(shop.results_dir, "tank-gauges") == "rev-0003"
    published = shop.publish(other(shop))
    assert published.revision == "rev-0003"
    assert "rev-0002 was published and is no longer in the folder." in (published.path / "CHANGES.md").read_text()


@pytest.mark.parametrize("make", ["file", "link", "folder"])
def test_a_number_that_anything_occupies_is_left_alone(shop, tmp_path, make):
    shop.folder.mkdir(parents=True)
    place = shop.folder / "rev-0007"
    if make == "file":
        place.write_text("mine")
    elif make == "link":
        place.symlink_to(tmp_path)
    else:
        place.mkdir()
    assert shop.publish().revision == "rev-0008"
    assert place.is_symlink() or place.is_file() or not list(place.iterdir())


def test_a_revision_is_never_overwritten_by_a_rename(shop, monkeypatch, snapshot):
    before = snapshot(shop.publish().path)
    monkeypatch.setattr("fitlib.revision.publishing.numbers_in", lambda folder: set())  # another process was faster
    monkeypatch.setattr("fitlib.revision.publishing.read_ledger", lambda folder: {})
    with pytest.raises(FitlibError, match="no revision was published"):
        shop.publish(other(shop))
    assert snapshot(shop.folder / "rev-0001") == before


def test_a_damaged_ledger_does_not_stop_publishing(shop):
    shop.publish()
    (shop.folder / ".revisions").write_bytes(b"\xff\xfe nonsense\nrev-0009  -\n")
    assert shop.publish(other(shop)).revision == "rev-0010"


def test_a_damaged_latest_revision_does_not_stop_publishing(shop):
    manifest = shop.publish().path / "manifest.json"
    manifest.chmod(0o644)
    manifest.write_text("{")
    published = shop.publish()
    assert published.revision == "rev-0002"
    assert "Could not be compared with rev-0001" in (published.path / "CHANGES.md").read_text()


def test_the_latest_revision_is_the_one_with_the_highest_number(shop):
    assert latest_revision(shop.results_dir, "tank-gauges") is None
    shop.publish()
    published = shop.publish(other(shop))
    os.rename(published.path, shop.folder / "rev-10000")
    (shop.folder / "rev-10001x").mkdir()
    assert latest_revision(shop.results_dir, "tank-gauges") == shop.folder / "rev-10000"
    assert shop.publish().revision == "rev-10001"


@pytest.mark.parametrize("name", ["=1+1", "../x", "<b>", "a;rm -rf b", "Füllstand Ω"])
def test_a_strange_id_is_published_verified_and_read(shop, name):
    bundle = shop.synthetic.make_bundle([shop.synthetic.make_result(name, file_name="d~0123456789abcdef")])
    published = shop.publish(bundle, inputs={"study.yaml": b"x", "data/ü ; rm.csv": b"1"})
    assert verify_revision(published.path) == []
    revision = read_revision(published.path)
    assert list(revision.chosen["dataset"]) == [name] and list(revision.functions) == [name]
