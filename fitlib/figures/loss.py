"""Figure `loss`: held-out loss of every scheme and the fitted-point error against the number of parameters."""

from __future__ import annotations

import numpy as np
from matplotlib.axes import Axes
from matplotlib.lines import Line2D

from fitlib.figures import style
from fitlib.figures.scales import DecadeScale, decade_scale, set_decades
from fitlib.figures.sheet import Sheet, empty_panel
from fitlib.figures.svg import to_svg
from fitlib.figures.view import View, as_array
from fitlib.figures.words import axis_label, clean, listed

_REACH = 30.0
FITTED_POINTS = "fitted points (not held out)"
#: How the rules that compare held-out losses choose, so that the ring can be understood without the report.
RULE_NOTES = {
    "smallest_loss": "Rule: the eligible candidate with the smallest deciding loss.",
    "one_standard_error": "Rule: the eligible candidate with the fewest parameters whose deciding loss is not above "
    "the threshold, which is the smallest loss plus its standard error.",
    "supported_gain": "Rule: the eligible candidate with the fewest parameters over which no gain of one with more is "
    "supported. A gain is supported when the deciding loss is lower, paired by level and with end levels half, and an "
    "F test on level means agrees; there is no threshold to draw.",
}


def draw_loss(view: View) -> str:
    """Draw the losses of all candidates.

    Parameters
    ----------
    view : View
        The result of one dataset.

    Returns
    -------
    str
        SVG text.
    """
    sheet = Sheet([[3.3, 1]])
    panel = sheet.panels[0]
    rows = list(view.candidates.values())
    if rows:
        _draw(sheet, panel, view, rows)
    else:
        empty_panel(panel, "There are no candidates.")
    sheet.note(view.counts() + ".")
    figure = sheet.arrange(view.title("loss against number of parameters"))
    return to_svg(figure, "loss", f"Loss against number of parameters of {view.name}", _words(view))


def scheme_losses(view: View, scheme: str, rows: list[dict], key: str = "loss") -> np.ndarray:
    """Losses (or another entry) of one scheme for these candidates, shape (n_rows,)."""
    return as_array([((row.get("losses") or {}).get(scheme) or {}).get(key) for row in rows])


def _draw(sheet: Sheet, panel: Axes, view: View, rows: list[dict]) -> None:
    curves = _curves(view, rows)
    threshold = as_array([view.selection.get("threshold")])
    shown = np.concatenate([view.shown_loss(losses) for _, losses, _ in curves] + [view.shown_loss(threshold)])
    cap = _cap(view, rows, curves)
    scale = decade_scale(shown[~(shown > cap)])
    _set_axes(panel, view, rows, scale)
    for name, losses, line in reversed(curves):
        deciding = view.deciding is not None and name == view.deciding["scheme"]
        _draw_scheme(panel, view, rows, scale, losses, line, deciding, hollow=name != FITTED_POINTS)
    if view.deciding is not None:
        _draw_errors(panel, view, rows, scale)
    _legend(sheet, view, rows, curves)
    _draw_threshold(sheet, panel, view, scale, threshold)
    _mark_chosen(sheet, panel, view, rows, scale)
    _notes(sheet, view, rows, curves)
    _note_above(sheet, view, rows, curves, cap)


def _cap(view: View, rows: list[dict], curves: list[tuple[str, np.ndarray, style.Line]]) -> float:
    """Where the panel ends: wild losses must not hide how the deciding loss falls and turns up.

    Shown are all deciding losses from the smallest on to more parameters, and whatever is within `_REACH` of it.
    """
    if not curves:
        return np.inf
    losses = view.shown_loss(curves[0][1])
    if not np.nanmin(losses) > 0:
        return np.inf
    smallest = int(np.nanargmin(losses))
    parameters = np.array([row["parameters"] for row in rows])
    beyond = losses[(parameters >= parameters[smallest]) & np.isfinite(losses)]
    reach = _REACH**2 if view.weighted else _REACH
    return float(max(min(beyond.max(), reach**2 * losses[smallest]), reach * losses[smallest]))


