"""Figures inside the report: ids made unique, so that many drawings live in one file."""

from __future__ import annotations

import re

_TAG = re.compile(r'<[^<>]*(?:\bid="|href="#|url\(#|aria-labelledby=")[^<>]*>')  # only tags that name something
_ID = re.compile(r'\b(id="|href="#|url\(#)')
_LABELLED_BY = re.compile(r'(aria-labelledby=")([^"]*)"')
_SCRIPTABLE = re.compile(r"<\s*(?:script|foreignObject|iframe|style|a)\b|<[^<>]*\son[a-z]+\s*=", re.IGNORECASE)
_ELEMENT_HINT = re.compile(r"<\s*(?:script|foreignobject|iframe|style|a)\b")
_HANDLER_HINT = re.compile(r"\son[a-z]+\s*=")
_LINK_HINT = re.compile(r'(?:href|src)\s*=\s*"(?!#|data:image/png;)')
_LINK = re.compile(r'<[^<>]*\b(?:href|src)\s*=\s*"(?!#|data:image/png;)', re.IGNORECASE)


def inline_svg(text: str, prefix: str) -> str:
    """Return SVG text that can stand in the report.

    Parameters
    ----------
    text : str
        SVG text as the figures give it.
    prefix : str
        Put before every id; unique in the report.

    Returns
    -------
    str
        Text that the template may write as it is.

    Raises
    ------
    ValueError
        If the text holds a script, an event handler or a link, which no figure of this program has.
    """
    if _hint(text) and (_SCRIPTABLE.search(text) or _LINK.search(text)):
        raise ValueError(f"figure {prefix} holds a script, an event handler or a link")
    return _TAG.sub(lambda tag: _prefixed(tag[0], prefix), text).strip()


def _hint(text: str) -> bool:
    """Whether a closer look is needed: quick, and true for every text that is refused."""
    lowered = text.lower()
    return bool(_ELEMENT_HINT.search(lowered) or _HANDLER_HINT.search(lowered) or _LINK_HINT.search(lowered))


def _prefixed(tag: str, prefix: str) -> str:
    tag = _ID.sub(lambda found: f"{found[1]}{prefix}-", tag)
    return _LABELLED_BY.sub(
        lambda found: found[1] + " ".join(f"{prefix}-{name}" for name in found[2].split()) + '"', tag
    )
