"""Observations as points: series by shape and colour, direction by filling, state by shape, suspects by a ring."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from matplotlib.axes import Axes
from matplotlib.lines import Line2D

from fitlib.figures import style
from fitlib.figures.sheet import Sheet
from fitlib.figures.view import View
from fitlib.figures.words import clean

MANY_SERIES = len(style.SERIES_MARKERS)
RASTER_ABOVE = 1500  # used observations, above which they are drawn as a picture so that the file stays small
_FILLINGS = ("full", "none", "left", "bottom")


@dataclass(frozen=True)
class Kind:
    """Points that look alike."""

    members: np.ndarray
    marker: str
    colour: str
    filling: str


def _names_in_order(words: np.ndarray, members: np.ndarray) -> list[str]:
    return list(dict.fromkeys(words[members]))


def directions(view: View) -> list[str]:
    """Directions that are told apart: none when there are fewer than two or more than can be told apart."""
    names = [name for name in _names_in_order(view.words("direction"), view.is_state("used")) if name]
    if set(names) == {"rising", "falling"}:
        return ["rising", "falling"]
    return names if 2 <= len(names) <= len(_FILLINGS) else []


def kinds(view: View) -> list[Kind]:
    """The used observations, in groups that look alike."""
    used = view.is_state("used")
    series, way = view.words("series"), view.words("direction")
    names = _names_in_order(series, used)
    found = []
    fillings = [(used, "full")]
    if told := directions(view):
        fillings = [(used & (way == name), filling) for name, filling in zip(told, _FILLINGS, strict=False)]
        fillings.append((used & ~np.isin(way, told), "full"))
    for members, filling in fillings:
        if len(names) > MANY_SERIES:
            found.append(Kind(members, "o", style.SERIES_COLOURS[0], filling))
            continue
        for number, name in enumerate(names):
            marker, colour = style.SERIES_MARKERS[number], style.SERIES_COLOURS[number]
            found.append(Kind(members & (series == name), marker, colour, filling))
    return [kind for kind in found if kind.members.any()]


def marker_size(count: int) -> float:
    """Smaller points where there are many."""
    return 4.6 if count <= 150 else 3.4 if count <= 800 else 2.2


def scatter(panel: Axes, x: np.ndarray, y: np.ndarray, **look: object) -> None:
    """Points without a line; those without a position are left to the notes."""
    shown = np.isfinite(x) & np.isfinite(y)
    if shown.any():
        panel.plot(x[shown], y[shown], linestyle="none", **look)


def draw_used(panel: Axes, view: View, x: np.ndarray, y: np.ndarray) -> None:
    """Draw the used observations and ring the suspect ones; x and y are positions of all observations read."""
    count = int(view.is_state("used").sum())
    size, raster = marker_size(count), count > RASTER_ABOVE
    for kind in kinds(view):
        look = _look(kind.marker, kind.colour, kind.filling, size)
        scatter(panel, x[kind.members], y[kind.members], rasterized=raster, **look)
    ringed = view.suspect & view.is_state("used")
    scatter(panel, x[ringed], y[ringed], zorder=5, **_ring(size))


def draw_verification(panel: Axes, view: View, x: np.ndarray, y: np.ndarray) -> None:
    """Draw the verification points as open diamonds."""
    members = view.is_state("verification")
    scatter(panel, x[members], y[members], zorder=4, **_diamond())


def draw_excluded(panel: Axes, x: np.ndarray, y: np.ndarray) -> None:
    """Draw excluded observations as open crosses."""
    scatter(panel, x, y, zorder=4.5, **_cross())


def _look(marker: str, colour: str, filling: str, size: float) -> dict:
    look = {"marker": marker, "markersize": size, "markeredgecolor": colour, "markeredgewidth": 0.9}
    if filling == "full":
        return {**look, "markerfacecolor": colour, "alpha": 0.85}
    if filling == "none":
        return {**look, "markerfacecolor": style.PAPER}
    return {**look, "color": colour, "fillstyle": filling, "markerfacecoloralt": style.PAPER}


def _ring(size: float) -> dict:
    return {
        "marker": style.SUSPECT_MARKER,
        "markersize": size + 5.5,
        "markerfacecolor": "none",
        "markeredgecolor": style.SUSPECT,
        "markeredgewidth": 1.3,
    }


def _diamond() -> dict:
    return {
        "marker": style.VERIFICATION_MARKER,
        "markersize": 5.2,
        "markerfacecolor": "none",
        "markeredgecolor": style.INK,
        "markeredgewidth": 1.1,
    }


def _cross() -> dict:
    return {
        "marker": style.EXCLUDED_MARKER,
        "markersize": 7.5,
        "markerfacecolor": "none",
        "markeredgecolor": style.INK,
        "markeredgewidth": 1.0,
    }


def _handle(**look: object) -> Line2D:
    return Line2D([], [], linestyle="none", **look)


def points_legend(sheet: Sheet, view: View, excluded: bool = True) -> None:
    """Name the kinds of points that occur."""
    used = view.is_state("used")
    series = view.words("series")
    names = _names_in_order(series, used)
    several = 1 < len(names) <= MANY_SERIES
    if several or (len(names) == 1 and names[0]):
        for number, name in enumerate(names):
            count = int((used & (series == name)).sum())
            look = _look(style.SERIES_MARKERS[number], style.SERIES_COLOURS[number], "full", 4.6)
            sheet.entry(_handle(**look), f"series {clean(name, 24) or '(no name)'}, n = {count}")
    elif used.any():
        text = f"observations of {len(names)} series" if len(names) > 1 else "observations"
        look = _look("o", style.SERIES_COLOURS[0], "full", 4.6)
        sheet.entry(_handle(**look), f"{text}, n = {int(used.sum())}")
    _directions_legend(sheet, view)
    _states_legend(sheet, view, excluded)


def _directions_legend(sheet: Sheet, view: View) -> None:
    for name, filling in zip(directions(view), _FILLINGS, strict=False):
        word = {"full": "filled", "none": "open", "left": "left half filled", "bottom": "lower half filled"}[filling]
        sheet.entry(_handle(**_look("o", style.FAINT, filling, 4.6)), f"{clean(name, 24)} ({word})")


def _states_legend(sheet: Sheet, view: View, excluded: bool) -> None:
    if number := int(view.is_state("verification").sum()):
        sheet.entry(_handle(**_diamond()), f"verification points, n = {number}")
    if excluded and (number := int(view.is_state("excluded").sum())):
        sheet.entry(_handle(**_cross()), f"excluded, n = {number}")
    if number := int((view.suspect & view.is_state("used")).sum()):
        sheet.entry(_handle(**_ring(3.0)), f"suspect (kept), n = {number}")
