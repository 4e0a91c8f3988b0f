"""Colours that can be told apart by everyone, on screen and in grey print."""

from __future__ import annotations

from itertools import combinations

import numpy as np
import pytest
from matplotlib.colors import to_rgb

from fitlib.figures import style

# Machado, Oliveira, Fernandes: IEEE Trans. Vis. Comput. Graphics 15 (2009) 1291, severity 1.0; on linear RGB.
DEFICIENCIES = {
    "none": np.eye(3),
    "protanomaly": [[0.152286, 1.052583, -0.204868], [0.114503, 0.786281, 0.099216], [-0.003882, -0.048116, 1.051998]],
    "deuteranomaly": [[0.367322, 0.860646, -0.227968], [0.280085, 0.672501, 0.047413], [-0.011820, 0.042940, 0.968881]],
    "tritanomaly": [[1.255528, -0.076749, -0.178779], [-0.078411, 0.930809, 0.147602], [0.004733, 0.691367, 0.303900]],
}


def linear(colour: str) -> np.ndarray:
    """Linear RGB (IEC 61966-2-1)."""
    rgb = np.array(to_rgb(colour))
    return np.where(rgb <= 0.04045, rgb / 12.92, ((rgb + 0.055) / 1.055) ** 2.4)


def luminance(colour: str) -> float:
    """Relative luminance (WCAG 2.2)."""
    return float(linear(colour) @ [0.2126, 0.7152, 0.0722])


def lab(rgb: np.ndarray) -> np.ndarray:
    """CIE L*a*b* of linear RGB under D65."""
    xyz = np.array([[0.4124564, 0.3575761, 0.1804375], [0.2126729, 0.7151522, 0.0721750],
                    [0.0193339, 0.1191920, 0.9503041]]) @ np.clip(rgb, 0, 1) / [0.95047, 1.0, 1.08883]  # fmt: skip
    f = np.where(xyz > 216 / 24389, np.cbrt(xyz), (24389 / 27 * xyz + 16) / 116)
    return np.array([116 * f[1] - 16, 500 * (f[0] - f[1]), 200 * (f[1] - f[2])])


@pytest.mark.parametrize("deficiency", DEFICIENCIES)
def test_the_curves_of_one_figure_differ_for_every_kind_of_colour_vision(deficiency):
    matrix = np.array(DEFICIENCIES[deficiency])
    colours = [line.colour for line in style.ROLE_LINES.values()]
    for one, other in combinations(colours, 2):
        assert np.linalg.norm(lab(matrix @ linear(one)) - lab(matrix @ linear(other))) > 15, (one, other)


def test_lines_and_text_have_the_contrast_that_wcag_asks_for():
    lines = [*style.ROLE_LINES.values(), *style.SCHEME_LINES, style.FITTED_POINT_LINE]
    for colour in [line.colour for line in lines] + list(style.SERIES_COLOURS) + [style.SUSPECT]:
        assert 1.05 / (luminance(colour) + 0.05) >= 3, colour  # WCAG 2.2, 1.4.11 non-text contrast
    for colour in (style.INK, style.FAINT):
        assert 1.05 / (luminance(colour) + 0.05) >= 4.5, colour  # WCAG 2.2, 1.4.3


def test_lines_differ_in_dash_and_points_in_shape_so_that_grey_print_is_enough():
    for lines in (style.ROLE_LINES.values(), (style.DECIDING_LINE, *style.SCHEME_LINES, style.FITTED_POINT_LINE)):
        dashes = [str(line.dash) for line in lines]
        assert len(set(dashes)) == len(dashes)
    special = [style.EXCLUDED_MARKER, style.VERIFICATION_MARKER]
    assert len(set(style.SERIES_MARKERS)) == len(style.SERIES_MARKERS) == len(style.SERIES_COLOURS)
    assert not set(special) & set(style.SERIES_MARKERS)
