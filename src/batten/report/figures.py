"""The figures of the report, and how to hand them on. Each is a matplotlib Figure that knows its own words."""

from __future__ import annotations

from batten.report.canvas import Picture, describe, img_html, to_png
from batten.report.plot_curves import fit_figure, line_against_choice
from batten.report.plot_ladder import ladder_figure
from batten.report.plot_left import left_figure
from batten.report.plot_spans import spans_figure

__all__ = [
    "Picture", "describe", "fit_figure", "img_html", "ladder_figure", "left_figure", "line_against_choice",
    "spans_figure", "to_png",
]  # fmt: skip
