"""Colours, lines, markers and type of every figure: the only place where looks are decided.

Colours differ in lightness as well as in hue, lines in dash, points in shape, so that nothing is told by colour alone.
"""

from __future__ import annotations

import logging
import warnings
from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import dataclass

from matplotlib import style as matplotlib_style

INK = "#1c2127"
FAINT = "#656d76"
GRID = "#d9dde2"
PAPER = "#ffffff"
BAND = "#9db7d5"
SUSPECT = "#a3122f"

SANS = ["DejaVu Sans"]  # shipped with matplotlib, so that text is placed alike everywhere
TITLE_SIZE, LABEL_SIZE, TEXT_SIZE = 9.5, 8.5, 7.5


@dataclass(frozen=True)
class Line:
    """How one curve is drawn."""

    colour: str
    dash: object
    width: float


ROLE_LINES = {
    "chosen": Line("#123a6b", "-", 2.0),
    "runner-up": Line("#d2691e", (0, (5, 2)), 1.6),
    "smallest loss": Line("#37927a", (0, (6, 1.5, 1, 1.5, 1, 1.5)), 1.5),
    "most parameters": Line("#7a3f98", (0, (1.2, 1.2)), 1.5),
}

SCHEME_LINES = (
    Line("#d2691e", (0, (5, 2)), 1.2),
    Line("#37927a", (0, (6, 1.5, 1, 1.5)), 1.2),
    Line("#7a3f98", (0, (2.5, 1.5)), 1.2),
    Line("#8a7a2f", (0, (8, 2)), 1.2),
    Line("#6d7782", (0, (3, 1, 1, 1, 1, 1)), 1.2),
)
DECIDING_LINE = ROLE_LINES["chosen"]
FITTED_POINT_LINE = Line(INK, (0, (1.2, 1.4)), 1.3)

SERIES_COLOURS = ("#1b4f8f", "#b8560f", "#2f7d6b", "#7d4a97", "#5b6068", "#7b6300", "#8f3550", "#2a78b8")
SERIES_MARKERS = ("o", "s", "^", "v", "P", "<", ">", "p")
GROUP_MARKERS = ("o", "s", "^", "v", "P", "<", ">", "p")
EXCLUDED_MARKER, VERIFICATION_MARKER, SUSPECT_MARKER = "X", "D", "o"

_SETTINGS = {
    "svg.fonttype": "none",  # text stays text: small, searchable, and any script the reader's machine has
    "svg.hashsalt": "fitlib",
    "text.parse_math": False,  # a dollar sign in a user's text is a dollar sign
    "text.usetex": False,
    "font.family": "sans-serif",
    "font.sans-serif": SANS,
    "font.size": TEXT_SIZE,
    "axes.labelsize": LABEL_SIZE,
    "axes.titlesize": LABEL_SIZE,
    "axes.edgecolor": FAINT,
    "axes.labelcolor": INK,
    "axes.linewidth": 0.8,
    "axes.spines.top": False,
    "axes.spines.right": False,
    "axes.grid": True,
    "axes.axisbelow": True,
    "axes.unicode_minus": True,
    "grid.color": GRID,
    "grid.linewidth": 0.6,
    "text.color": INK,
    "xtick.color": FAINT,
    "ytick.color": FAINT,
    "xtick.labelcolor": INK,
    "ytick.labelcolor": INK,
    "xtick.labelsize": TEXT_SIZE,
    "ytick.labelsize": TEXT_SIZE,
    "figure.facecolor": PAPER,
    "savefig.facecolor": PAPER,
    "figure.dpi": 72.0,
    "legend.frameon": False,
    "legend.fontsize": TEXT_SIZE,
}


@contextmanager
def drawing_style() -> Iterator[None]:
    """Draw with these settings alone: neither a user's matplotlibrc nor a caller's settings count.

    Missing glyphs are no concern here, because text is left to the reader's fonts.
    """
    font_log = logging.getLogger("matplotlib.font_manager")
    level = font_log.level
    with matplotlib_style.context(["default", _SETTINGS]), warnings.catch_warnings():
        warnings.filterwarnings("ignore", message=r"Glyph .* missing from font", category=UserWarning)
        font_log.setLevel(logging.ERROR)
        try:
            yield
        finally:
            font_log.setLevel(level)
