"""Text as HTML."""

from __future__ import annotations

import pytest

from fitlib.report.prose import prose


@pytest.mark.parametrize(
    ("text", "html"),
    [
        ("c0 + c1 · x + c2 · x^2", "c0 + c1 · x + c2 · x<sup>2</sup>"),
        ("x^10", "x<sup>10</sup>"),
        ("max^2", "max^2"),
        ("leave_one_level_out decides", "leave_<wbr>one_<wbr>level_<wbr>out decides"),
        ("k_fold", "k_fold"),
        ("<b>&\"x'", "&lt;b&gt;&amp;&quot;x&#x27;"),
        ("<script_of_someone>", "&lt;script_<wbr>of_<wbr>someone&gt;"),
        (3, "3"),
    ],
)
def test_powers_are_raised_long_names_may_break_and_the_rest_is_text(text, html):
    assert prose(text) == html
