"""The paper of a figure: panels in rows with fixed margins, one legend above, notes below."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from matplotlib.axes import Axes
from matplotlib.backends.backend_svg import FigureCanvasSVG
from matplotlib.figure import Figure
from matplotlib.legend import Legend
from matplotlib.lines import Line2D

from fitlib.figures import style
from fitlib.figures.words import broken, wrapped

WIDTH = 7.2  # inches; fits the text width of an A4 page
LEFT, RIGHT = 0.95, 0.14
_LEGEND_LINE, _NOTE_LINE, _TITLE, _X_LABEL, _COLUMN_GAP = 0.148, 0.145, 0.3, 0.5, 0.25
_LONG = 56  # letters
_LABEL_LETTER = 0.071
_LETTER, _HANDLE = 0.059, 0.63  # inches: mean width of a letter at the legend's size; of a legend's line with its gaps


@dataclass
class Row:
    """Panels side by side; `labelled` leaves room for an axis label below."""

    panels: list[Axes]
    height: float
    labelled: bool = True


class Sheet:
    """One figure in the making.

    Parameters
    ----------
    heights : list of list of float
        For each row of panels: the height in inches, then the relative width of each panel.
    shared_x : bool
        Rows share the horizontal axis, so that only the last one is labelled below.
    """

    def __init__(self, heights: list[list[float]], shared_x: bool = False):
        self.figure = Figure(figsize=(WIDTH, 4.0))
        FigureCanvasSVG(self.figure)
        self.rows: list[Row] = []
        self.widths = [row[1:] for row in heights]
        self.legend: list[tuple[object, str]] = []
        self.long_legend: list[tuple[object, str]] = []
        self.notes: list[str] = []
        for number, row in enumerate(heights):
            panels = [self.figure.add_axes((0.1, 0.1, 0.8, 0.8)) for _ in row[1:]]
            for panel in panels:
                panel.set_autoscale_on(False)
            self.rows.append(Row(panels, row[0], not shared_x or number == len(heights) - 1))

    @property
    def panels(self) -> list[Axes]:
        """All panels, row by row."""
        return [panel for row in self.rows for panel in row.panels]

    def entry(self, handle: object, text: str) -> None:
        """Add an entry to the legend; long ones stand in lines of their own below the others."""
        (self.long_legend if len(text) > _LONG else self.legend).append((handle, text))

    def line_entry(self, text: str, line: style.Line, **points: object) -> None:
        """Add a line, with or without points, to the legend."""
        handle = Line2D([], [], color=line.colour, linestyle=line.dash, linewidth=line.width, **points)
        self.entry(handle, text)

    def note(self, text: str) -> None:
        """Add a note below the panels."""
        if text and text not in self.notes:
            self.notes.append(text)

    def arrange(self, title: str) -> Figure:
        """Set the height of the figure and put everything in its place."""
        columns = self._legend_columns()
        lines = wrapped(self.notes)
        legend_rows = -(-len(self.legend) // columns)
        above = _TITLE + _LEGEND_LINE * (legend_rows + len(self.long_legend)) + 0.12
        below = 0.08 + _NOTE_LINE * len(lines)
        gaps = [self._break_labels(row, widths) for row, widths in zip(self.rows, self.widths, strict=True)]
        height = above + sum(row.height for row in self.rows) + sum(gaps) + below
        self.figure.set_size_inches(WIDTH, height)
        self._place_rows(height, above, gaps)
        self._write(title, height, lines)
        self._write_legend(self.legend, height - _TITLE + 0.02, columns)
        self._write_legend(self.long_legend, height - _TITLE + 0.02 - _LEGEND_LINE * legend_rows, 1)
        return self.figure

    def _legend_columns(self) -> int:
        """As many columns as fit side by side; the legend is filled column by column."""
        lengths = [len(text) for _, text in self.legend]
        for columns in range(min(5, len(lengths)), 1, -1):
            widths = [max(column) * _LETTER + _HANDLE for column in np.array_split(lengths, columns)]
            if sum(widths) <= WIDTH - 0.2:
                return columns
        return 1

    def _break_labels(self, row: Row, widths: list[float]) -> float:
        """Break axis labels that are longer than their panel; return the room that the row needs below."""
        lines = 1
        for panel, width in zip(row.panels, self._widths(widths), strict=True):
            panel.set_ylabel(broken(panel.get_ylabel(), int(row.height / _LABEL_LETTER)))
            panel.set_xlabel(broken(panel.get_xlabel(), int(width / _LABEL_LETTER)))
            lines = max(lines, 1 + panel.get_xlabel().count("\n"))
        return _X_LABEL + 0.14 * (lines - 1) if row.labelled else 0.14

    def _widths(self, widths: list[float]) -> list[float]:
        """Widths in inches of the panels of a row."""
        room = WIDTH - LEFT - RIGHT - _COLUMN_GAP * (len(widths) - 1)
        return [room * share / sum(widths) for share in widths]

    def _place_rows(self, height: float, above: float, gaps: list[float]) -> None:
        top = height - above
        for row, widths, gap in zip(self.rows, self.widths, gaps, strict=True):
            left = LEFT
            for panel, width in zip(row.panels, self._widths(widths), strict=True):
                panel.set_position((left / WIDTH, (top - row.height) / height, width / WIDTH, row.height / height))
                left += width + _COLUMN_GAP
            top -= row.height + gap

    def _write(self, title: str, height: float, lines: list[str]) -> None:
        self.figure.text(0.12 / WIDTH, 1 - 0.08 / height, title, va="top", fontsize=style.TITLE_SIZE, fontweight="bold")
        for number, line in enumerate(lines):
            y = (0.06 + _NOTE_LINE * (len(lines) - number)) / height
            self.figure.text(0.12 / WIDTH, y, line, va="top", fontsize=style.TEXT_SIZE - 0.3, color=style.FAINT)

    def _write_legend(self, entries: list[tuple[object, str]], top: float, columns: int) -> None:
        """Place one block of the legend; `top` in inches above the foot of the figure."""
        if not entries:
            return
        handles, texts = zip(*entries, strict=True)
        place = (0.1 / WIDTH, top / self.figure.get_figheight())
        legend = Legend(
            self.figure, handles, texts, loc="upper left", bbox_to_anchor=place, ncols=columns, borderaxespad=0.0,
            borderpad=0.1, handlelength=3.2, handletextpad=0.6, columnspacing=1.4, labelspacing=0.35,
            bbox_transform=self.figure.transSubfigure,
        )  # fmt: skip
        self.figure.add_artist(legend)


def empty_panel(panel: Axes, words: str) -> None:
    """A panel that has nothing to show says why."""
    panel.set_xticks([])
    panel.set_yticks([])
    panel.text(0.5, 0.5, words, ha="center", va="center", transform=panel.transAxes, color=style.FAINT)
