"""Data files lie inside the study's folder, and patterns find them in one order."""

from __future__ import annotations

import os

import pytest

PATTERN = ("  - id: FM-1\n    files: [data/fm-1.csv]\n", "  - ids_from: {}\n")


def with_pattern(pattern: str) -> tuple[str, str]:
    return PATTERN[0], PATTERN[1].format(f"'{pattern}'")


@pytest.mark.parametrize(
    ("name", "word"),
    [
        ("/etc/passwd", "is absolute"),
        ("//host/share", "is absolute"),
        ("C:/data/a.csv", "is absolute"),
        ("c:a.csv", "is absolute"),
        ("'data\\fm-1.csv'", "has a backslash"),
        ("../data/fm-1.csv", "leaves the study's folder by .."),
        ("data/../../x.csv", "leaves the study's folder by .."),
        ("data/../data/fm-1.csv", "leaves the study's folder by .."),
        ("data/none.csv", "there is no file 'data/none.csv'"),
        ("data/fm-1.csv/x", "there is no file"),
        ("data", "is not an ordinary file"),
        (".", "names no file"),
        ("./study.yaml", "is the name kept for the study"),
        ("a" * 300, "there is no file"),
    ],
)
def test_a_file_name_that_cannot_be_used_is_refused(bench, valid, name, word):
    line, key, message = bench.only(valid, ("data/fm-1.csv", name))
    assert (line, key) == (8, "datasets[0].files[0]") and word in message


def test_a_link_that_leaves_the_folder_is_refused(bench, valid, tmp_path_factory):
    outside = tmp_path_factory.mktemp("elsewhere") / "secret.csv"
    outside.write_text("a,b\n")
    (bench.folder / "data" / "link.csv").symlink_to(outside)
    (bench.folder / "shared").symlink_to(outside.parent)
    for name in ("data/link.csv", "shared/secret.csv"):
        assert "leaves the study's folder through a link" in bench.only(valid, ("data/fm-1.csv", name))[2]


def test_a_link_to_a_folder_with_a_longer_name_is_outside(bench, valid):
    neighbour = bench.folder.with_name(bench.folder.name + "-other")
    neighbour.mkdir()
    (neighbour / "a.csv").write_text("a,b\n")
    (bench.folder / "near.csv").symlink_to(neighbour / "a.csv")
    assert "through a link" in bench.only(valid, ("data/fm-1.csv", "near.csv"))[2]


def test_a_link_inside_the_folder_is_a_file_like_any_other(bench, valid):
    (bench.folder / "data" / "link.csv").symlink_to(bench.folder / "data" / "fm-1.csv")
    assert bench.load(valid, ("data/fm-1.csv", "data/link.csv")).datasets[0].files == ("data/link.csv",)


def test_a_link_that_runs_in_a_circle_is_refused(bench, valid):
    (bench.folder / "data" / "loop.csv").symlink_to("loop.csv")
    assert "'data/loop.csv'" in bench.only(valid, ("data/fm-1.csv", "data/loop.csv"))[2]


def test_a_pipe_is_not_opened(bench, valid):
    os.mkfifo(bench.folder / "data" / "pipe.csv")
    assert "not an ordinary file" in bench.only(valid, ("data/fm-1.csv", "data/pipe.csv"))[2]


def test_the_study_itself_is_not_a_data_file(bench, valid):
    (bench.folder / "copy.csv").symlink_to("study.yaml")
    assert "is the study itself" in bench.only(valid, ("data/fm-1.csv", "copy.csv"))[2]


def test_a_study_in_a_folder_that_is_a_link_loads(bench, valid, tmp_path_factory):
    from fitlib.study import load_study

    bench.load()
    link = tmp_path_factory.mktemp("links") / "here"
    link.symlink_to(bench.folder)
    assert load_study(link / "study.yaml").datasets[0].files == ("data/fm-1.csv",)


