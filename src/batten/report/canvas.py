"""Sheets to draw on: figures of fixed size that owe nothing to pyplot or to the user's matplotlib settings.

Every property that matplotlib would take from its global settings is set here or in `settle`, so that a figure is the
same in every notebook, and in every thread: the settings are neither read on purpose nor touched.
"""

from __future__ import annotations

import base64
import io
import math
from collections.abc import Sequence

import numpy as np
from matplotlib.axes import Axes
from matplotlib.axis import Axis
from matplotlib.backends.backend_agg import FigureCanvasAgg
from matplotlib.collections import Collection
from matplotlib.figure import Figure
from matplotlib.lines import Line2D
from matplotlib.patches import Patch
from matplotlib.text import Text
from matplotlib.ticker import FixedFormatter, FixedLocator, NullLocator
from PIL import Image

from batten.engine.rows import Array
from batten.report import style
from batten.report.lettering import drawn, families
from batten.report.markup import esc

__all__ = ["Picture", "describe", "img_html", "letters", "pane", "scale_ticks", "settle", "sheet", "to_png"]


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
    """Axes with margins in inches: a rule below and at the left, nothing else."""
    width, height = figure.get_size_inches()
    rect = (left / width, bottom / height, 1 - (left + right) / width, 1 - (bottom + top) / height)
    ax = figure.add_axes(rect, facecolor=style.PAPER, frameon=True, axisbelow=True)
    ax.grid(visible=False, which="both")
    ax.margins(0)
    for side, spine in ax.spines.items():
        spine.set(visible=side in ("left", "bottom"), color=style.RULE, linewidth=0.8, zorder=2.5)
    for axis in ("x", "y"):
        ax.tick_params(
            axis=axis, which="major", length=3, width=0.8, color=style.RULE, labelsize=style.SMALL,
            labelcolor=style.QUIET, pad=3, direction="out", bottom=True, left=True, top=False, right=False,
            labelbottom=True, labelleft=True, labeltop=False, labelright=False, labelrotation=0,
        )  # fmt: skip
    for line in (ax.xaxis, ax.yaxis):
        line.set_minor_locator(NullLocator())
    return ax


def letters(
    ax: Axes | Figure, x: float, y: float, words: str, *, color: str = style.INK, size: float = style.TEXT,
    ha: str = "left", va: str = "baseline", bold: bool = False, **more: object,
) -> Text:  # fmt: skip
    """Text that is never read as mathematics; `more` goes to Axes.text (transform, zorder, rotation)."""
    return ax.text(
        x, y, drawn(words), color=color, fontsize=size, ha=ha, va=va, weight="bold" if bold else "normal",
        parse_math=False, usetex=False, fontfamily=list(families()), linespacing=1.15, clip_on=False, **more,  # type: ignore[arg-type]
    )  # fmt: skip


def scale_ticks(axis: Axis, low: float, high: float, *, most: int = 6) -> str:
    """Ticks of an axis from low to high at round numbers; returns a word for its scale ("millions"), mostly "".

    Set after the limits. The ticks are fixed, since the axis's own formatter follows the user's settings.
    """
    places = round_places(low, high, most=most)
    power, word = _large(float(np.abs(places).max()) if len(places) else 0.0)
    axis.set_major_locator(FixedLocator(places))  # type: ignore[arg-type]
    axis.set_major_formatter(FixedFormatter(_labels(places / power)))
    return word


def round_places(low: float, high: float, *, most: int) -> Array:
    """At most `most` + 1 multiples of 1, 2, 2.5 or 5 times a power of ten inside low to high."""
    at_least = (high - low) / most
    unit = float(10.0 ** math.floor(math.log10(at_least)))
    step = unit * next(m for m in (1, 2, 2.5, 5, 10) if m * unit >= at_least * (1 - 1e-9))
    first, last = math.ceil(low / step - 1e-9), math.floor(high / step + 1e-9)
    return np.arange(first, last + 1, dtype=np.float64) * step


_WORDS = (
    (1e12, "trillions"), (1e9, "billions"), (1e6, "millions"), (1e-4, ""), (1e-6, "millionths"), (1e-9, "billionths"),
)  # fmt: skip


def _large(size: float) -> tuple[float, str]:
    """The power of ten that tick labels are divided by, and its word."""
    for power, word in _WORDS:
        if size >= power:
            return (power, word) if word else (1.0, "")
    return 1.0, ""


def _labels(places: Array) -> list[str]:
    """Labels with as many decimals as the step needs."""
    if len(places) < 2:
        return [f"{p:.6g}" for p in places]
    step = float(places[1] - places[0])
    if not 1e-7 < step < 1e12:
        return [f"{p:.6g}" for p in places]
    decimals = next((d for d in range(8) if math.isclose(round(step, d), step, rel_tol=1e-6)), 8)
    return [f"{p + 0.0:,.{decimals}f}".replace("-", "−") for p in places]


def settle(figure: Picture, words: Sequence[str]) -> Picture:
    """Finish a figure: what it shows in words, and no trace of the user's settings in any artist."""
    figure.words = " ".join(word for word in words if word)
    for artist in figure.findobj():
        artist.set_sketch_params(None)
        artist.set_path_effects([])
        if isinstance(artist, Text):
            artist.set(usetex=False, parse_math=False, fontfamily=list(families()), antialiased=True)
        elif isinstance(artist, Line2D):
            artist.set(antialiased=True, fillstyle="full", solid_capstyle="butt", dash_capstyle="butt")
        elif isinstance(artist, Patch | Collection):
            artist.set_antialiased(True)
    for ax in figure.axes:
        for axis, ha, va in ((ax.xaxis, "center", "top"), (ax.yaxis, "right", "center_baseline")):
            for label in axis.get_ticklabels():
                label.set(fontweight="normal", ha=ha, va=va)
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
    image.save(file, "PNG", compress_level=6, dpi=(dpi, dpi))
    return file.getvalue()


def img_html(figure: Figure, alt: str = "", width: int | None = None) -> str:
    """The figure as one <img> that needs no other file; alt: its own words by default; width: CSS pixels."""
    shown = width or round(figure.get_size_inches()[0] * 100)
    data = base64.b64encode(to_png(figure)).decode("ascii")
    return f'<img src="data:image/png;base64,{data}" alt="{esc(alt or describe(figure))}" width="{shown}">'
