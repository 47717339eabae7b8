"""The standing question under every remedy, as one figure of intervals."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING, Any

import numpy as np
from matplotlib.axes import Axes

from batten.compare.grid import STRAIGHT
from batten.effects.numbers import show
from batten.frame.problem import Problem
from batten.report import parts, style
from batten.report.canvas import Picture, inches, letters, pane, settle, sheet, strokes
from batten.report.entries import Entry, entries
from batten.report.lettering import fitted, plain, shortened, titled
from batten.report.naming import remedy_in, span_in
from batten.report.scales import scale

if TYPE_CHECKING:
    from batten.exam.examination import Examination

__all__ = ["spans_figure"]

#: inches
STEP, LEFT, RIGHT, TOP, BOTTOM = 0.185, 3.35, 0.2, 0.62, 0.92


def spans_figure(exam: Examination) -> Picture:
    """The difference over the span by remedy, lowest held-out error first, with its interval."""
    rows, problem = entries(exam), exam.problem
    span = span_in(problem, *exam.question.span)
    figure = sheet(style.WIDTH, TOP + BOTTOM + STEP * len(rows))
    ax = pane(figure, LEFT, BOTTOM, RIGHT, TOP)
    low, high = _window(rows, exam.choice.key)
    ax.set_xlim(low, high)
    ax.set_ylim(len(rows) - 0.4, -0.6)
    word = scale(ax, "x", grid=True)
    _guides(ax, rows[exam.choice.key])
    shown = list(rows.values())
    _names(ax, shown, exam.choice.key, problem)
    _marks(ax, shown, exam.choice.key)
    unit = ", ".join(w for w in (problem.unit(problem.response), word) if w)
    _heading(figure, exam, span, unit)
    notes = [
        f"Points and {exam.question.level:.0%} intervals. Filled: cannot be told from the lowest held-out error. "
        "Open: behind it. Arrows: the interval goes on beyond the figure.",
        "Intervals are as if each remedy had been fixed in advance.",
        f"Not shown: {len(exam.refused)} that cannot be used on these rows." if len(exam.refused) else "",
    ]
    parts.caption(figure, notes, left=0.14)
    return settle(figure, [_told(rows, exam, span), *notes])


def _heading(figure: Picture, exam: Examination, span: str, unit: str) -> None:
    problem = exam.problem
    right, height = 1 - RIGHT / style.WIDTH, figure.get_size_inches()[1]

    def words(limit: int) -> str:
        names = f"{shortened(problem.response, limit)}, {shortened(problem.focus, limit)}"
        return titled(f"difference in {names} {shortened(span, 30)}", f"{unit}, mean" if unit else "mean", limit=300)

    title = fitted(words, style.WIDTH - 2 * RIGHT, bold=True)
    letters(figure, right, 1 - (TOP - 0.28) / height, title, ha="right", bold=True)
    below = "lowest held-out error at the top"
    letters(figure, right, 1 - (TOP - 0.1) / height, below, ha="right", color=style.QUIET, size=style.SMALL)


def _window(rows: dict[str, Entry], choice: str) -> tuple[float, float]:
    """The range of the tied remedies', the choice's and the line's intervals, and room around it for the others."""
    main = [e for e in rows.values() if e.tied or e.key in (choice, STRAIGHT)]
    values = np.array([v for e in main for v in (e.difference, e.low, e.high) if np.isfinite(v)])
    if not len(values):
        return -1.0, 1.0
    low, high = float(values.min()), float(values.max())
    room = 0.35 * ((high - low) or abs(high) or 1.0)
    points = [e.difference for e in rows.values() if e.defined]
    left, right = (min(*points, low), max(*points, high)) if len(points) > 1 else (low, high)
    return max(low - 2 * room, left - 0.2 * room), min(high + 2 * room, right + 0.2 * room)


