"""Sheets to draw on: figures of fixed size that owe nothing to pyplot or to the user's matplotlib settings.

Every property that matplotlib would take from its global settings is set here or in `settle`, so that a figure is the
same in every notebook, and in every thread: the settings are neither read on purpose nor touched.
"""

from __future__ import annotations

import base64
import io
from collections.abc import Sequence
from typing import Any

import numpy as np
from matplotlib.axes import Axes
from matplotlib.backends.backend_agg import FigureCanvasAgg
from matplotlib.collections import Collection, LineCollection
from matplotlib.figure import Figure
from matplotlib.lines import Line2D
from matplotlib.patches import Patch
from matplotlib.transforms import Transform
from numpy.typing import ArrayLike
from PIL import Image

from batten.report import style
from batten.report.letterforms import Words
from batten.report.lettering import drawn
from batten.report.markup import esc

__all__ = ["Picture", "describe", "img_html", "inches", "letters", "pane", "settle", "sheet", "strokes", "to_png"]


class Picture(Figure):
    """A figure that can say in words what it shows."""

    words: str = ""


def sheet(width: float, height: float) -> Picture:
    """An empty white sheet, inches."""
    figure = Picture(
        figsize=(width, height), dpi=style.DPI, facecolor=style.PAPER, edgecolor=style.PAPER, linewidth=0, frameon=True
    )  # fmt: skip
    figure.set_layout_engine("none")
    FigureCanvasAgg(figure)
    return figure


def pane(figure: Figure, left: float, bottom: float, right: float, top: float) -> Axes:
    """Axes with margins in inches, and nothing drawn yet: rules and ticks are `scales.scale`'s."""
    width, height = figure.get_size_inches()
    rect = (left / width, bottom / height, 1 - (left + right) / width, 1 - (bottom + top) / height)
    ax = figure.add_axes(rect)
    # matplotlib's own rules and ticks follow the user's settings, and take as long as all the rest
    ax.set_axis_off()
    ax.margins(0)
    return ax


def letters(
    ax: Axes | Figure, x: float, y: float, words: str, *, color: str = style.INK, size: float = style.TEXT,
    ha: str = "left", va: str = "baseline", bold: bool = False, **more: object,
) -> Words:  # fmt: skip
    """Text that is never read as mathematics; `more` goes to the artist (transform, zorder)."""
    made = Words(x, y, drawn(words), size=size, bold=bold, color=color, ha=ha, va=va, **more)
    ax.add_artist(made)
    return made


def inches(ax: Axes) -> tuple[float, float]:
    """Size of the axes."""
    figure = ax.get_figure(root=True)
    assert figure is not None
    w, h = figure.get_size_inches()
    box = ax.get_position()
    return float(w * box.width), float(h * box.height)


def strokes(
    ax: Axes, lines: ArrayLike, transform: Transform, *, color: str, width: float, zorder: float, alpha: float = 1.0
) -> None:
    """Straight strokes from one end to the other, lines (k, 2, 2)."""
    segments: Any = np.asarray(lines, dtype=float).reshape(-1, 2, 2)
    made = LineCollection(
        segments, colors=color, linewidths=width, linestyles="solid", transform=transform, zorder=zorder, clip_on=False,
        antialiaseds=True, alpha=alpha, capstyle="butt",
    )  # fmt: skip
    ax.add_artist(made)


def settle(figure: Picture, words: Sequence[str]) -> Picture:
    """Finish a figure: what it shows in words, and no trace of the user's settings in any artist."""
    figure.words = " ".join(word for word in words if word)
    for artist in [*figure.artists, *(child for ax in figure.axes for child in ax.get_children())]:
        artist.set_sketch_params(None)
        artist.set_path_effects([])
        if isinstance(artist, Line2D):
            artist.set_antialiased(True)
            artist.set_fillstyle("full")
            artist.set_solid_capstyle("butt")
            artist.set_dash_capstyle("butt")
        elif isinstance(artist, Patch | Collection):
            artist.set_antialiased(True)
    return figure


def describe(figure: Figure) -> str:
    """What a figure shows, in words, for those who cannot see it."""
    return getattr(figure, "words", "")


def to_png(figure: Figure, dpi: int = style.DPI) -> bytes:
    """The figure as an opaque PNG."""
    figure.set_dpi(dpi)
    canvas = FigureCanvasAgg(figure)
    canvas.draw()  # type: ignore[no-untyped-call]
    image = Image.fromarray(np.asarray(canvas.buffer_rgba())).convert("RGB")  # type: ignore[no-untyped-call]
    file = io.BytesIO()
    image.save(file, "PNG", compress_level=3, dpi=(dpi, dpi))
    return file.getvalue()


def img_html(figure: Figure, alt: str = "", width: int | None = None) -> str:
    """The figure as one <img> that needs no other file; alt: its own words by default; width: CSS pixels."""
    shown = width or round(figure.get_size_inches()[0] * 100)
    data = base64.b64encode(to_png(figure)).decode("ascii")
    return f'<img src="data:image/png;base64,{data}" alt="{esc(alt or describe(figure))}" width="{shown}">'
