"""The whole report."""

from __future__ import annotations

import copy
import html
import json
import os
import re
import subprocess
import sys
from html.parser import HTMLParser

import pytest

from fitlib.report import render_report

VOID = {"meta", "br", "hr", "img", "input", "link", "path", "use", "rect", "wbr"}


class Outline(HTMLParser):
    """Headings, tables, ids and the balance of elements of a page."""

    def __init__(self, page: str):
        super().__init__()
        self.headings, self.ids, self.targets, self.open, self.scopes, self.captions = [], [], [], [], [], 0
        self.tables, self.tags, self.faults = 0, set(), []
        self.feed(page)

    def handle_starttag(self, tag, attrs):
        found = dict(attrs)
        self.tags.add(tag)
        self.ids += [found["id"]] if "id" in found else []
        self.targets += [found["href"][1:]] if found.get("href", "").startswith("#") else []
        self.headings += [int(tag[1])] if re.fullmatch("h[1-6]", tag) else []
        self.tables += tag == "table"
        self.captions += tag == "caption"
        self.scopes += [found.get("scope")] if tag == "th" else []
        if tag not in VOID:
            self.open.append(tag)

    def handle_endtag(self, tag):
        if tag in VOID:
            return
        if not self.open or self.open.pop() != tag:
            self.faults.append(tag)


def words(page: str) -> str:
    """The text of a page, read as a browser does, without the drawings."""
    page = re.sub(r"<svg.*?</svg>|<style.*?</style>|<wbr>", "", page, flags=re.S)
    return " ".join(html.unescape(re.sub(r"<[^>]*>", " ", page)).split())


@pytest.fixture
def page(make_bundle, result, drawings):
    """A report of one dataset."""
    return render_report(make_bundle(result), {"LS-101": drawings}, "rev-0001", [])


def test_the_same_bundle_gives_the_same_bytes_and_is_not_changed(make_bundle, result, drawings):
    bundle = make_bundle(result)
    before = copy.deepcopy(bundle)
    first = render_report(bundle, {"LS-101": drawings}, "rev-0001", ["a"])
    assert render_report(copy.deepcopy(bundle), {"LS-101": dict(drawings)}, "rev-0001", ["a"]) == first
    assert bundle == before


def test_another_process_with_other_locale_and_zone_gives_the_same_bytes(make_bundle, result, drawings, tmp_path):
    arguments = [make_bundle(result), {"LS-101": drawings}, "rev-0001", ["a"]]
    (tmp_path / "arguments.json").write_text(json.dumps(arguments))
    code = (
        "import json, sys; from fitlib.report import render_report; "
        "sys.stdout.buffer.write(render_report(*json.load(open('arguments.json'))).encode())"
    )
    env = os.environ | {"TZ": "Asia/Tokyo", "LC_ALL": "de_DE.UTF-8", "PYTHONHASHSEED": "3"}
    done = subprocess.run([sys.executable, "-c", code], cwd=tmp_path, env=env, capture_output=True, check=True)
    assert done.stdout.decode() == render_report(*arguments)


@pytest.mark.parametrize("case", ["result", "without_choice", "empty", "hostile"])
def test_the_page_is_well_formed_and_accessible(case, request, make_bundle, drawings):
    result = request.getfixturevalue(case)
    page = render_report(make_bundle(result), {"LS-101": drawings}, "rev-0001", ["one change"])
    outline = Outline(page)
    assert page.startswith('<!DOCTYPE html>\n<html lang="en">')
    assert not outline.faults and not outline.open
    assert outline.headings[0] == 1 and outline.headings.count(1) == 1
    assert all(b - a <= 1 for a, b in zip(outline.headings, outline.headings[1:], strict=False))
    assert len(outline.ids) == len(set(outline.ids))
    assert set(outline.targets) <= set(outline.ids)
    assert outline.tables == outline.captions > 0
    assert set(outline.scopes) == {"col", "row"}
    assert "script" not in outline.tags


