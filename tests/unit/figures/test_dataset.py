"""All four figures of a dataset: complete, well formed, and the same bytes every time."""

from __future__ import annotations

import copy
import hashlib
import json
import os
import re
import subprocess
import sys
from xml.etree import ElementTree

import matplotlib
import pytest

from fitlib.figures import draw_dataset

NAMES = {"data", "loss", "residuals", "level_loss"}


def texts(svg: str) -> list[str]:
    """All lines of text drawn in a figure (not its title and description)."""
    return [element.text or "" for element in ElementTree.fromstring(svg).iter("{http://www.w3.org/2000/svg}text")]


def test_there_are_four_figures_and_each_is_well_formed(result):
    figures = draw_dataset(result)
    assert set(figures) == NAMES
    for svg in figures.values():
        assert ElementTree.fromstring(svg).tag == "{http://www.w3.org/2000/svg}svg"


def test_drawing_changes_nothing_in_the_result(result):
    before = copy.deepcopy(result)
    draw_dataset(result)
    assert result == before


def test_settings_of_the_caller_have_no_influence_and_are_left_alone(result):
    plain = draw_dataset(result)
    with matplotlib.rc_context():
        matplotlib.rcParams.update({"font.size": 20, "axes.grid": False, "svg.fonttype": "path", "text.usetex": True})
        assert draw_dataset(result) == plain
        assert matplotlib.rcParams["font.size"] == 20


def test_another_process_with_other_locale_zone_hash_seed_and_matplotlibrc_gives_the_same_bytes(result, tmp_path):
    (tmp_path / "matplotlibrc").write_text("lines.linewidth: 9\nsavefig.facecolor: red\nsvg.hashsalt: other\n")
    (tmp_path / "result.json").write_text(json.dumps(result))
    code = (
        "import json, hashlib, matplotlib; from fitlib.figures import draw_dataset; "
        "assert matplotlib.rcParams['lines.linewidth'] == 9; "
        "figures = draw_dataset(json.load(open('result.json'))); "
        "print(hashlib.sha256(''.join(figures[name] for name in sorted(figures)).encode()).hexdigest())"
    )
    env = os.environ | {"MATPLOTLIBRC": str(tmp_path), "TZ": "Asia/Tokyo", "LC_ALL": "tr_TR.UTF-8",
                        "PYTHONHASHSEED": "17", "SOURCE_DATE_EPOCH": "1"}  # fmt: skip
    done = subprocess.run(
        [sys.executable, "-c", code], cwd=tmp_path, env=env, capture_output=True, text=True, check=True
    )
    figures = draw_dataset(result)
    here = hashlib.sha256("".join(figures[name] for name in sorted(figures)).encode()).hexdigest()
    assert done.stdout.split()[-1] == here


@pytest.mark.parametrize("case", ["result", "without_choice", "empty", "hostile"])
def test_no_figure_holds_a_link_a_script_a_style_rule_or_a_foreign_name(case, request):
    for svg in draw_dataset(request.getfixturevalue(case)).values():
        without_namespaces = re.sub(r' xmlns(:xlink)?="[^"]*"', "", svg)
        assert "http" not in without_namespaces
        tags = {element.tag.split("}")[-1] for element in ElementTree.fromstring(svg).iter()}
        assert not tags & {"script", "style", "a", "metadata", "foreignObject"}
        assert "matplotlib" not in svg.lower()


@pytest.mark.parametrize("case", ["result", "without_choice", "empty", "hostile"])
def test_every_id_is_unique_and_every_reference_has_its_target(case, request):
    together = "".join(draw_dataset(request.getfixturevalue(case)).values())
    ids = re.findall(r'\bid="([^"]*)"', together)
    assert len(ids) == len(set(ids))
    references = re.findall(r'href="#([^"]*)"|url\(#([^)]*)\)', together)
    assert {a or b for a, b in references} <= set(ids)


def test_hostile_text_is_drawn_as_text(hostile):
    figures = draw_dataset(hostile)
    for svg in figures.values():
        assert "<script" not in svg
        assert any("<script>alert(1)</script> $x^2$" in text for text in texts(svg))  # read back from the XML
    joined = " ".join(texts(figures["data"]))
    assert "($m/s$<b>)" in joined
    assert "\x00" not in joined


def test_figures_describe_themselves_in_words(result):
    for svg in draw_dataset(result).values():
        root = ElementTree.fromstring(svg)
        names = root.get("aria-labelledby").split()
        described = {child.get("id"): child.text for child in root if child.get("id")}
        assert root.get("role") == "img"
        assert all(described[name] for name in names)


@pytest.mark.parametrize(
    ("verdict", "mark"), [("adequate", None), ("inadequate", "inadequate"), ("not_evaluated", "not evaluated")]
)
def test_every_figure_says_when_the_function_must_not_be_used(result, verdict, mark):
    result["selection"]["verdict"] = verdict
    for svg in draw_dataset(result).values():
        titles = [line for line in texts(svg) if line.startswith("LS-101: ")]
        assert len(titles) == 1
        assert titles[0].endswith(f" – verdict {mark}") if mark else "verdict" not in "".join(texts(svg))


@pytest.mark.parametrize("factor", [1e150, 1e-150, 1e7, 1e-9])
def test_huge_and_tiny_quantities_are_drawn_as_ordinary_ones_are(result, factor):
    plain = draw_dataset(result)["residuals"]
    scaled = copy.deepcopy(result)
    for key in ("response", "fitted", "residual"):
        column = scaled["observations"][key]
        scaled["observations"][key] = [None if value is None else value * factor for value in column]
    curves = scaled["curves"]
    for name, values in curves["candidates"].items():
        curves["candidates"][name] = [value * factor for value in values]
    for band in (curves["confidence_band"], curves["prediction_interval"]):
        for edge in ("lower", "upper"):
            band[edge] = [value * factor for value in band[edge]]
    for row in scaled["candidates"]:
        row["residual_standard_deviation"] *= factor
    drawn = draw_dataset(scaled)
    assert set(drawn) == NAMES
    assert drawn["residuals"].count("<use") == plain.count("<use")


def test_two_thousand_observations_give_files_of_moderate_size(make_result):
    figures = draw_dataset(make_result(levels=20, series=100, top=3))
    assert "data:image/png;base64," in figures["data"]
    assert max(len(svg) for svg in figures.values()) < 400_000


@pytest.mark.parametrize("missing", ["levels", "schemes", "verification", "design", "candidates"])
def test_parts_that_are_absent_leave_all_figures_standing(result, missing):
    result[missing] = {} if missing == "design" else []
    assert set(draw_dataset(result)) == NAMES


def test_one_series_without_names_and_one_candidate(make_result):
    result = make_result(series=1, top=1)
    result["observations"]["series"] = [""] * len(result["observations"]["series"])
    result["observations"]["direction"] = [""] * len(result["observations"]["series"])
    words = texts(draw_dataset(result)["data"])
    assert "observations, n = 10" in words
    assert not any("open" in word or "filled" in word for word in words)
