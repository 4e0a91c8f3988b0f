"""Drawings inside the report."""

from __future__ import annotations

import pytest

from fitlib.figures import draw_dataset
from fitlib.report.pictures import inline_svg


def test_ids_and_all_references_get_the_prefix():
    text = '<svg aria-labelledby="a-t a-d"><g id="a-1" clip-path="url(#a-2)"/><use xlink:href="#a-1"/></svg>'
    expected = (
        '<svg aria-labelledby="X-a-t X-a-d"><g id="X-a-1" clip-path="url(#X-a-2)"/><use xlink:href="#X-a-1"/></svg>'
    )
    assert inline_svg(text, "d7") == expected.replace("X-", "d7-")


def test_text_that_looks_like_an_id_is_left_alone():
    text = '<svg><text>id="x" url(#y) href="#z"</text></svg>'
    assert inline_svg(text, "d7") == text


@pytest.mark.parametrize(
    "inside",
    ["<script>1</script>", "<g onload='x'/>", "<ScRiPt/>", '<a href="#x"/>', '<image href="http://x.example/a.png"/>',
     "<foreignObject/>", '<image xlink:href="data:text/html,x"/>', "<style>*{}</style>"],
)  # fmt: skip
def test_anything_that_could_run_or_fetch_is_refused(inside):
    with pytest.raises(ValueError, match="figure d1 holds a script, an event handler or a link"):
        inline_svg(f"<svg>{inside}</svg>", "d1")


def test_real_figures_with_hostile_text_are_accepted(hostile):
    for svg in draw_dataset(hostile).values():
        assert inline_svg(svg, "d1").startswith("<svg")
