"""Parts that figures share: rows as points, ground, rug, curves, the span, words at the ends of curves."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from matplotlib.axes import Axes
from matplotlib.figure import Figure

from batten.engine.rows import Array, Ints
from batten.report import style
from batten.report.canvas import inches, letters, strokes
from batten.report.curves import Curve, Ground
from batten.report.lettering import fitted, titled, wrapped

__all__ = [
    "End", "caption", "draw_band", "draw_curve", "drawn_of", "ends_of_curves", "ground", "heading", "inches", "rug",
    "scatter", "shown_rows", "value_at",
]  # fmt: skip

#: rows drawn as points
POINTS = 2_000


def shown_rows(x: Array) -> Ints:
    """Rows drawn: all, or an even choice along x that is the same every time."""
    order = np.argsort(x, kind="stable")
    if len(x) <= POINTS:
        return order
    return order[np.linspace(0, len(x) - 1, POINTS).round().astype(np.intp)]


def drawn_of(count: int) -> str:
    """Words for how many rows are drawn, where that is not all of them."""
    return "" if count <= POINTS else f"{POINTS:,} of {count:,} rows drawn, evenly along the axis."


def scatter(ax: Axes, x: Array, y: Array) -> None:
    """Rows as points, fainter and smaller the more there are."""
    n = len(x)
    size, alpha = (4.2, 0.8) if n <= 120 else (3.1, 0.6) if n <= 600 else (2.2, 0.36)
    ax.plot(
        x, y, linestyle="none", marker="o", markersize=size, markerfacecolor=style.DATA, markeredgewidth=0, alpha=alpha,
        zorder=2, antialiased=True, fillstyle="full",
    )  # fmt: skip


def rug(ax: Axes, x: Array) -> None:
    """Where the rows are, as short strokes on the axis."""
    strokes(
        ax, np.stack([np.column_stack([x, np.zeros(len(x))]), np.column_stack([x, np.full(len(x), 0.022)])], axis=1),
        ax.get_xaxis_transform(), color=style.QUIET, width=0.5, zorder=2.2, alpha=0.7 if len(x) <= 300 else 0.22,
    )  # fmt: skip


def ground(ax: Axes, at: Ground) -> None:
    """White in the central 90% of the data, tinted towards their ends, darker where there are no rows."""
    for low, high, color in (
        (at.left, at.low, style.BEYOND), (at.low, at.middle_low, style.OUTER),
        (at.middle_high, at.high, style.OUTER), (at.high, at.right, style.BEYOND),
    ):  # fmt: skip
        if high > low:
            ax.axvspan(low, high, facecolor=color, edgecolor="none", linewidth=0, zorder=0, alpha=None)


def draw_curve(
    ax: Axes, curve: Curve, at: Ground, *, color: str, dashed: bool = False, width: float = 2.0, zorder: float = 4
) -> None:
    """A curve: as it is inside the data, dotted beyond them."""
    x, y = _broken(curve.x, curve.value)
    inside = np.isnan(x) | ((x >= at.low) & (x <= at.high))
    for which, dash, thick in (
        (inside, (0, (5, 2.2)) if dashed else "solid", width),
        ((x <= at.low) | np.isnan(x), (0, (1, 1.6)), width * 0.75),
        ((x >= at.high) | np.isnan(x), (0, (1, 1.6)), width * 0.75),
    ):
        ax.plot(
            x[which], y[which], color=color, linewidth=thick, linestyle=dash, zorder=zorder, marker="None", alpha=1.0,
            solid_capstyle="butt", dash_capstyle="butt", solid_joinstyle="round", dash_joinstyle="round",
        )  # fmt: skip


def draw_band(
    ax: Axes, curve: Curve, *, color: str = style.BAND, alpha: float = 0.55, zorder: float = 1.5, edge: str = ""
) -> None:
    """The band between a curve's low and high, with edges in a colour of their own if one is given."""
    x, low = _broken(curve.x, curve.low)
    _, high = _broken(curve.x, curve.high)
    ax.fill_between(x, low, high, facecolor=color, edgecolor="none", linewidth=0, alpha=alpha, zorder=zorder)
    for end in (low, high) if edge else ():
        ax.plot(x, end, color=edge, linewidth=0.8, linestyle="solid", marker="None", alpha=1.0, zorder=zorder)


