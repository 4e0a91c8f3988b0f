"""From plan to revision: what is computed again, what is published, and what is not."""

import json
import os
import shutil

import pytest

from fitlib import analysis, figures
from fitlib.engine import batch
from fitlib.engine.batch import read_batch_output, run_batch
from fitlib.engine.prepare import forget_results, read_marker, remove_unfinished
from fitlib.engine.publish import run_publish
from fitlib.errors import FitlibError
from fitlib.plan import CodeIdentity, make
from fitlib.revision import latest_revision, verify_revision

STEPS = 6  # of a dataset: fits, two schemes, selection, result, figures


def test_the_first_run_computes_every_step_and_publishes(done):
    assert sorted(done.computed.values()) == [STEPS, STEPS]
    assert (done.first["revision"], done.first["new"]) == ("rev-0001", True)
    assert [row["dataset"] for row in done.first["rows"]] == ["cell-1", "cell-2"]
    assert verify_revision(done.results / "trial" / "rev-0001") == []
    assert {"resolved.json", "inputs/study.yaml", "inputs/cell-1.csv", "tables/chosen.csv"} <= set(
        done.contents("rev-0001")
    )


def test_an_unchanged_study_has_nothing_to_do(done):
    assert done.run() == (None, {})


@pytest.mark.parametrize(
    ("old", "new"),
    [
        ("weighting: none", "# a comment\nweighting: none"),
        ("{id: cell-1, files: [cell-1.csv]}", "{files: [cell-1.csv], id: cell-1}"),
        ("purpose: Try the engine.", "purpose: 'Try the engine.'"),
    ],
)
def test_what_means_the_same_has_nothing_to_do(done, old, new):
    done.edit("study.yaml", old, new)
    assert done.run() == (None, {})


def test_a_touched_file_has_nothing_to_do(done):
    os.utime(done.root / "cell-1.csv")
    assert done.run() == (None, {})


def test_an_edited_file_computes_its_own_dataset_only(done):
    done.edit("cell-1.csv", "1,3,1.499600", "1,3,1.499700")
    marker, computed = done.run()
    assert list(computed.values()) == [STEPS]
    assert (marker["revision"], marker["new"]) == ("rev-0002", True)
    before, after = done.contents("rev-0001"), done.contents("rev-0002")
    assert before["functions/cell-2.json"] == after["functions/cell-2.json"]
    assert before["functions/cell-1.json"] != after["functions/cell-1.json"]


def test_an_older_replacement_is_noticed(done):
    done.edit("cell-1.csv", "1,3,1.499600", "1,3,1.499700")
    os.utime(done.root / "cell-1.csv", (0, 0))
    marker, computed = done.run()
    assert list(computed.values()) == [STEPS]
    assert marker["revision"] == "rev-0002"


def test_a_scheme_that_changed_keeps_fits_and_the_other_scheme(done):
    done.edit("study.yaml", "draws: 20", "draws: 30")
    _, computed = done.run()
    assert sorted(computed.values()) == [4, 4]  # bootstrap, selection, result, figures


def test_a_member_of_a_common_batch_is_kept(bench):
    bench.run(batches=1)
    bench.edit("cell-1.csv", "1,3,1.499600", "1,3,1.499700")
    assert bench.run(batches=1)[1] == {"00": STEPS}
    planned = bench.plan(batches=1).batches[0]
    output = read_batch_output(bench.work.batches / planned.file_name, planned)
    names = ["fits", "scheme:leave_one_level_out", "scheme:bootstrap", "selection", "result", "figures"]
    assert output["account"] == {"computed": dict.fromkeys(names, 1), "kept": dict.fromkeys(names, 1)}


def test_another_number_of_batches_computes_nothing(done):
    assert done.run(batches=1) == (None, {})
    done.edit("study.yaml", "title: Trial", "title: Another")
    assert done.run(batches=1)[1] == {"00": 2}  # the results; figures show no title


def test_going_back_makes_a_new_revision_and_computes_nothing(done):
    done.edit("study.yaml", "draws: 20", "draws: 30")
    done.run()
    done.edit("study.yaml", "draws: 30", "draws: 20")
    marker, computed = done.run()
    assert marker["revision"] == "rev-0003"
    assert sorted(computed.values()) == [0, 0]
    assert done.contents("rev-0003") == done.contents("rev-0001")


def test_the_order_of_datasets_changes_nothing(bench, tmp_path):
    bench.run()
    before = bench.contents("rev-0001")
    shutil.rmtree(bench.results)
    one, other = "  - {id: cell-1, files: [cell-1.csv]}\n", "  - {id: cell-2, files: [cell-2.csv]}\n"
    bench.edit("study.yaml", one + other, other + one)
    bench.run(batches=1)
    after = bench.contents("rev-0001")
    assert before.pop("inputs/study.yaml") != after.pop("inputs/study.yaml")
    assert after == before


