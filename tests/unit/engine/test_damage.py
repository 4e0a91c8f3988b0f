"""Whatever stands in the working folder, it asks nobody for anything: it is taken for missing and made again."""

import json
import os
import shutil

import pytest

from fitlib.engine import batch_main, dry_run
from fitlib.engine.batch import read_batch_output
from fitlib.engine.files import named_errors, plain_os_errors, read_json, read_sealed, write_atomic, write_sealed
from fitlib.engine.locks import take_lock
from fitlib.engine.planfile import read_latest_plan
from fitlib.engine.prepare import read_marker, read_record, remove_unfinished
from fitlib.engine.process import run_child
from fitlib.engine.summary import SummaryRow
from fitlib.engine.workflow import _path
from fitlib.errors import FitlibError
from fitlib.plan import digest

DEEP = "[" * 100_000 + "]" * 100_000


def with_digest(content: dict) -> str:
    """A file whose digest is right and whose content is not."""
    return json.dumps({**content, "sha256": digest(content)})


def odd_texts(text: str) -> list[str]:
    """Texts that a file with this text could turn into."""
    content = json.loads(text)
    content.pop("sha256")
    return [
        "",
        "null",
        "[]",
        DEEP,
        text.replace("{", '{"more": NaN,', 1),
        text.replace("{", '{"more": 1e999,', 1),
        text[: len(text) // 2],
        with_digest({}),
        *(with_digest({key: value for key, value in content.items() if key != name}) for name in content),
    ]


def test_a_damaged_batch_output_is_none(done):
    batch = done.plan().batches[0]
    path = done.work.batches / batch.file_name
    texts = odd_texts(path.read_text())
    assert len(texts) == 8 + 7
    assert read_batch_output(path, batch) is not None
    for text in texts:
        path.write_text(text)
        assert read_batch_output(path, batch) is None
    path.unlink()
    path.mkdir()
    assert read_batch_output(path, batch) is None


def test_a_damaged_record_of_a_publication_is_none(done):
    plan = done.plan()
    path = done.work.marker(plan.digest)
    good = json.loads(path.read_text())
    good.pop("sha256")
    rows = good["rows"]
    odd_rows = [
        [],
        rows[:1],
        rows[::-1],
        None,
        3,
        [None, None],
        [{**rows[0], "more": 1}, rows[1]],
        [{"dataset": "cell-1"}],
    ]
    texts = odd_texts(path.read_text())
    assert len(texts) == 8 + 5
    assert [row.dataset for row in read_record(plan, done.work)["rows"]] == ["cell-1", "cell-2"]
    for text in [*texts, *(with_digest({**good, "rows": odd}) for odd in odd_rows)]:
        path.write_text(text)
        assert read_record(plan, done.work) is None
        assert read_marker(plan, done.work) is None
        assert not dry_run(done.root / "study.yaml", done.results).unchanged


def test_a_damaged_plan_of_the_last_run_is_none(done):
    assert read_latest_plan(done.work) is not None
    path = done.work.latest_plan
    for text in odd_texts(path.read_text()):
        path.write_text(text)
        assert read_latest_plan(done.work) is None
        done.plan_file()
    path.write_text(json.dumps(json.loads(path.read_text()) | {"datasets": [None]}))
    assert read_latest_plan(done.work) is None


def make_folder(path):
    """A folder with something in it, in place of a file."""
    if path.exists():
        path.unlink()
    (path / "inner").mkdir(parents=True)
    (path / "inner" / "x.json").write_text("{}")


def make_file(path):
    """A file in place of a folder."""
    shutil.rmtree(path)
    path.write_text("{}")


def test_folders_in_place_of_files_are_made_again(done):
    plan = done.plan()
    work = done.work
    files = [
        work.plan_file(plan.digest),
        work.marker(plan.digest),
        work.latest_plan,
        work.root / ".gitignore",
        *(work.batches / batch.file_name for batch in plan.batches),
        *(work.batch_log(batch.file_name) for batch in plan.batches),
        work.publish_log(plan.digest),
        *work.store.glob("*/*.json"),
        work.trees,
        work.run_lock,
        work.publish_lock,
    ]
    before = done.contents("rev-0001")
    for path in files:
        make_folder(path)
    with take_lock(work.run_lock, "x"):
        marker, computed = done.run()
    assert sorted(computed.values()) == [6, 6]  # fits, two schemes, selection, result, figures
    assert (marker["revision"], marker["new"]) == ("rev-0001", False)
    assert done.contents("rev-0001") == before
    assert not any(path.is_dir() for path in files)


@pytest.mark.parametrize("name", ["store", "batches", "published", "plans", "logs"])
def test_a_file_in_place_of_a_folder_is_made_again(done, name):
    (done.work.logs / "batches").mkdir(parents=True, exist_ok=True)
    make_file(done.work.root / name)
    done.run()
    assert read_marker(done.plan(), done.work)["revision"] == "rev-0001"


def test_a_file_in_place_of_a_folder_of_the_store_is_made_again(done):
    for folder in list(done.work.store.iterdir()):
        make_file(folder)
    shutil.rmtree(done.work.batches)
    shutil.rmtree(done.work.published)
    assert sorted(done.run()[1].values()) == [6, 6]


def test_a_folder_of_the_working_folder_may_be_a_link(done, tmp_path):
    elsewhere = tmp_path / "elsewhere"
    done.work.store.rename(elsewhere)
    done.work.store.symlink_to(elsewhere)
    shutil.rmtree(done.work.batches)
    shutil.rmtree(done.work.published)
    assert set(done.run()[1].values()) == {0}
    assert done.work.store.is_symlink()


def test_outside_the_working_folder_nothing_is_cleared_away(tmp_path):
    (tmp_path / "mine").write_text("mine")
    (tmp_path / "folder").mkdir()
    with pytest.raises(OSError, match="mine"):
        write_atomic(tmp_path / "mine" / "x.json", "{}")
    with pytest.raises(OSError, match="folder"):
        write_atomic(tmp_path / "folder", "{}")
    assert (tmp_path / "mine").read_text() == "mine"
    assert (tmp_path / "folder").is_dir()


def test_jobs_tell_a_damaged_plan_plainly(done):
    _, plan_file = done.plan_file()
    plan_file.write_text(DEEP)
    with pytest.raises(FitlibError, match="the plan is missing or damaged: run again"):
        batch_main([str(plan_file), "00", str(done.work.batches / "x.json")])


def test_what_is_sealed_comes_back(tmp_path):
    write_sealed(tmp_path / "x.json", {"a": [1.5, None], "b": {}})
    assert read_sealed(tmp_path / "x.json") == {"a": [1.5, None], "b": {}}
    assert read_json(tmp_path / "missing.json") is None


def test_a_store_entry_that_nests_too_deep_is_computed_again(done):
    for path in done.work.store.glob("*/*.json"):
        path.write_text(DEEP)
    shutil.rmtree(done.work.batches)
    shutil.rmtree(done.work.published)
    assert sorted(done.run()[1].values()) == [6, 6]


def test_a_marker_of_another_plan_does_not_count(done):
    plan = done.plan()
    path = done.work.marker(plan.digest)
    content = read_sealed(path)
    write_sealed(path, {**content, "plan": "0" * 64})
    assert read_record(plan, done.work) is None
    remove_unfinished(plan, done.work)
    assert not path.exists()


def no_space(*ignored):
    raise OSError(28, "No space left on device")


def test_a_full_disk_is_told_with_the_file(tmp_path, monkeypatch):
    monkeypatch.setattr(os, "fsync", no_space)
    told = pytest.raises(FitlibError, match=r"^the run stopped: .*x\.json: No space left on device$")
    with told, plain_os_errors("the run stopped"):
        write_atomic(tmp_path / "x.json", "{}")


def test_a_full_disk_is_told_with_the_lock(tmp_path, monkeypatch):
    monkeypatch.setattr(os, "pwrite", no_space)
    with pytest.raises(OSError, match="run.lock"):
        take_lock(tmp_path / "run.lock", "x")


def test_a_full_disk_is_told_with_the_log(tmp_path):
    """``/dev/full`` of Linux refuses every write as a full disk does."""
    if not os.path.exists("/dev/full"):
        pytest.skip("no /dev/full here")
    log = tmp_path / "run.log"
    log.symlink_to("/dev/full")
    with pytest.raises(OSError, match=r"No space left on device: .*run\.log"):
        run_child(["echo", "x"], tmp_path, log, lambda line: None)


def test_a_place_that_is_known_is_not_replaced(tmp_path):
    with pytest.raises(OSError, match="known"), named_errors(tmp_path / "other"):
        raise OSError(28, "No space left on device", "known")


@pytest.mark.parametrize("name", [b"by\xff te", b"r\xc3\xa9sultats", b"100% #?;"])
def test_a_file_uri_gives_back_every_name(tmp_path, name):
    path = tmp_path / os.fsdecode(name)
    assert _path(path.as_uri()) == str(path)
    assert _path("plain name") == "plain name"


def test_a_row_tells_warnings_and_target():
    result = {"dataset": "cell-1", "selection": {"verdict": "adequate", "target_met": False}, "warnings": ["a", "b"]}
    row = SummaryRow.of(result)
    assert (row.warnings, row.target_met, row.verdict, row.loss) == (2, False, "adequate", None)
    assert SummaryRow(**row.to_dict()) == row
