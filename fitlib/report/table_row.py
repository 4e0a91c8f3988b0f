"""One table row as HTML; written in Python, as a large report has some hundred thousand cells."""

from __future__ import annotations

from html import escape

from fitlib.report.prose import prose


def small_html(text: str | None) -> str:
    """HTML of the small print below an entry; parts between semicolons stay together where lines break.

    Parameters
    ----------
    text : str or None

    Returns
    -------
    str
    """
    if not text:
        return ""
    parts = [f"<span>{prose(part)}" for part in text.split("; ")]
    return f"<small>{';</span> '.join(parts)}</span></small>"


def row_html(columns, cells) -> str:
    """HTML of one row; its first cell is the head of the row.

    Parameters
    ----------
    columns : sequence of Head
    cells : sequence of Cell

    Returns
    -------
    str
        Escaped throughout.
    """
    parts = ["<tr>"]
    for number, (head, cell) in enumerate(zip(columns, cells, strict=True)):
        kind = f' class="{escape(head.kind)}"' if head.kind else ""
        name, scope = ("td", "") if number else ("th", ' scope="row"')
        parts.append(f"<{name}{scope}{kind}>{_cell_html(cell)}</{name}>")
    parts.append("</tr>")
    return "".join(parts)


def _cell_html(cell) -> str:
    text = prose(cell.text)
    if cell.target:
        text = f'<a href="#{escape(cell.target)}">{text}</a>'
    elif cell.kind:
        text = f'<span class="mark {escape(cell.kind)}">{text}</span>'
    return text + small_html(cell.small) if cell.small else text