@pytest.mark.parametrize("case", ["result", "hostile"])
def test_nothing_is_fetched_from_outside(case, request, make_bundle, drawings):
    page = render_report(make_bundle(request.getfixturevalue(case)), {"LS-101": drawings}, "rev-0001", [])
    assert re.findall(r"https?://[^\"]*", page) == ["http://www.w3.org/2000/svg"] * 4  # a namespace, never fetched
    assert not re.search(r"<(link|script|img|iframe|object|embed)\b|@import|url\((?!#)", page)


def test_hostile_text_is_shown_as_text(make_bundle, hostile, hostile_text, drawings):
    failures = ({"dataset": hostile_text, "message": hostile_text},)
    bundle = make_bundle(hostile, failures=failures)
    bundle["study"].update(title=hostile_text, purpose=hostile_text)
    page = render_report(bundle, {"LS-101": drawings}, hostile_text, [hostile_text])
    assert "<script" not in page
    assert "&lt;script&gt;alert(1)&lt;/script&gt;" in page
    assert "{{7*7}}" in page
    assert not re.search(r"<[^>]*\sonload=", page)
    assert Outline(page).faults == []


def test_every_candidate_and_every_reason_is_in_the_report(make_bundle, result, drawings):
    failed = copy.deepcopy(result["candidates"][-1])
    failed.update(candidate="polynomial-15", status="not_fitted", parameters=16, message="more parameters than levels",
                  reason="not eligible: more parameters than levels", losses={}, terms=[], scaled=None,
                  lack_of_fit=None, serial=None, misfit=None, monotone=None, fitted_point_loss=None,
                  residual_standard_deviation=None, eligible=False)  # fmt: skip
    result["candidates"].append(failed)
    for number, row in enumerate(result["candidates"]):
        row["reason"] = f"reason number {number} of this test"
    text = words(render_report(make_bundle(result), {"LS-101": drawings}, "rev-0001", []))
    for number, row in enumerate(result["candidates"]):
        assert f"Reason number {number} of this test." in text
        assert row["candidate"] in text
    assert "More parameters than levels." in text  # the message of the fit, where the reason does not hold it


def test_the_first_page_puts_first_what_needs_a_person(page):
    text = words(page)
    heads = ["Needs attention", "Result for each dataset", "Other warnings", "What was asked", "Account of rows"]
    places = [text.index(head) for head in heads]
    assert places == sorted(places)


def test_what_was_asked_is_told_in_words(page):
    text = words(page)
    for wanted in ("one_standard_error: the simplest eligible candidate", "levels less parameters at least 3",
                   "strictly monotone", "expanded uncertainty 0.01 m, coverage factor 2", "folds 5, repeats 20",
                   "random seed 20260401"):  # fmt: skip
        assert wanted in text


def test_cautions_stand_on_the_first_page_and_with_the_function(page):
    text = words(page)
    front = text[: text.index("Dataset LS-101")]
    for wanted in ("fit-only uncertainty: not a complete measurement uncertainty", "accredited procedure",
                   "functional-safety assessment", "independent standard", "Local codes", "serial number",
                   "0 to 10 m", "2026-04-03", "23 °C"):  # fmt: skip
        assert wanted in front
    assert "Fit-only uncertainty: not a complete measurement uncertainty. Only for 0 to 10 m." in text


def test_warnings_of_all_datasets_are_on_the_first_page_each_once(make_bundle, result, drawings):
    other = copy.deepcopy(result) | {"dataset": "LS-102", "file_name": "LS-102"}
    other["warnings"] = ["second warning", result["warnings"][0]]
    page = render_report(make_bundle(result, other), {"LS-101": drawings}, "rev-0001", [])
    front = words(page).split("Dataset LS-101")[0]
    assert front.count(result["warnings"][0]) == 1
    assert "second warning ( LS-102 )" in front
    assert f"{result['warnings'][0]} ( LS-101 , LS-102 )" in front


