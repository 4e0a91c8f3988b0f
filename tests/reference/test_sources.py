"""Every case and data file is used, and its source and provenance stand in SOURCES.md word for word."""

import json
from pathlib import Path

import pytest

HERE = Path(__file__).parent
CASES = sorted(HERE.glob("cases/*.json"))


def _tests() -> str:
    return "\n".join(path.read_text(encoding="utf-8") for path in HERE.rglob("test_*.py"))


def test_the_number_of_cases_is_known():
    assert len(CASES) == 18


@pytest.mark.parametrize("path", CASES, ids=lambda path: path.stem)
def test_a_case_is_used_and_its_provenance_is_in_sources(path):
    case = json.loads(path.read_text(encoding="utf-8"))
    sources = (HERE / "SOURCES.md").read_text(encoding="utf-8")
    assert case["id"] == path.stem
    assert f'"{path.stem}"' in _tests()
    assert case["source"] in sources
    for item in case["provenance"]:
        assert f"{item['what']}: {item['how']}" in sources


@pytest.mark.parametrize("path", sorted(HERE.glob("data/*")), ids=lambda path: path.name)
def test_a_data_file_is_used_and_named_in_sources(path):
    assert f'"{path.name}"' in _tests()
    assert f"data/{path.name}" in (HERE / "SOURCES.md").read_text(encoding="utf-8")