def _note_above(
    sheet: Sheet, view: View, rows: list[dict], curves: list[tuple[str, np.ndarray, style.Line]], cap: float
) -> None:
    """Name every candidate with a loss above the panel."""
    above: dict[str, list[str]] = {}
    for name, losses, _ in curves:
        for row, loss in zip(rows, view.shown_loss(losses), strict=True):
            if loss > cap:
                above.setdefault(row["candidate"], []).append(name)
    words = [
        f"{clean(candidate, 40)} ({'all' if len(names) == len(curves) else listed(names)})"
        for candidate, names in above.items()
    ]
    if words:
        sheet.note(f"Losses above the panel: {'; '.join(words[:8])}{' and others' if len(words) > 8 else ''}.")


def _curves(view: View, rows: list[dict]) -> list[tuple[str, np.ndarray, style.Line]]:
    """Name, losses and line of every scheme with a loss (the deciding one first), then the fitted points."""
    schemes = sorted(view.schemes, key=lambda scheme: scheme is not view.deciding)
    found, others = [], 0
    for scheme in schemes:
        losses = scheme_losses(view, scheme["scheme"], rows)
        if not np.isfinite(losses).any():
            continue
        if scheme is view.deciding:
            line = style.DECIDING_LINE
        else:
            line = style.SCHEME_LINES[others % len(style.SCHEME_LINES)]
            others += 1
        found.append((scheme["scheme"], losses, line))
    fitted = as_array([row.get("fitted_point_loss") for row in rows])
    return found + ([(FITTED_POINTS, fitted, style.FITTED_POINT_LINE)] if np.isfinite(fitted).any() else [])


def _groups(rows: list[dict]) -> list:
    return list(dict.fromkeys(row.get("group", 0) for row in rows))


def _positions(rows: list[dict]) -> np.ndarray:
    """Numbers of parameters; entries of the families beside each other where there are several."""
    groups = _groups(rows)
    shift = 0.16 / max(1, len(groups) - 1)
    return np.array([row["parameters"] + shift * groups.index(row.get("group", 0)) for row in rows], dtype=float)