def test_without_its_working_folder_a_study_ends_in_the_same_bytes(done):
    before = done.contents("rev-0001")
    shutil.rmtree(done.work.root)
    marker, computed = done.run()
    assert sorted(computed.values()) == [STEPS, STEPS]
    assert (marker["revision"], marker["new"]) == ("rev-0001", False)
    shutil.rmtree(done.results)
    done.run()
    assert done.contents("rev-0001") == before


def test_forgotten_results_are_computed_again(done):
    forget_results(done.work)
    marker, computed = done.run()
    assert sorted(computed.values()) == [STEPS, STEPS]
    assert marker["new"] is False


def damaged(text: str) -> str:
    """The same text with one digit of its data changed."""
    place = text.index('"value":') + len('"value":')
    digit = next(index for index in range(place, len(text)) if text[index].isdigit())
    return text[:digit] + str((int(text[digit]) + 1) % 10) + text[digit + 1 :]


@pytest.mark.parametrize("damage", [damaged, lambda text: text[: len(text) // 2], lambda text: ""])
def test_damaged_entries_of_the_store_are_computed_again(done, damage):
    before = done.contents("rev-0001")
    for path in done.work.store.rglob("*.json"):
        path.write_text(damage(path.read_text()))
    for folder in (done.work.batches, done.results / "trial" / "rev-0001"):
        shutil.rmtree(folder)
    marker, computed = done.run()
    assert sorted(computed.values()) == [STEPS, STEPS]
    assert done.contents(marker["revision"]) == before


def test_an_entry_that_is_lost_after_its_batch_is_computed_while_publishing(bench):
    plan, plan_file = bench.plan_file()
    bench.run_batches(plan, plan_file)
    shutil.rmtree(bench.work.store)
    marker = run_publish(plan_file, bench.work.marker(plan.digest))
    assert marker["new"] is True


@pytest.mark.parametrize("text", ["", "{", '{"format": 1}', "[]"])
def test_a_damaged_batch_output_is_made_again(done, text):
    forget = done.work.published
    shutil.rmtree(forget)
    path = next(done.work.batches.glob("*.json"))
    path.write_text(text)
    marker, computed = done.run()
    assert list(computed.values()) == [0]
    assert marker["new"] is False


def test_a_batch_output_of_other_fingerprints_is_refused(bench):
    plan, plan_file = bench.plan_file()
    bench.run_batches(plan, plan_file)
    path = next(bench.work.batches.glob("*.json"))
    output = json.loads(path.read_text())
    output["members"] = {name: "0" * 64 for name in output["members"]}
    path.write_text(json.dumps(output))
    with pytest.raises(FitlibError, match="missing, damaged or not what was planned: run again"):
        run_publish(plan_file, bench.work.marker(plan.digest))
    assert latest_revision(bench.results, "trial") is None


def fail_for(name, original):
    def run_step(step, study, dataset, observations, earlier):
        if dataset.id == name and step == "selection":
            raise ZeroDivisionError("division by\nzero")
        return original(step, study, dataset, observations, earlier)

    return run_step


def test_a_dataset_that_fails_is_named_and_the_others_are_kept(bench, monkeypatch, capsys):
    with monkeypatch.context() as patch:
        patch.setattr(analysis, "run_step", fail_for("cell-1", analysis.run_step))
        with pytest.raises(FitlibError, match="1 dataset failed.*\ncell-1: ZeroDivisionError: division by zero"):
            bench.run()
    assert "Traceback" in capsys.readouterr().err  # goes to the log of the job
    assert latest_revision(bench.results, "trial") is None
    marker, computed = bench.run()
    assert marker["revision"] == "rev-0001"
    assert list(computed.values()) == [3]  # selection, result and figures of the one that failed


def test_a_failure_while_drawing_is_named_too(bench, monkeypatch):
    def draw_dataset(result):
        raise RuntimeError("no canvas")

    monkeypatch.setattr(figures, "draw_dataset", draw_dataset)
    with pytest.raises(FitlibError, match="2 datasets failed.*\ncell-1: RuntimeError: no canvas\ncell-2"):
        bench.run(batches=1)


def test_data_that_change_while_a_batch_runs_are_not_accepted(bench, monkeypatch):
    plan, plan_file = bench.plan_file(batches=1)
    original = analysis.assemble

    def assemble(*arguments):
        monkeypatch.setattr(analysis, "assemble", original)  # once is enough
        bench.edit("cell-2.csv", "1,3,1.199600", "1,3,1.199700")
        return original(*arguments)

    monkeypatch.setattr(analysis, "assemble", assemble)
    output = bench.work.batches / plan.batches[0].file_name
    with pytest.raises(FitlibError, match="cell-2: study or data changed while the run was going on: run again"):
        run_batch(plan_file, "00", output)
    assert not output.exists()


@pytest.mark.parametrize(
    ("old", "new"), [("title: Trial", "title: Another"), ("  - {id: cell-2, files: [cell-2.csv]}\n", "")]
)
def test_a_study_that_changes_before_it_is_published_is_not_published(bench, old, new):
    plan, plan_file = bench.plan_file()
    bench.run_batches(plan, plan_file)
    bench.edit("study.yaml", old, new)
    with pytest.raises(FitlibError, match="changed while the run was going on: run again"):
        run_publish(plan_file, bench.work.marker(plan.digest))
    assert latest_revision(bench.results, "trial") is None


def test_files_of_other_plans_are_removed_when_a_plan_is_published(done):
    old = done.plan()
    done.edit("study.yaml", "draws: 20", "draws: 30")
    done.run()
    new = done.plan()
    assert [path.name for path in done.work.published.iterdir()] == [f"{new.digest[:16]}.json"]
    assert not done.work.plan_file(old.digest).exists()
    assert {path.name for path in done.work.batches.iterdir()} == {batch.file_name for batch in new.batches}


def test_a_program_that_changed_since_it_planned_is_refused(bench, monkeypatch):
    plan, plan_file = bench.plan_file(batches=1)
    monkeypatch.setattr(batch, "code_identity", lambda cache: CodeIdentity("other", "d" * 64, "r" * 64))
    with pytest.raises(FitlibError, match="the program is not the one that planned the run: run again"):
        run_batch(plan_file, "00", bench.work.batches / plan.batches[0].file_name)


def test_a_full_disk_stops_the_batch_and_leaves_nothing(bench, monkeypatch):
    plan, plan_file = bench.plan_file(batches=1)

    def fsync(descriptor):
        raise OSError(28, "No space left on device")

    monkeypatch.setattr(os, "fsync", fsync)
    with pytest.raises(OSError, match="No space left"):
        run_batch(plan_file, "00", bench.work.batches / plan.batches[0].file_name)
    monkeypatch.undo()
    assert list(bench.work.leftovers()) == []
    assert not list(bench.work.store.rglob("*.json"))


def with_versions(monkeypatch, **versions):
    known = make.numeric_versions()
    for module in (make, batch):
        monkeypatch.setattr(module, "numeric_versions", lambda: {**known, **versions})


def test_library_versions_alone_compute_again_and_make_no_revision(done, monkeypatch):
    with_versions(monkeypatch, numpy="99.0")
    marker, computed = done.run()
    assert sorted(computed.values()) == [STEPS, STEPS]
    assert (marker["revision"], marker["new"]) == ("rev-0001", False)
    assert done.run() == (None, {})


def test_library_versions_with_other_numbers_make_a_revision(done, monkeypatch):
    original = analysis.assemble

    def assemble(*arguments):
        result = original(*arguments)
        result["candidates"][0]["residual_sum_of_squares"] *= 1.0001
        return result

    monkeypatch.setattr(analysis, "assemble", assemble)
    with_versions(monkeypatch, numpy="99.0")
    assert done.run()[0]["revision"] == "rev-0002"


def test_what_killed_processes_leave_is_swept(done):
    left = done.work.store / "00" / ".new-abc"
    left.parent.mkdir(exist_ok=True)
    left.write_text("half")
    remove_unfinished(done.plan(), done.work)
    assert not left.exists()


def test_a_marker_counts_only_while_its_revision_is_the_latest_and_intact(done):
    plan = done.plan()
    assert read_marker(plan, done.work)["revision"] == "rev-0001"
    table = done.results / "trial" / "rev-0001" / "tables" / "chosen.csv"
    table.chmod(0o644)
    table.write_text(table.read_text().replace("cell-1", "cell-9"))
    assert read_marker(plan, done.work) is None


def test_an_altered_revision_is_told_and_never_repaired(done):
    table = done.results / "trial" / "rev-0001" / "tables" / "chosen.csv"
    table.chmod(0o644)
    table.write_text("altered")
    marker, computed = done.run()
    assert computed == {}
    assert "tables/chosen.csv" in marker["note"]
    assert table.read_text() == "altered"


def test_the_working_folder_keeps_itself_out_of_version_control(done):
    assert (done.work.root / ".gitignore").read_text() == "*\n"
