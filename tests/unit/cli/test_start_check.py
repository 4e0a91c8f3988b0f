"""A study is proposed from data, and checked; the summary says what a run would work on."""

from pathlib import Path

import pytest

import fitlib as package
from fitlib.cli.check import LISTED, describe
from fitlib.cli.checking import CheckSummary, DatasetSummary, check
from fitlib.cli.output import align, write_new_file
from fitlib.errors import InputError


def test_the_summary_counts_datasets_levels_series_and_observations(study, fitlib):
    status, out, err = fitlib("check", "study.yaml")
    assert (status, err) == (0, "")
    lines = out.splitlines()
    assert lines[0] == "study.yaml: no faults found"
    assert "candidates  3: polynomial-1, polynomial-2, polynomial-3" in lines
    assert "datasets    2" in lines
    table = [line.split() for line in lines if line.startswith("  ")]
    assert table[0] == ["dataset", "levels", "series", "used", "excluded", "verification"]
    assert table[1] == ["LS-101", "11", "3", "33", "0", "0"]
    assert table[2] == ["LS-102", "11", "2", "21", "1", "11"]
    assert " ".join(table[3]) == "all levels 11, series 2 to 3; observations: 54 used, 1 excluded, 11 verification"


def test_all_problems_are_told_one_a_line(study, fitlib):
    text = Path("study.yaml").read_text().replace("families:", "famlies:").replace("format: 1", "format: 9")
    Path("study.yaml").write_text(text)
    place = text.splitlines().index("famlies:") + 1
    status, out, err = fitlib("check", "study.yaml")
    assert (status, out) == (2, "")
    lines = err.splitlines()
    assert any(line.startswith("study.yaml:1: format: ") for line in lines)
    assert any("famlies" in line and line.startswith(f"study.yaml:{place}: ") for line in lines)


def test_problems_of_the_data_name_file_and_row(study, fitlib):
    for number in (101, 102):
        path = Path(f"LS-{number}.csv")
        lines = path.read_text().splitlines()
        lines[3] = "2,broken,1"
        path.write_text("\n".join(lines) + "\n")
    status, _, err = fitlib("check", "study.yaml")
    assert status == 2
    assert any(line.startswith("LS-101.csv:4: ") for line in err.splitlines())
    assert any(line.startswith("LS-102.csv:4: ") for line in err.splitlines())


def test_warnings_are_part_of_the_summary(study, fitlib):
    path = Path("study.yaml")
    path.write_text(
        path.read_text()
        + "random_seed: 1\nvalidation:\n  - {scheme: leave_one_level_out}\n"
        + "  - {scheme: k_fold, folds: 5, unit: observation}\n"
    )
    status, out, _ = fitlib("check", "study.yaml")
    assert status == 0
    head, tail = out.split("\nwarnings    ")
    assert tail.split("\n", 1)[0] == str(len(tail.strip().splitlines()) - 1) != "0"
    assert "k_fold" in tail and "study.yaml:" in tail


def test_a_remark_on_the_data_is_told_once(study, fitlib):
    path = Path("LS-101.csv")
    path.write_text(path.read_text() + path.read_text().splitlines()[5] + "\n")
    status, out, _ = fitlib("check", "study.yaml")
    warnings = out.split("\nwarnings    ")[1].splitlines()
    assert (status, warnings[0], len(warnings)) == (0, "1", 2)
    assert "LS-101.csv" in warnings[1]


def test_check_is_public_and_raises_for_a_fault(study):
    summary = package.check("study.yaml")
    assert [each.dataset for each in summary.datasets] == ["LS-101", "LS-102"]
    Path("LS-102.csv").unlink()
    with pytest.raises(InputError, match="LS-102.csv"):
        package.check("study.yaml")


def test_rows_of_a_dataset_balance(study):
    for each in check("study.yaml").datasets:
        assert each.read == each.used + each.excluded + each.verification == 33


