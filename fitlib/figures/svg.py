"""A finished figure as SVG text: the same bytes each time, described in words, free of links and of foreign names."""

from __future__ import annotations

import io
import re
from xml.etree import ElementTree

from matplotlib.figure import Figure

from fitlib.figures.words import clean

_SVG, _XLINK = "http://www.w3.org/2000/svg", "http://www.w3.org/1999/xlink"
_HREF = f"{{{_XLINK}}}href"
_URL = re.compile(r"url\(#([^)]+)\)")
_LONG_NUMBER = re.compile(r"-?\d+\.\d{3,}")
_NO_METADATA = {"Date": None, "Creator": None, "Format": None, "Type": None}


def to_svg(figure: Figure, name: str, title: str, description: str) -> str:
    """Write a figure as SVG.

    Parameters
    ----------
    figure : Figure
        The arranged figure.
    name : str
        Start of every id in the text.
    title, description : str
        What the figure is and shows, for readers who cannot see it.

    Returns
    -------
    str
        SVG text without XML declaration, document type or metadata, ending in one newline.
    """
    raw = io.BytesIO()
    figure.savefig(raw, format="svg", dpi=200, metadata=_NO_METADATA)
    root = ElementTree.fromstring(raw.getvalue())
    _drop_metadata(root)
    _share_styles(root)
    _share_font(root)
    _name_ids(root, name)
    _shorten_numbers(root)
    _describe(root, name, title, description)
    return _serialise(root)


def _drop_metadata(root: ElementTree.Element) -> None:
    """Without metadata, and with the one style rule as attributes, so that it cannot reach into a page."""
    for parent in root.iter():
        for child in list(parent):
            if child.tag.endswith(("}metadata", "}style")):
                parent.remove(child)
    root.attrib.pop("version", None)
    root.attrib |= {"stroke-linejoin": "round", "stroke-linecap": "butt"}


def _share_styles(root: ElementTree.Element) -> None:
    """Points of one kind carry the same style each: move it to their group."""
    for group in root.iter(f"{{{_SVG}}}g"):
        uses = [child for child in group if child.tag == f"{{{_SVG}}}use"]
        styles = {use.get("style") for use in uses}
        if len(uses) > 1 and len(styles) == 1 and "style" not in group.attrib:
            group.set("style", styles.pop() or "")
            for use in uses:
                use.attrib.pop("style", None)


def _share_font(root: ElementTree.Element) -> None:
    """Name the font once."""
    font = "font-family: 'DejaVu Sans', sans-serif"
    for text in root.iter(f"{{{_SVG}}}text"):
        parts = [part for part in text.get("style", "").split("; ") if part != font]
        text.set("style", "; ".join(parts))
    root.set("font-family", "'DejaVu Sans', Verdana, Arial, sans-serif")


def _references(element: ElementTree.Element) -> list[str]:
    found = [match for value in element.attrib.values() for match in _URL.findall(value)]
    href = element.get(_HREF, "")
    return found + ([href[1:]] if href.startswith("#") else [])


def _name_ids(root: ElementTree.Element, name: str) -> None:
    """Keep only ids that something refers to, numbered behind the figure's name."""
    used = {reference for element in root.iter() for reference in _references(element)}
    names: dict[str, str] = {}
    for element in root.iter():
        own = element.attrib.pop("id", None)
        if own in used:
            element.set("id", names.setdefault(own, f"{name}-{len(names) + 1}"))
    for element in root.iter():
        for key, value in element.attrib.items():
            if key == _HREF and value.startswith("#"):
                element.set(key, f"#{names[value[1:]]}")
            elif "url(#" in value:
                element.set(key, _URL.sub(lambda match: f"url(#{names[match[1]]})", value))


def _shorten_numbers(root: ElementTree.Element) -> None:
    """Hundredths of a point are enough on paper."""
    for element in root.iter():
        for key, value in element.attrib.items():
            if "." in value and key not in ("id", _HREF):
                element.set(key, _LONG_NUMBER.sub(lambda match: f"{float(match[0]):.2f}", value))
            if key == "d":
                element.set(key, " ".join(element.get(key).split()))


def _describe(root: ElementTree.Element, name: str, title: str, description: str) -> None:
    root.set("role", "img")
    root.set("aria-labelledby", f"{name}-title {name}-description")
    for number, (tag, text) in enumerate((("title", title), ("desc", description))):
        ident = f"{name}-{'title' if tag == 'title' else 'description'}"
        element = ElementTree.Element(f"{{{_SVG}}}{tag}", {"id": ident})
        element.text = clean(text, 2000)
        root.insert(number, element)


def _serialise(root: ElementTree.Element) -> str:
    """Text with plain names for the two namespaces, without touching the process-wide table of prefixes."""
    for element in root.iter():
        element.tag = element.tag.removeprefix(f"{{{_SVG}}}")
        if _HREF in element.attrib:
            element.attrib["xlink:href"] = element.attrib.pop(_HREF)
        element.tail = "\n"
        if element.text is not None and not element.text.strip():
            element.text = None
    root.attrib = {"xmlns": _SVG, "xmlns:xlink": _XLINK, **root.attrib}
    return ElementTree.tostring(root, encoding="unicode").strip() + "\n"
