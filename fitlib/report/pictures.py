"""Figures inside the report: ids made unique, so that many drawings live in one file."""

from __future__ import annotations

import re

from markupsafe import Markup

_TAG = re.compile(r"<[^<>]*>")
_ID = re.compile(r'\b(id="|href="#|url\(#)')
_LABELLED_BY = re.compile(r'(aria-labelledby=")([^"]*)"')
_UNWANTED = re.compile(r"<\s*(?:script|foreignObject|iframe|style)\b|<[^<>]*\s(?:on[a-z]+\s*=|href\s*=\s*\"(?!#|data:image/png))", re.I)


def inline_svg(text: str, prefix: str) -> Markup:
    """Return SVG text that can stand in the report.

    Parameters
    ----------
    text : str
        SVG text as the figures give it.
    prefix : str
        Put before every id; unique in the report.

    Returns
    -------
    Markup
        Marked as safe for the template.

    Raises
    ------
    ValueError
        If the text holds a script, an event handler or a link, which no figure of this program has.
    """
    if _UNWANTED.search(text):
        raise ValueError(f"figure {prefix} holds a script, an event handler or a link")
    text = _TAG.sub(lambda tag: _prefixed(tag[0], prefix), text)
    return Markup(text.strip())


def _prefixed(tag: str, prefix: str) -> str:
    tag = _ID.sub(lambda found: found[1] + f"{prefix}-", tag)
    return _LABELLED_BY.sub(
        lambda found: found[1] + " ".join(f"{prefix}-{name}" for name in found[2].split()) + '"', tag
    )