def test_every_wrong_file_of_a_dataset_is_named(bench, valid):
    problems = bench.problems(valid, ("[data/fm-1.csv]", "[/a.csv, data/fm-1.csv, ../b.csv, data/c.csv]"))
    assert [problem.key[-2] for problem in problems] == ["0", "2", "3"]


def test_one_file_listed_twice_is_refused_under_any_spelling(bench, valid):
    _, key, message = bench.only(valid, ("[data/fm-1.csv]", "[data/fm-1.csv, ./data//fm-1.csv]"))
    assert key == "datasets[0].files[1]" and "listed twice" in message


def test_a_file_name_is_stored_without_idle_parts(bench, valid):
    assert bench.load(valid, ("data/fm-1.csv", "./data//fm-1.csv")).datasets[0].files == ("data/fm-1.csv",)


def test_a_pattern_gives_one_dataset_for_each_file_in_one_order(bench, valid):
    study = bench.load(valid, with_pattern("data/*-?.csv"))
    assert [(dataset.id, dataset.files) for dataset in study.datasets] == [
        ("batch-1", ("data/batch-1.csv",)),
        ("batch-2", ("data/batch-2.csv",)),
        ("fm-1", ("data/fm-1.csv",)),
        ("fm-2", ("data/fm-2.csv",)),
    ]


def test_a_pattern_reaches_through_folders_named_by_a_star(bench, valid):
    (bench.folder / "more" / "deep").mkdir(parents=True)
    (bench.folder / "more" / "deep" / "x.csv").write_text("a,b\n")
    assert [dataset.id for dataset in bench.load(valid, with_pattern("*/deep/*.csv")).datasets] == ["x"]


@pytest.mark.parametrize(
    ("pattern", "word"),
    [
        ("data/none-*.csv", "matches no file"),
        ("nowhere/*.csv", "matches no file"),
        ("*", "matches no file"),
        ("**/*.csv", "a star matches within one folder"),
        ("../*.csv", "leaves the study's folder by .."),
        ("/tmp/*", "is absolute"),
        ("data\\*.csv", "has a backslash"),
    ],
)
def test_a_pattern_that_cannot_be_used_is_refused(bench, valid, pattern, word):
    if pattern == "*":
        bench.path = bench.folder / ".study.yaml"
    line, key, message = bench.only(valid, with_pattern(pattern))
    assert (line, key) == (7, "datasets[0].ids_from") and word in message


def test_a_pattern_does_not_reach_out_through_a_link(bench, valid, tmp_path_factory):
    outside = tmp_path_factory.mktemp("elsewhere")
    (outside / "s.csv").write_text("a,b\n")
    (bench.folder / "shared").symlink_to(outside)
    assert "through a link" in bench.only(valid, with_pattern("shared/*.csv"))[2]


def test_a_pattern_leaves_hidden_files_and_folders_alone(bench, valid):
    (bench.folder / "data" / ".hidden-1.csv").write_text("a,b\n")
    (bench.folder / "data" / "folder-1.csv").mkdir()
    found = {dataset.id for dataset in bench.load(valid, with_pattern("data/*-1.csv")).datasets}
    assert found == {"batch-1", "fm-1"}


def test_a_file_whose_name_is_no_id_is_refused(bench, valid):
    (bench.folder / "data" / "odd\tname.csv").write_text("a,b\n")
    _, key, message = bench.only(valid, with_pattern("data/odd*.csv"))
    assert key == "datasets[0].ids_from" and "'data/odd\\tname.csv' gives an id that is not allowed" in message


def test_a_file_name_that_is_not_utf8_is_refused(bench, valid):
    try:
        (bench.folder / "data" / os.fsdecode(b"odd\xff.csv")).write_text("a,b\n")
    except OSError:
        pytest.skip("this file system takes UTF-8 names only")
    message = bench.only(valid, with_pattern("data/odd*.csv"))[2]
    assert "gives an id that is not allowed" in message and message.isprintable()
