"""An altered revision is never handed out in silence, and no new one is built on it without a word."""

import io

import pytest

from fitlib.cli import main
from fitlib.engine import dry_run, launch, run_study
from fitlib.engine.process import Ended
from fitlib.errors import VerificationError
from fitlib.revision import latest_revision, verify_revision


@pytest.fixture
def bench(done, monkeypatch):
    """A study that was published once, whose next run does the jobs in this process; we stand in its folder."""

    def run_child(command, folder, log, on_line):
        log.parent.mkdir(parents=True, exist_ok=True)
        log.write_text("")
        done.run()
        return Ended(0, False)

    monkeypatch.setattr(launch, "run_child", run_child)
    monkeypatch.chdir(done.root)
    return done


def start(bench, **options):
    return run_study(bench.root / "study.yaml", bench.results, stream=io.StringIO(), **options)


def write(bench, name, text):
    """Write a file of the published revision; None removes it."""
    path = bench.results / "trial" / "rev-0001" / name
    if path.exists():
        path.chmod(0o644)
    if text is None:
        path.unlink()
    else:
        path.write_text(text)


ALTERED = {
    "tables/chosen.csv": "altered",
    "functions/cell-1.json": "{}",
    "report.html": "<p>fine</p>",
    "CHANGES.md": None,
    "extra.txt": "new",
}


@pytest.mark.parametrize("name", ALTERED)
@pytest.mark.parametrize("fresh", [False, True])
def test_an_altered_revision_ends_a_run_that_should_hand_it_out(bench, name, fresh):
    write(bench, name, ALTERED[name])
    for _ in range(2):  # the second time nothing has to be computed
        with pytest.raises(VerificationError) as told:
            start(bench, fresh=fresh)
        message = str(told.value)
        assert message.startswith(f"results/trial/rev-0001 is not as it was published ({name}: ")
        assert message.endswith(
            "; nothing was published: put the published files back from a copy, or move the folder away and run again"
        )
    assert latest_revision(bench.results, "trial").name == "rev-0001"


@pytest.mark.parametrize("name", [*ALTERED, "manifest.json"])
def test_new_data_are_published_beside_it_and_it_is_told(bench, name):
    write(bench, name, ALTERED.get(name, "{}"))
    bench.edit("cell-1.csv", "1,3,1.499600", "1,3,1.499700")
    summary = start(bench)
    assert (summary.revision, summary.new) == ("rev-0002", True)
    assert summary.altered.startswith("results/trial/rev-0001 is not as it was published (")
    assert "rev-0002 was published all the same" in summary.altered
    assert verify_revision(bench.results / "trial" / "rev-0002") == []
    assert start(bench).altered == ""  # the latest revision is sound again


def test_a_sound_revision_is_not_spoken_of(bench):
    assert start(bench).altered == ""
    assert start(bench, fresh=True).altered == ""
    bench.edit("cell-1.csv", "1,3,1.499600", "1,3,1.499700")
    assert dry_run("study.yaml", "results").altered == ""
    assert start(bench).altered == ""


def test_the_command_ends_with_status_3_in_each_case(bench, capsys):
    def fitlib(*words):
        status = main(
            ["run", "study.yaml", "--quiet", *words] if "--dry-run" not in words else ["run", "study.yaml", *words]
        )
        return status, *capsys.readouterr()

    write(bench, "tables/chosen.csv", "altered")
    status, out, err = fitlib("--dry-run")
    assert status == 3 and "trial: nothing else has changed" in out.splitlines()
    assert "every step is stored" not in out
    assert err.startswith("fitlib: results/trial/rev-0001 is not as it was published (tables/chosen.csv: altered")
    assert "a run would publish nothing: put the published files back" in err
    status, out, err = fitlib()
    assert status == 3 and "revision: " not in out and "nothing was published: put the published files back" in err
    bench.edit("cell-1.csv", "1,3,1.499600", "1,3,1.499700")
    status, out, err = fitlib("--dry-run")
    assert status == 3 and "steps would be computed" in out and "a run would publish the new results beside it" in err
    status, out, err = fitlib()
    assert status == 3 and out.splitlines()[-1].endswith("rev-0002")
    assert "rev-0002 was published all the same: do not use the altered one" in err
    assert fitlib()[0] == 0


def test_moved_away_it_is_published_again_under_a_new_number(bench):
    write(bench, "tables/chosen.csv", "altered")
    (bench.results / "trial" / "rev-0001").rename(bench.root / "moved")
    summary = start(bench)
    assert (summary.revision, summary.new, summary.altered) == ("rev-0002", True, "")
