"""Figure `residuals`: residuals of the chosen function against stimulus, fitted value and order read."""

from __future__ import annotations

import numpy as np
from matplotlib.axes import Axes

from fitlib.figures import style
from fitlib.figures.points import draw_used, draw_verification, points_legend
from fitlib.figures.scales import LinearScale, linear_scale, set_linear
from fitlib.figures.sheet import Sheet, empty_panel
from fitlib.figures.svg import to_svg
from fitlib.figures.view import View
from fitlib.figures.words import clean, with_unit

_SPREAD_LINE = style.Line(style.FAINT, (0, (7, 3)), 1.0)


def draw_residuals(view: View) -> str:
    """Draw the residuals of used observations and verification points.

    Parameters
    ----------
    view : View
        The result of one dataset.

    Returns
    -------
    str
        SVG text.
    """
    sheet = Sheet([[1.9, 1, 1], [1.6, 1]])
    members = view.is_state("used") | view.is_state("verification")
    residuals = np.where(members, view.column("residual"), np.nan)
    if np.isfinite(residuals).any():
        _draw(sheet, view, residuals)
    else:
        for panel in sheet.panels:
            empty_panel(panel, "No residuals: no function was chosen.")
    sheet.note(view.counts() + ".")
    whose = f" of {clean(view.chosen, 30)}" if view.chosen else ""
    figure = sheet.arrange(view.title(f"residuals{whose}"))
    return to_svg(figure, "residuals", f"Residuals of {view.name}", _words(view))


def _draw(sheet: Sheet, view: View, residuals: np.ndarray) -> None:
    spread = _spread(view)
    values = np.concatenate([residuals, [0.0], [] if spread is None else [spread, -spread]])
    scale = linear_scale(values, 0.08)
    points_legend(sheet, view, excluded=False)
    order = np.arange(1, view.size + 1, dtype=float)
    stimulus = view.settings["stimulus"]
    against = (
        (view.column("stimulus"), stimulus["quantity"], stimulus["unit"], 5),
        (view.column("fitted"), f"fitted {view.fitted['quantity']}", view.fitted["unit"], 5),
        (order, "order read", "", 8),
    )
    for number, (panel, (x, quantity, unit, ticks)) in enumerate(zip(sheet.panels, against, strict=True)):
        across = linear_scale(np.where(np.isfinite(residuals), x, np.nan), 0.04)
        set_linear(panel.xaxis, across, quantity, unit, ticks)
        set_linear(panel.yaxis, scale, "residual", view.fitted["unit"], 5)
        _draw_panel(panel, view, across(x), residuals, scale, spread)
        if number == 1:
            panel.tick_params(labelleft=False)
            panel.set_ylabel("")
    if spread is not None:
        sheet.line_entry(f"± residual standard deviation, {with_unit(spread, view.fitted['unit'])}", _SPREAD_LINE)
    elif view.weighted:
        sheet.note("The fit is weighted: its residual standard deviation differs from point to point and is not drawn.")


def _spread(view: View) -> float | None:
    row = view.candidates.get(view.chosen) or {}
    return None if view.weighted else row.get("residual_standard_deviation")


def _draw_panel(
    panel: Axes, view: View, x: np.ndarray, residuals: np.ndarray, scale: LinearScale, spread: float | None
) -> None:
    panel.axhline(float(scale(0.0)), color=style.INK, linewidth=0.9, zorder=1.8)
    for edge in () if spread is None else (spread, -spread):
        line = _SPREAD_LINE
        panel.axhline(float(scale(edge)), color=line.colour, linestyle=line.dash, linewidth=line.width, zorder=1.7)
    y = scale(residuals)
    draw_used(panel, view, x, y)
    draw_verification(panel, view, x, y)


def _words(view: View) -> str:
    """The figure in words."""
    return (
        f"Three panels of residuals (observed less fitted) of {view.chosen or 'no candidate'}, {view.counts()}: "
        "against stimulus, against fitted value and in the order read, with a zero line and lines at plus and minus "
        "one residual standard deviation."
    )