def _guides(ax: Axes, chosen: Entry) -> None:
    """Zero, and the choice's estimate all the way down."""
    low, high = ax.get_xlim()
    if low < 0 < high:
        ax.axvline(0, color=style.RULE, linewidth=0.9, linestyle="solid", zorder=1, marker="None", alpha=1.0)
    if chosen.defined:
        ax.axvline(chosen.difference, color=style.CHOICE, linewidth=0.8, linestyle=(0, (1, 2)), zorder=1, alpha=1.0,
                   marker="None")  # fmt: skip


def _color(key: str, choice: str) -> str:
    return style.CHOICE if key == choice else style.LINE if key == STRAIGHT else style.QUIET


def _names(ax: Axes, shown: Sequence[Entry], choice: str, problem: Problem) -> None:
    """The remedies in words at the left."""
    x, across = -0.1 / inches(ax)[0], ax.get_yaxis_transform()
    for place, entry in enumerate(shown):
        color = _color(entry.key, choice)
        main = color != style.QUIET
        words = remedy_in(
            problem, entry.key, LEFT - 0.2, size=style.SMALL, bold=main, role="choice: " * (entry.key == choice)
        )
        letters(ax, x, place, words, ha="right", va="center", transform=across, color=color if main else style.INK,
                size=style.SMALL, bold=main)  # fmt: skip


def _marks(ax: Axes, shown: Sequence[Entry], choice: str) -> None:
    """Interval and point of each remedy, or the words for why it has none."""
    left, right = ax.get_xlim()
    alike: dict[tuple[str, bool], list[tuple[int, Entry]]] = {}
    for place, entry in enumerate(shown):
        if entry.defined:
            alike.setdefault((_color(entry.key, choice), entry.tied), []).append((place, entry))
        else:
            at = left + 0.01 * (right - left)
            letters(ax, at, place, shortened(entry.note, 60), va="center", color=style.QUIET, size=style.SMALL)
    for (color, tied), some in alike.items():
        main = color != style.QUIET
        ends = [(max(e.low, left), min(e.high, right), i) for i, e in some]
        bars = [[(low, i), (high, i)] for low, high, i in ends if low < high]
        strokes(ax, bars, ax.transData, color=color, width=2.2 if main else 1.2, zorder=3)
        seen = [(e.difference, i) for i, e in some if left <= e.difference <= right]
        _points(ax, seen, "o", 6 if main else 4.6, markeredgewidth=1.3, markeredgecolor=color,
                markerfacecolor=color if tied else style.PAPER)  # fmt: skip
        # the interval goes on beyond the figure
        for marker, x, over in (
            ("<", left, [i for i, e in some if not e.low >= left]),
            (">", right, [i for i, e in some if not e.high <= right]),
        ):
            _points(ax, [(x, i) for i in over], marker, 4.5, markeredgewidth=0, markerfacecolor=color, clip_on=False)


def _points(ax: Axes, places: Sequence[tuple[float, int]], marker: str, size: float, **look: Any) -> None:
    if places:
        x, y = zip(*places, strict=True)
        ax.plot(x, y, linestyle="none", marker=marker, markersize=size, zorder=4, alpha=1.0, **look)


def _told(rows: dict[str, Entry], exam: Examination, span: str) -> str:
    """The choice, the line, and how far the tied ones reach."""
    problem, chosen = exam.problem, rows[exam.choice.key]
    unit = problem.unit(problem.response)
    what = f"Difference in {plain(problem.response)} (mean), {plain(problem.focus)} {plain(span)}"
    told = [f"{what}, under {len(rows)} remedies.", f"The choice: {chosen.difference_words(unit)}."]
    if STRAIGHT in rows and chosen.key != STRAIGHT:
        told.append(f"The straight line: {rows[STRAIGHT].difference_words(unit)}.")
    tied = [e.difference for e in rows.values() if e.tied and e.defined]
    if len(tied) > 1:
        ends = show(min(tied), width=chosen.high - chosen.low), show(max(tied), unit, width=chosen.high - chosen.low)
        told.append(f"The {len(tied)} that cannot be told apart: {ends[0]} to {ends[1]}.")
    return " ".join(told)
