"""Figure `data`: observations with the chosen function and its rivals, and below the deviations from the chosen one."""

from __future__ import annotations

import numpy as np
from matplotlib.axes import Axes
from matplotlib.lines import Line2D
from matplotlib.patches import Patch

from fitlib.figures import style
from fitlib.figures.points import draw_excluded, draw_used, draw_verification, points_legend
from fitlib.figures.scales import LinearScale, finite, linear_scale, set_linear
from fitlib.figures.sheet import Sheet, empty_panel
from fitlib.figures.svg import to_svg
from fitlib.figures.view import Drawn, View
from fitlib.figures.words import clean, counted, listed, with_unit

_FAR = 2.0  # an excluded observation farther than this many data ranges away is put at the edge, and a note says so
_ABOUT_BANDS = {
    "inadequate": "No confidence band and no prediction interval: neither holds for a function that is inadequate.",
    "not_evaluated": "Band and interval hold only if the function is adequate, which was not evaluated.",
}


def draw_data(view: View) -> str:
    """Draw observations, functions, deviations, confidence band and prediction interval.

    Parameters
    ----------
    view : View
        The result of one dataset.

    Returns
    -------
    str
        SVG text.
    """
    sheet = Sheet([[2.3, 1], [2.0, 1]], shared_x=True)
    upper, lower = sheet.panels
    points_legend(sheet, view)
    across = linear_scale(np.concatenate([_near(view, view.x), finite(view.grid)]), 0.04)
    for panel in (upper, lower):
        set_linear(panel.xaxis, across, view.across["quantity"], view.across["unit"], 8)
    upper.tick_params(labelbottom=False)
    upper.xaxis.label.set_visible(False)
    _draw_functions(sheet, upper, view, across)
    _draw_deviations(sheet, lower, view, across)
    sheet.note(view.counts() + ".")
    figure = sheet.arrange(view.title("observations and functions"))
    return to_svg(figure, "data", f"Observations and functions of {view.name}", _words(view))


def _near(view: View, values: np.ndarray) -> np.ndarray:
    """Values that set the limits: all but excluded ones that lie far from the rest."""
    kept = finite(values[~view.is_state("excluded")])
    out = finite(values[view.is_state("excluded")])
    if not kept.size:
        return out
    reach = _FAR * max(np.ptp(kept), 1e-12 * np.abs(kept).max())
    return np.concatenate([kept, out[(out >= kept.min() - reach) & (out <= kept.max() + reach)]])


def _draw_functions(sheet: Sheet, panel: Axes, view: View, across: LinearScale) -> None:
    chosen = view.curve(view.chosen)
    scale = linear_scale(np.concatenate([_near(view, view.y), finite([] if chosen is None else chosen)]), 0.06)
    set_linear(panel.yaxis, scale, view.fitted["quantity"], view.fitted["unit"])
    for drawn in view.drawn:
        if (values := view.curve(drawn.candidate)) is not None:
            _draw_curve(sheet, panel, across(view.grid), scale(values), drawn)
            _note_leaving(sheet, view, scale, drawn, values, "the upper panel", view.fitted["unit"])
    x, y = across(view.x), scale(view.y)
    draw_used(panel, view, x, y)
    draw_verification(panel, view, x, y)
    _draw_excluded(sheet, panel, view, across, scale)


def _draw_curve(sheet: Sheet, panel: Axes, x: np.ndarray, y: np.ndarray, drawn: Drawn) -> None:
    line = style.ROLE_LINES[drawn.role]
    order = 3 if drawn.role == "chosen" else 2.5
    panel.plot(x, y, color=line.colour, linestyle=line.dash, linewidth=line.width, zorder=order)
    sheet.line_entry(drawn.label, line)


def _note_leaving(
    sheet: Sheet, view: View, scale: LinearScale, drawn: Drawn, values: np.ndarray, where: str, unit: str
) -> None:
    """Say that a curve was cut off, and how far it goes."""
    if np.all(scale.inside(finite(values))):
        return
    centre = (scale.lower + scale.upper) / 2 * 10.0**scale.power + scale.offset
    known = finite(values)
    far = int(np.argmax(np.abs(known - centre)))
    at = with_unit(view.grid[np.isfinite(values)][far], view.across["unit"])
    sheet.note(
        f"{clean(drawn.candidate, 40)} leaves {where}: it reaches {with_unit(known[far], unit)} at {at}, cut off here."
    )


