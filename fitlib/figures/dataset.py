"""The four figures of one dataset."""

from __future__ import annotations

from fitlib.figures.data import draw_data
from fitlib.figures.level_loss import draw_level_loss
from fitlib.figures.loss import draw_loss
from fitlib.figures.residuals import draw_residuals
from fitlib.figures.style import drawing_style
from fitlib.figures.view import View

FIGURES = {
    "data": draw_data,
    "loss": draw_loss,
    "residuals": draw_residuals,
    "level_loss": draw_level_loss,
}


def draw_dataset(result: dict) -> dict[str, str]:
    """Draw every figure of one dataset.

    Parameters
    ----------
    result : dict
        The result of one dataset, as the analysis assembles it.

    Returns
    -------
    dict of str to str
        SVG text by figure name: ``data``, ``loss``, ``residuals``, ``level_loss``. The same result gives the
        same bytes whatever the settings of the user's machine.
    """
    with drawing_style():
        view = View(result)
        return {name: draw(view) for name, draw in FIGURES.items()}