def test_of_many_datasets_the_first_are_listed_and_all_are_summed_up(study):
    one = check("study.yaml")
    many = tuple(DatasetSummary(f"LS-{n:03}", 5 + n % 7, 3, 35, 30, 2, 3) for n in range(200))
    lines = describe(CheckSummary(one.study, many, ()), "study.yaml")
    assert len(lines) < LISTED + 20
    assert f"  and {200 - LISTED} more datasets" in lines
    assert any("levels 5 to 11, series 3; observations: 6000 used, 400 excluded, 600" in line for line in lines)


def test_start_writes_beside_the_data_and_the_study_passes_the_check(study, fitlib):
    status, out, err = fitlib("start", "LS-101.csv", "--study", "spring-batch")
    assert (status, err) == (0, "")
    assert out.startswith("wrote LS-101-study.yaml: ")
    assert "spring-batch" in Path("LS-101-study.yaml").read_text()
    status, out, err = fitlib("check", "LS-101-study.yaml")
    assert (status, err) == (0, "") and "spring-batch" in out


def test_start_replaces_nothing(study, fitlib):
    Path("LS-101-study.yaml").write_text("mine")
    status, out, err = fitlib("start", "LS-101.csv")
    assert (status, out) == (2, "")
    assert err == "LS-101-study.yaml: exists already and is not replaced; give another --output\n"
    assert Path("LS-101-study.yaml").read_text() == "mine"


def test_start_can_print_the_study(study, fitlib):
    before = sorted(study.iterdir())
    status, out, _ = fitlib("start", "LS-101.csv", "--output", "-")
    assert status == 0 and "format: 1" in out
    assert sorted(study.iterdir()) == before


def test_start_keeps_the_study_in_the_folder_of_the_data(study, fitlib):
    Path("elsewhere").mkdir()
    status, _, err = fitlib("start", "LS-101.csv", "--output", "elsewhere/study.yaml")
    assert status == 2 and "a study stands in the folder of its data" in err
    assert fitlib("start", study / "LS-101.csv", "--output", "new.yaml")[0] == 0


def test_start_tells_what_is_wrong_with_the_data(study, fitlib):
    Path("text.csv").write_text("a,b\nx,y\n")
    status, out, err = fitlib("start", "text.csv")
    assert (status, out) == (2, "") and err.startswith("text.csv")
    assert not Path("text-study.yaml").exists()


def test_a_new_file_is_whole_and_leaves_nothing_beside_it(tmp_path):
    path = tmp_path / "new.txt"
    write_new_file(str(path), "caf\u00e9\n")
    assert path.read_bytes() == "caf\u00e9\n".encode()
    assert list(tmp_path.iterdir()) == [path]
    with pytest.raises(InputError, match="exists already"):
        write_new_file(str(path), "other")
    assert path.read_bytes() == "caf\u00e9\n".encode()
    assert list(tmp_path.iterdir()) == [path]


def test_a_new_file_without_hard_links_is_renamed_into_place(tmp_path, monkeypatch):
    def no_links(*names):
        raise OSError("links are not supported")

    monkeypatch.setattr("os.link", no_links)
    write_new_file(str(tmp_path / "new.txt"), "text")
    assert [path.name for path in tmp_path.iterdir()] == ["new.txt"]


def test_a_file_that_appears_meanwhile_is_not_replaced(tmp_path, monkeypatch):
    path = tmp_path / "new.txt"
    monkeypatch.setattr("os.fsync", lambda descriptor: path.write_text("theirs"))
    with pytest.raises(InputError, match="exists already"):
        write_new_file(str(path), "ours")
    assert path.read_text() == "theirs" and list(tmp_path.iterdir()) == [path]


def test_a_dangling_link_counts_as_a_file(tmp_path):
    path = tmp_path / "link.txt"
    path.symlink_to(tmp_path / "nowhere")
    with pytest.raises(InputError, match="exists already"):
        write_new_file(str(path), "text")


def test_a_missing_folder_is_told(tmp_path):
    with pytest.raises(InputError, match="the folder .* does not exist"):
        write_new_file(str(tmp_path / "no" / "new.txt"), "text")


def test_tables_are_aligned():
    assert align(("name", "n"), [("a", "1"), ("longer", "200")], {"n"}) == "name      n\na         1\nlonger  200"