def test_row_wise_folds_that_decide_head_the_report(make_bundle, result):
    result["settings"]["loss"] = "leave_one_out"
    text = words(render_report(make_bundle(result), {}, "rev-0001", []))
    assert text.index("Row-wise folds decide: scheme leave_one_out") < text.index("Results")


def test_row_wise_folds_for_comparison_are_a_remark(make_bundle, result):
    page = render_report(make_bundle(result), {}, "rev-0001", [])
    assert page.count('class="alarm"') == 1  # the caution
    remark = "leave_one_out leaves out single rows and is for comparison only, it does not decide"
    assert words(page).index(remark) > words(page).index("What was asked")
    result["schemes"] = [scheme for scheme in result["schemes"] if not scheme["row_wise"]]
    assert "single rows" not in words(render_report(make_bundle(result), {}, "rev-0001", []))


@pytest.mark.parametrize("verdict", ["adequate", "inadequate", "not_evaluated"])
def test_verdicts_are_told_by_sign_and_word(make_bundle, result, drawings, verdict):
    result["selection"]["verdict"] = verdict
    page = render_report(make_bundle(result), {"LS-101": drawings}, "rev-0001", [])
    sign = {"adequate": "✓ adequate", "inadequate": "✗ inadequate", "not_evaluated": "? not evaluated"}[verdict]
    assert page.count(f'<span class="mark {verdict}">{sign}</span>') == 2
    assert page.count("<h3>Function</h3>") == (verdict == "adequate")
    assert ("must not be used" in words(page)) == (verdict != "adequate")


def test_a_tie_is_marked_and_explained(make_bundle, result, drawings):
    result["selection"]["choice"] = "tie"
    text = words(render_report(make_bundle(result), {"LS-101": drawings}, "rev-0001", []))
    assert "The simplest of the tied candidates is issued, and marked." in text
    assert "1 tie" in text


def test_the_account_of_rows_is_checked(make_bundle, result, drawings):
    text = words(render_report(make_bundle(result), {"LS-101": drawings}, "rev-0001", []))
    assert "the account balances" in text
    result["account"][0]["used"] -= 1
    text = words(render_report(make_bundle(result), {"LS-101": drawings}, "rev-0001", []))
    assert "The account does not balance for data/spring.csv" in text


def test_datasets_that_failed_are_named_with_their_message(make_bundle, result, drawings):
    failures = ({"dataset": "LS-999", "message": "no candidate could be fitted"},)
    text = words(render_report(make_bundle(result, failures=failures), {"LS-101": drawings}, "rev-0001", []))
    assert "LS-999 no candidate could be fitted" in text
    assert "2 datasets: 1 adequate, 1 without a result." in text


def test_a_figure_that_is_missing_is_named_as_missing(make_bundle, result, drawings):
    del drawings["loss"]
    page = render_report(make_bundle(result), {"LS-101": drawings}, "rev-0001", [])
    assert page.count("This figure was not drawn.") == 1
    assert page.count("<svg") == 3


def test_changes_are_listed_when_there_are_any(make_bundle, result, drawings, page):
    assert "What changed since the last revision" not in page
    changed = render_report(make_bundle(result), {"LS-101": drawings}, "rev-0002", ["2 series added."])
    assert "2 series added." in words(changed)


def test_a_bundle_without_results_is_a_report_too(make_bundle):
    page = render_report(make_bundle(), {}, "rev-0001", [])
    assert "0 datasets: none." in words(page)
    assert not Outline(page).faults


def test_hundreds_of_datasets_are_one_file(make_bundle, result, drawings):
    results = [result | {"dataset": f"LS-{number}", "file_name": f"LS-{number}"} for number in range(300)]
    figures = {one["file_name"]: drawings for one in results}
    outline = Outline(render_report(make_bundle(*results), figures, "rev-0001", []))
    assert len(outline.ids) == len(set(outline.ids))
    assert outline.headings.count(2) >= 300
