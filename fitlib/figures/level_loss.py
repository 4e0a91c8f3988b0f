"""Figure `level_loss`: held-out loss of each level, for the chosen candidate and its rivals."""

from __future__ import annotations

import numpy as np
from matplotlib.axes import Axes

from fitlib.figures import style
from fitlib.figures.scales import decade_scale, linear_scale, set_decades
from fitlib.figures.sheet import Sheet, empty_panel
from fitlib.figures.svg import to_svg
from fitlib.figures.view import Drawn, View, as_array
from fitlib.figures.words import axis_label, clean, number, percent

_MARKERS = {"chosen": "o", "runner-up": "s", "smallest loss": "v", "most parameters": "^"}
_ROOM = 75  # letters that fit along the axis
_WEIGHT_POWERS = {"inverse_stimulus": -1.0, "inverse_stimulus_squared": -2.0}


def draw_level_loss(view: View) -> str:
    """Draw the loss of each level left out.

    Parameters
    ----------
    view : View
        The result of one dataset.

    Returns
    -------
    str
        SVG text.
    """
    sheet = Sheet([[2.6, 1]])
    panel = sheet.panels[0]
    curves = _curves(view)
    if curves:
        _draw(sheet, panel, view, curves)
    else:
        empty_panel(panel, "No scheme gave a loss per level.")
    sheet.note(view.counts() + ".")
    figure = sheet.arrange(view.title("loss per level"))
    words = "; ".join(_share_words(view, drawn, losses) for drawn, losses in curves)
    return to_svg(figure, "level_loss", f"Loss per level of {view.name}", f"Held-out loss of each level. {words}")


def _curves(view: View) -> list[tuple[Drawn, np.ndarray]]:
    """Each drawn candidate with its loss per level."""
    per_level = (view.shown_scheme or {}).get("level_losses") or {}
    count = len(view.result.get("levels") or [])
    found = [(drawn, as_array(per_level.get(drawn.candidate))) for drawn in view.drawn]
    return [(drawn, losses) for drawn, losses in found if losses.size == count and np.isfinite(losses).any()]


def _draw(sheet: Sheet, panel: Axes, view: View, curves: list[tuple[Drawn, np.ndarray]]) -> None:
    scale = decade_scale(np.concatenate([view.shown_loss(losses) for _, losses in curves]))
    count = curves[0][1].size
    _set_axes(panel, view, count)
    unit = view.fitted["unit"]
    label = axis_label("root of loss of a level", unit)
    if view.weighted:
        label = axis_label("loss of a level, weighted", unit, exponent=2)
    set_decades(panel.yaxis, scale, label)
    for drawn, losses in curves:
        line, marker = style.ROLE_LINES[drawn.role], _MARKERS[drawn.role]
        panel.plot(
            np.arange(count), scale(view.shown_loss(losses)), color=line.colour, linestyle=line.dash,
            linewidth=line.width, marker=marker, markersize=4.5 if count <= 60 else 2, zorder=3,
        )  # fmt: skip
        sheet.line_entry(drawn.label, line, marker=marker, markersize=4.5)
        sheet.note(_share_words(view, drawn, losses))
    sheet.note(f"Scheme: {clean(view.shown_scheme['scheme'], 40)}. Levels are drawn evenly spaced; shaded: end levels.")
    if any((losses <= 0).any() for _, losses in curves):
        sheet.note("A loss of zero is drawn at the foot of the panel.")


def _set_axes(panel: Axes, view: View, count: int) -> None:
    """Levels side by side, the two end levels shaded."""
    levels = view.result["levels"]
    values = as_array([level["level"] for level in levels])
    along = linear_scale(values)
    texts = [number(at, 4) for at in (values - along.offset) / 10.0**along.power]
    stride = -(-count // max(2, int(_ROOM / max(len(text) for text in texts))))
    ticks = [at for at in range(0, count, stride) if at == 0 or at <= count - 1 - stride / 2] + [count - 1]
    ticks = list(dict.fromkeys(ticks))
    panel.set_xticks(ticks, labels=[texts[at] for at in ticks])
    panel.set_xlim(-0.6, count - 0.4)
    stimulus = view.settings["stimulus"]
    panel.set_xlabel(along.label(f"level, {stimulus['quantity']}", stimulus["unit"]))
    for end in sorted({0, count - 1}):
        panel.axvspan(end - 0.4, end + 0.4, facecolor="#eceff3", edgecolor="none", zorder=0.5)


def end_share(view: View, losses: np.ndarray) -> float | None:
    """Share of the end levels in the held-out sum of squares, each level counted by its observations and weight."""
    levels = view.result["levels"]
    counts = as_array([level.get("observations") for level in levels])
    power = _WEIGHT_POWERS.get(view.settings.get("weighting"), 0)
    with np.errstate(divide="ignore"):
        sums = counts * losses * np.abs(as_array([level["level"] for level in levels])) ** power
    total = np.nansum(sums)
    if losses.size < 3 or not np.isfinite(sums[[0, -1]]).all() or not total > 0:
        return None
    return float(sums[[0, -1]].sum() / total)


def _share_words(view: View, drawn: Drawn, losses: np.ndarray) -> str:
    share = end_share(view, losses)
    if share is None:
        return f"{clean(drawn.candidate, 40)}: the share of the end levels cannot be stated."
    count = losses.size
    return (
        f"{clean(drawn.candidate, 40)}: the 2 end levels of {count} carry {percent(share)} of the loss "
        f"(an equal share would be {percent(2 / count)})."
    )
