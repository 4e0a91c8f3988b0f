"""The whole report from a bundle of results."""

from __future__ import annotations

from pathlib import Path

from jinja2 import Environment, FileSystemLoader, StrictUndefined

from fitlib.report.dataset import dataset_part
from fitlib.report.front import front_part
from fitlib.report.prose import prose
from fitlib.report.table_row import row_html, small_html

_TEMPLATES = Path(__file__).parent / "templates"


def render_report(bundle: dict, figures: dict[str, dict[str, str]], revision: str, changes: list[str]) -> str:
    """Write the report of a study.

    Parameters
    ----------
    bundle : dict
        ``study`` (the resolved study), ``results`` (sorted by dataset) and ``failures``.
    figures : dict of str to dict of str to str
        SVG text by the dataset's file name and the figure's name; a figure that is missing is named as missing.
    revision : str
        Name of the revision, for example ``rev-0002``.
    changes : list of str
        What changed since the last revision, one sentence each.

    Returns
    -------
    str
        One HTML page that needs no network, no script and no other file. The same arguments give the same bytes.

    Raises
    ------
    ValueError
        If a figure holds a script, an event handler or a link.
    """
    environment = Environment(
        loader=FileSystemLoader(_TEMPLATES),
        autoescape=True,
        undefined=StrictUndefined,
        trim_blocks=True,
        lstrip_blocks=True,
        keep_trailing_newline=True,
    )
    environment.filters["prose"] = prose
    environment.globals |= {"row_html": row_html, "small_html": small_html}
    parts = [
        dataset_part(result, figures.get(result["file_name"]) or {}, number)
        for number, result in enumerate(bundle["results"], start=1)
    ]
    page = environment.get_template("report.html.j2")
    return page.render(front=front_part(bundle, revision, changes), datasets=parts, many=len(parts) > 20)
