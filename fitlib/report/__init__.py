"""The report of a study: one HTML file that opens offline; reads results and computes nothing but rounding."""

from fitlib.report.render import render_report

__all__ = ["render_report"]