def _set_axes(panel: Axes, view: View, rows: list[dict], scale: DecadeScale) -> None:
    x = _positions(rows)
    numbers = sorted({int(row["parameters"]) for row in rows})
    stride = -(-len(numbers) // 16)
    panel.set_xlim(x.min() - 0.5, x.max() + 0.6)
    panel.set_xticks(numbers[::stride], labels=[str(number) for number in numbers[::stride]])
    panel.set_xlabel("number of parameters")
    unit = view.fitted["unit"]
    what = axis_label("loss, weighted", unit, exponent=2) if view.weighted else axis_label("root of loss", unit)
    set_decades(panel.yaxis, scale, what)


def _draw_scheme(
    panel: Axes, view: View, rows: list[dict], scale: DecadeScale, losses: np.ndarray, line: style.Line,
    deciding: bool, hollow: bool,
) -> None:  # fmt: skip
    """One scheme: a line for each entry of the families, ineligible candidates as hollow points."""
    x, y = _positions(rows), scale(view.shown_loss(losses))
    for number, group in enumerate(_groups(rows)):
        members = np.array([row.get("group", 0) == group for row in rows])
        order = 3 if deciding else 2.4
        at_x, at_y = x[members], y[members]
        panel.plot(at_x, at_y, color=line.colour, linestyle=line.dash, linewidth=line.width, zorder=order)
        for at, level, row in zip(at_x, at_y, np.array(rows, dtype=object)[members], strict=True):
            if np.isfinite(level):
                face = style.PAPER if hollow and not row.get("eligible") else line.colour
                marker = style.GROUP_MARKERS[number % len(style.GROUP_MARKERS)] if hollow else "."
                panel.plot(
                    [at], [level], marker=marker, markersize=5.6 if deciding else 4, linestyle="none",
                    markerfacecolor=face, markeredgecolor=line.colour, markeredgewidth=1.1, zorder=order + 0.2,
                )  # fmt: skip


def _draw_errors(panel: Axes, view: View, rows: list[dict], scale: DecadeScale) -> None:
    """Bars of one standard error of the deciding loss; a bar that reaches zero runs to the foot of the panel."""
    name = view.deciding["scheme"]
    losses, errors = scheme_losses(view, name, rows), scheme_losses(view, name, rows, "standard_error")
    low, high = scale(view.shown_loss(losses - errors)), scale(view.shown_loss(losses + errors))
    for x, bottom, top in zip(_positions(rows), low, high, strict=True):
        if np.isfinite(bottom) and np.isfinite(top):
            panel.plot([x, x], [bottom, top], color=style.DECIDING_LINE.colour, linewidth=1.0, marker="_",
                       markersize=5, zorder=2.9)  # fmt: skip


def _draw_threshold(sheet: Sheet, panel: Axes, view: View, scale: DecadeScale, threshold: np.ndarray) -> None:
    if not np.isfinite(threshold[0]):
        return
    line = style.Line(style.INK, (0, (8, 2, 1.5, 2)), 1.0)
    level = float(scale(view.shown_loss(threshold))[0])
    panel.axhline(level, color=line.colour, linestyle=line.dash, linewidth=line.width, zorder=2.2)
    sheet.line_entry("one-standard-error threshold", line)


def _mark_chosen(sheet: Sheet, panel: Axes, view: View, rows: list[dict], scale: DecadeScale) -> None:
    """Ring the chosen candidate; the legend names it."""
    scheme = view.deciding or view.shown_scheme
    place = [number for number, row in enumerate(rows) if row["candidate"] == view.chosen]
    if not place:
        sheet.note("No candidate was chosen.")
        return
    losses = scheme_losses(view, scheme["scheme"], rows) if scheme else np.full(len(rows), np.nan)
    if not np.isfinite(losses[place[0]]):
        losses = as_array([row.get("fitted_point_loss") for row in rows])
    x, y = _positions(rows)[place[0]], scale(view.shown_loss(losses))[place[0]]
    look = {"marker": "o", "markersize": 13, "markerfacecolor": "none", "markeredgecolor": style.INK,
            "markeredgewidth": 1.3, "linestyle": "none"}  # fmt: skip
    if np.isfinite(y):
        panel.plot([x], [y], zorder=4, **look)
    sheet.entry(Line2D([], [], **{**look, "markersize": 8}), f"chosen: {view.chosen_words}")


def _legend(sheet: Sheet, view: View, rows: list[dict], curves: list[tuple[str, np.ndarray, style.Line]]) -> None:
    for name, _, line in curves:
        if name == FITTED_POINTS:
            sheet.line_entry(FITTED_POINTS, line, marker=".")
            continue
        decides = view.deciding is not None and name == view.deciding["scheme"]
        sheet.line_entry(
            f"held out, {clean(name, 40)}{' (decides)' if decides else ''}", line, marker="o", markersize=4
        )
    hollow = {"marker": "o", "markersize": 5, "markerfacecolor": style.PAPER, "markeredgecolor": style.INK,
              "linestyle": "none"}  # fmt: skip
    if not all(row.get("eligible") for row in rows):
        sheet.entry(Line2D([], [], **hollow), "hollow: not eligible")
    if len(_groups(rows)) > 1:
        for number, group in enumerate(_groups(rows)):
            members = [row for row in rows if row.get("group", 0) == group]
            marker = style.GROUP_MARKERS[number % len(style.GROUP_MARKERS)]
            first, last = clean(members[0]["candidate"], 30), clean(members[-1]["candidate"], 30)
            handle = Line2D([], [], marker=marker, linestyle="none", color=style.FAINT, markersize=5)
            sheet.entry(handle, f"{first} … {last}" if first != last else first)


def _notes(sheet: Sheet, view: View, rows: list[dict], curves: list[tuple[str, np.ndarray, style.Line]]) -> None:
    if view.deciding is None:
        sheet.note(f"The rule {clean(view.settings.get('rule'), 30)} decides without a held-out loss.")
    else:
        units = len(view.deciding.get("folds") or [])
        sheet.note(f"Bars: one standard error of the deciding loss, over n = {units} folds or units left out.")
        losses = scheme_losses(view, view.deciding["scheme"], rows)
        lost = [row["candidate"] for row, loss in zip(rows, losses, strict=True) if not np.isfinite(loss)]
        sheet.note(f"Without a deciding loss (reasons in the table): {listed(lost)}." if lost else "")
    sheet.note(RULE_NOTES.get(view.settings.get("rule"), ""))
    if view.weighted:
        sheet.note("Losses are weighted, so that their roots are not drawn.")
    if any((losses <= 0).any() for _, losses, _ in curves):
        sheet.note("A loss of zero is drawn at the foot of the panel.")


def _words(view: View) -> str:
    """The figure in words."""
    scheme = view.deciding["scheme"] if view.deciding else "none"
    return (
        f"Loss of {len(view.candidates)} candidates against their number of parameters, logarithmic scale. "
        f"Deciding scheme: {scheme}. Chosen: {view.chosen_words}. The numbers stand in the table of candidates."
    )
