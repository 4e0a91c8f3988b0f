"""Cells: no formula, no control character, nothing lost."""

import csv
import io

import numpy as np
import pytest

from fitlib.collect.cells import Column, Table, cell, safe_text


@pytest.mark.parametrize("text", ["=1+1", "+1", "-1", "@SUM(A1)", "\t=1", "\r=1", "'=1", "''-1", "\uff1d1"])
def test_what_a_spreadsheet_takes_for_a_formula_is_guarded(text):
    # Common practice, no source: spreadsheets evaluate cells that start with these characters.
    assert safe_text(text).startswith("'")
    assert safe_text(text) != text


@pytest.mark.parametrize("text", ["", "plain", "'quoted'", "a=b", "5", "1-2", "Füllstand", "a;rm -rf b", "<b>"])
def test_other_text_stays_as_it_is(text):
    assert safe_text(text) == text


def test_guarding_never_makes_two_texts_one():
    texts = ["=1", "'=1", "''=1", "-", "'-", "x", "'x"]
    assert len({safe_text(text) for text in texts}) == len(texts)


@pytest.mark.parametrize("char", ["\x00", "\x1b", "\n", "\r", "\x7f", "\x85", "\u2028", "\u202e", "\ufeff", "\ud800"])
def test_a_character_that_acts_is_written_out(char):
    assert safe_text(f"a{char}b") == f"a\\u{ord(char):04x}b"
    safe_text(f"a{char}b").encode("utf-8")


@pytest.mark.parametrize("text", ["a,b", 'say "so"', "x\ny", "; | \t"])
def test_a_cell_comes_back_through_a_reader(text):
    table = Table("t.csv", (Column("a", "text", "", "A."), Column("b", "text", "", "B.")), [{"a": text, "b": "end"}])
    rows = list(csv.reader(io.StringIO(table.text(), newline=""), strict=True))
    assert rows[1] == [safe_text(text), "end"]


def test_lines_end_with_one_newline_only():
    table = Table("t.csv", (Column("a", "text", "", "A."),), [{"a": "x"}, {"a": "y"}])
    assert table.text() == "a\nx\ny\n"


@pytest.mark.parametrize(
    "value, kind, text",
    [
        (1, "number", "1.0"),
        (1e22, "number", "1e+22"),
        (-0.1, "number", "-0.1"),
        (np.float64(0.1), "number", "0.1"),
        (3, "whole_number", "3"),
        (3.0, "whole_number", "3"),
        (True, "boolean", "true"),
        (None, "boolean", ""),
        (None, "text", ""),
    ],
)
def test_values_are_written_as_their_column_says(value, kind, text):
    assert cell(value, kind) == text


@pytest.mark.parametrize(
    "value, kind", [(1.5, "whole_number"), (True, "number"), (1, "boolean"), (1, "text"), (float("nan"), "number")]
)
def test_a_value_that_does_not_suit_its_column_is_refused(value, kind):
    with pytest.raises((TypeError, ValueError)):
        cell(value, kind)