def _draw_excluded(sheet: Sheet, panel: Axes, view: View, across: LinearScale, scale: LinearScale) -> None:
    """Excluded observations stay visible: far ones at the edge, unreadable ones in words."""
    members = view.is_state("excluded")
    x, y = view.x[members], view.y[members]
    readable = np.isfinite(x) & np.isfinite(y)
    x, y, rows = x[readable], y[readable], view.words("row")[members][readable]
    inside = across.inside(x) & scale.inside(y)
    at_x, at_y = np.clip(across(x), across.lower, across.upper), np.clip(scale(y), scale.lower, scale.upper)
    draw_excluded(panel, at_x, at_y)
    for line in panel.lines[-1:] if not np.all(inside) else []:
        line.set_clip_on(False)
    if not np.all(inside):
        sheet.note(f"Excluded observations far from the rest are drawn at the edge: row {listed(list(rows[~inside]))}.")
    if not np.all(readable):
        lost = counted(int((~readable).sum()), "excluded observation has", "excluded observations have")
        sheet.note(f"{lost} no readable number and cannot be drawn.")


def _draw_deviations(sheet: Sheet, panel: Axes, view: View, across: LinearScale) -> None:
    base = view.curve(view.chosen)
    if base is None:
        empty_panel(panel, "No function was chosen, so there are no deviations to show.")
        panel.set_xlabel("")
        return
    members = view.is_state("used") | view.is_state("verification")
    residuals = np.where(members, view.column("residual"), np.nan)
    prediction = view.interval("prediction_interval")
    limits = [finite(residuals)] + ([finite(prediction[0] - base, prediction[1] - base)] if prediction else [])
    scale = linear_scale(np.concatenate(limits), 0.08)
    set_linear(panel.yaxis, scale, f"deviation of {view.fitted['quantity']}", view.fitted["unit"], 5)
    panel.axhline(float(scale(0.0)), color=style.ROLE_LINES["chosen"].colour, linewidth=1.6, zorder=3)
    x = across(view.grid)
    _draw_bands(sheet, panel, view, x, scale, base)
    for drawn in view.drawn[1:]:
        values = view.curve(drawn.candidate)
        if values is not None:
            line = style.ROLE_LINES[drawn.role]
            panel.plot(
                x, scale(values - base), color=line.colour, linestyle=line.dash, linewidth=line.width, zorder=2.5
            )
            _note_leaving(sheet, view, scale, drawn, values - base, "the lower panel", view.fitted["unit"])
    draw_used(panel, view, across(view.x), scale(residuals))
    draw_verification(panel, view, across(view.x), scale(residuals))
    _excluded_deviations(panel, view, across, scale, base)
    sheet.note(f"Lower panel: deviation from {clean(view.chosen, 40)} (observed less fitted; rivals less chosen).")


def _draw_bands(sheet: Sheet, panel: Axes, view: View, x: np.ndarray, scale: LinearScale, base: np.ndarray) -> None:
    """Two intervals of different meaning: a filled band, and a pair of dashed lines."""
    sheet.note(_ABOUT_BANDS.get(view.verdict, ""))
    if band := view.interval("confidence_band"):
        low, high, share = band
        panel.fill_between(x, scale(low - base), scale(high - base), color=style.BAND, linewidth=0, zorder=1.5)
        text = f"confidence band of the mean response, coverage probability {share:g}"
        sheet.entry(Patch(facecolor=style.BAND, edgecolor="none"), text)
    if band := view.interval("prediction_interval"):
        low, high, share = band
        look = {"color": style.FAINT, "linestyle": (0, (10, 2.5, 2.5, 2.5)), "linewidth": 1.1}
        for edge in (low, high):
            panel.plot(x, scale(edge - base), zorder=2, **look)
        text = f"prediction interval of one new observation, coverage probability {share:g}"
        sheet.entry(Line2D([], [], **look), text)


def _excluded_deviations(panel: Axes, view: View, across: LinearScale, scale: LinearScale, base: np.ndarray) -> None:
    """Excluded observations within the grid, at the edge where they lie beyond; read off the drawn curve."""
    members = view.is_state("excluded") & np.isfinite(view.x) & np.isfinite(view.y)
    order = np.argsort(view.grid)
    fitted = np.interp(view.x[members], view.grid[order], base[order], left=np.nan, right=np.nan)
    at = np.clip(scale(view.y[members] - fitted), scale.lower, scale.upper)
    draw_excluded(panel, across(view.x[members]), at)
    for line in panel.lines[-1:] if members.any() else []:
        line.set_clip_on(False)


def _words(view: View) -> str:
    """The figure in words."""
    functions = ", ".join(drawn.label for drawn in view.drawn if view.curve(drawn.candidate) is not None)
    return (
        f"Upper panel: {view.fitted['quantity']} against {view.across['quantity']}, {view.counts()}, "
        f"with the functions {functions or 'none'}. Lower panel: deviations from the chosen function, "
        "with its confidence band and its prediction interval where they hold."
        + (f" The chosen function: {view.mark}." if view.mark else "")
    )
