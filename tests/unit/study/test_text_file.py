"""The study file itself: there, small enough, UTF-8."""

from __future__ import annotations

import os

import pytest

from fitlib.errors import InputError
from fitlib.study import load_study


def refused(path) -> str:
    with pytest.raises(InputError) as caught:
        load_study(path)
    (problem,) = caught.value.problems
    assert problem.file == str(path)
    return problem.message


def test_a_study_that_is_not_there_is_told_plainly(tmp_path):
    assert refused(tmp_path / "none.yaml") == "there is no such file"
    assert refused(tmp_path / "no" / "folder.yaml") == "there is no such file"


def test_a_folder_is_not_a_study(tmp_path):
    assert refused(tmp_path) == "this is a folder; name the study file in it"


def test_a_pipe_is_not_read(tmp_path):
    os.mkfifo(tmp_path / "pipe.yaml")
    assert refused(tmp_path / "pipe.yaml") == "this is not an ordinary file"


def test_a_path_that_cannot_be_one_is_told_plainly(tmp_path):
    assert "cannot be read" in refused(str(tmp_path / ("x" * 300)))


def test_the_path_is_shown_as_it_was_given(bench, monkeypatch):
    bench.load()
    monkeypatch.chdir(bench.folder)
    assert load_study("study.yaml").path == "study.yaml"
    assert load_study("./study.yaml").datasets[0].files == ("data/fm-1.csv",)


def test_more_than_a_megabyte_is_refused_and_just_less_is_read(bench, valid):
    filler = "# " + "x" * 97 + "\n"
    room = (1_000_000 - len(valid)) // len(filler)
    assert bench.load(valid + filler * room).name == "flow-meters"
    assert "larger than 1 MB" in bench.only(valid + filler * (room + 1))[2]


def test_a_byte_order_mark_is_tolerated_and_kept_in_the_text(bench, valid):
    study = bench.load(b"\xef\xbb\xbf" + valid.encode())
    assert study.name == "flow-meters" and study.text.startswith(b"\xef\xbb\xbf")


@pytest.mark.parametrize("data", [b"format: 1\ntitle: \xb0C\n", b"format: 1\n\xff\xfe"])
def test_bytes_that_are_not_utf8_are_told_with_their_line(bench, data):
    line, _, message = bench.only(data)
    assert line == 2 and "is not UTF-8 text; save the file as UTF-8" in message


def test_utf16_is_told_plainly(bench, valid):
    assert "save the file as UTF-8" in bench.only(valid.encode("utf-16"))[2]


@pytest.mark.parametrize("char", ["\x00", "\x1b", "\x7f", "\ufffe"])
def test_a_control_character_is_told_with_its_line(bench, valid, char):
    line, _, message = bench.only(valid.replace("Turbine", f"Tur{char}bine"))
    assert line == 3 and message == f"the control character U+{ord(char):04X} is not allowed; remove it"


@pytest.mark.parametrize("text", ["", "# only a comment\n", "---\n", "null\n", "- a\n- b\n", "format 1\n", "3\n"])
def test_what_is_no_group_of_keys_is_no_study(bench, text):
    assert "a study is a group of keys, beginning with format: 1" in bench.only(text)[2]


def test_a_syntax_error_is_reported_alone_with_its_place(bench, valid):
    (problem,) = bench.problems(valid, ("title: Turbine flow meters", "titel: [a"))
    assert problem.line == 4 and problem.column is not None and problem.message.startswith("YAML syntax: ")
