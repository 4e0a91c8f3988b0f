"""Figures of one dataset as SVG text; reads results and computes nothing but positions on paper."""

from fitlib.figures.dataset import draw_dataset

__all__ = ["draw_dataset"]