def _broken(x: Array, y: Array) -> tuple[Array, Array]:
    """The same with a gap where a step lies between two places that are next to each other."""
    jumps = np.flatnonzero(np.diff(x) <= 1e-9 * np.ptp(x)) + 1
    return np.insert(x, jumps, np.nan), np.insert(y, jumps, np.nan)


def value_at(curve: Curve, x: float) -> float:
    """The curve at a place between two of its places, NaN where it has none."""
    known = np.isfinite(curve.value)
    return float(np.interp(x, curve.x[known], curve.value[known], left=np.nan, right=np.nan)) if known.any() else np.nan


def heading(ax: Axes, y: tuple[str, str], x: tuple[str, str]) -> None:
    """Axis titles (name, unit): the response level above its axis, the predictor below at the right."""
    width, height = inches(ax)
    above = fitted(lambda limit: titled(*y, limit=limit), style.WIDTH - 1, size=style.TITLE, bold=True)
    below = fitted(lambda limit: titled(*x, limit=limit), width + 0.3, bold=True)
    letters(ax, 0, 1 + 0.15 / height, above, transform=ax.transAxes, size=style.TITLE, bold=True)
    letters(ax, 1, -0.33 / height, below, transform=ax.transAxes, ha="right", va="center", bold=True)


def caption(figure: Figure, sentences: Sequence[str], *, left: float) -> None:
    """Small words along the bottom of a figure; left: inches."""
    w, h = figure.get_size_inches()
    words = wrapped(" ".join(s for s in sentences if s), w - 2 * left, 4, size=style.SMALL)
    letters(figure, left / w, 0.1 / h, words, color=style.QUIET, size=style.SMALL, va="bottom")


@dataclass(frozen=True)
class End:
    """Words at the right end of a curve: a name in the curve's colour, and quiet words below."""

    words: str
    below: str
    y: float
    color: str


def ends_of_curves(ax: Axes, ends: Sequence[End]) -> None:
    """Names beside the curves' right ends, moved apart where they would touch."""
    width, height = inches(ax)
    low, high = ax.get_ylim()
    line = style.TEXT * 1.22 / 72 / height
    wanted = []
    for end in sorted((e for e in ends if np.isfinite(e.y)), key=lambda e: e.y):
        tall = line * (1.3 + end.words.count("\n") + (1 + end.below.count("\n") if end.below else 0))
        wanted.append((end, float(np.clip((end.y - low) / (high - low), 0.0, 1.0)), tall))
    for (end, at, tall), middle in zip(wanted, _apart([(at, tall) for _, at, tall in wanted]), strict=True):
        x = 1 + 0.14 / width
        if abs(middle - at) > 0.3 * line:
            ax.plot(
                [1 + 0.02 / width, x - 0.03 / width], [at, middle], transform=ax.transAxes, color=end.color,
                linewidth=0.7, clip_on=False, linestyle="solid", marker="None", alpha=1.0,
            )  # fmt: skip
        top = middle + tall / 2
        letters(ax, x, top, end.words, transform=ax.transAxes, color=end.color, va="top", bold=True)
        if end.below:
            under = top - line * (1 + end.words.count("\n"))
            letters(ax, x, under, end.below, transform=ax.transAxes, color=style.QUIET, va="top", size=style.SMALL)


def _apart(wanted: Sequence[tuple[float, float]]) -> list[float]:
    """Middles of blocks (wanted middle, height), lowest first, pushed apart and kept inside 0 to 1."""
    out: list[float] = []
    floor = 0.0
    for at, tall in wanted:
        middle = max(at, floor + tall / 2)
        out.append(middle)
        floor = middle + tall / 2
    ceiling = 1.0
    for i in range(len(out) - 1, -1, -1):
        out[i] = min(out[i], ceiling - wanted[i][1] / 2)
        ceiling = out[i] - wanted[i][1] / 2
    return out
