"""The map of the ladder: scales of the response by shapes of the predictor, coloured by held-out error."""

from __future__ import annotations

import math
from typing import TYPE_CHECKING

from matplotlib.axes import Axes
from matplotlib.patches import Rectangle

from batten.compare.choose import Gap
from batten.families import parse
from batten.report import numerals, parts, style
from batten.report.canvas import Picture, inches, letters, pane, settle, sheet
from batten.report.entries import lowest, standings
from batten.report.lettering import fitted, plain, shortened

if TYPE_CHECKING:
    from batten.exam.examination import Examination

__all__ = ["ladder_figure"]

#: from the top of the ladder to its foot
SCALES = ("y", "sqrt y", "log y", "1/y", "boxcox y", "yeojohnson y")
SHAPES = ("x^2", "x", "sqrt x", "log x", "1/x")
#: gaps as shares of the lowest error at which the next colour begins
STEPS = (0.01, 0.05, 0.15, 0.5, 1.5)
#: inches
ROW, LEFT, RIGHT, TOP, BOTTOM = 0.56, 2.05, 0.2, 0.74, 0.62


def ladder_figure(exam: Examination) -> Picture:
    """How far behind the lowest held-out error each cell of the ladder lies, in units of y."""
    rows, problem = standings(exam), exam.problem
    known = {*rows, *map(str, exam.refused.index)}
    scales = [s for s in SCALES if any(f"{s} ~ {r}" in known for r in SHAPES)]
    shapes = [r for r in SHAPES if any(f"{s} ~ {r}" in known for s in scales)]
    figure = sheet(style.WIDTH, TOP + BOTTOM + ROW * len(scales))
    ax = pane(figure, LEFT, BOTTOM, RIGHT, TOP)
    ax.set_xlim(0, len(shapes))
    ax.set_ylim(len(scales), 0)
    best = lowest(exam)
    for i, scale in enumerate(scales):
        for j, shape in enumerate(shapes):
            _cell(ax, j, i, _content(f"{scale} ~ {shape}", rows, best, known), f"{scale} ~ {shape}" == exam.choice.key)
    _margins(ax, scales, shapes, problem.response, problem.focus)
    unit = problem.unit(problem.response)
    behind = f"held-out error behind the lowest of {len(rows)} tried"
    heading = f"{behind}, {shortened(unit, 20)} (mean)" if unit else f"{behind} (mean)"
    letters(figure, 0.14 / style.WIDTH, 1 - 0.26 / figure.get_size_inches()[1], heading, size=style.TITLE, bold=True)
    notes = [
        "Darker: nearer to the lowest. Tied: cannot be told from it. Framed: the choice. "
        "Grey: cannot be used on these rows.",
        f"Lowest of all: {numerals.error(best, best, unit)} ({exam.choice.best}).",
    ]
    parts.caption(figure, notes, left=0.14)
    return settle(figure, [_told(rows, scales, shapes, best, unit), *notes])


def _margins(ax: Axes, scales: list[str], shapes: list[str], response: str, focus: str) -> None:
    """Names of the rows and columns."""
    above = -0.08 / inches(ax)[1] * len(scales)
    for i, scale in enumerate(scales):
        left = parse(f"{scale} ~ x").left
        words = fitted(lambda limit, left=left: left.words(shortened(response, limit)), LEFT - 0.35)  # type: ignore[misc]
        letters(ax, -0.12, i + 0.5, words, ha="right", va="center")
    for j, shape in enumerate(shapes):
        letters(ax, j + 0.5, above, parse(f"y ~ {shape}").shape.words("x").removesuffix(" only"), ha="center")
    corner = fitted(f"x: {plain(focus)}", LEFT - 0.35, size=style.SMALL)
    letters(ax, -0.12, above, corner, ha="right", color=style.QUIET, size=style.SMALL)


def _content(key: str, rows: dict[str, Gap], best: float, known: set[str]) -> tuple[str, str, str]:
    """Colour of a cell, its number, and the word below it."""
    if key not in rows:
        return (style.BEYOND, "cannot be used", "") if key in known else (style.PAPER, "not tried", "")
    entry = rows[key]
    share = entry.size / best if best > 0 else math.inf
    color = style.COOL[sum(share > step for step in STEPS)]
    below = "lowest" if entry.size == 0 else "tied" if entry.tied else ""
    return color, f"+{numerals.behind(entry.size, best)}" if entry.size > 0 else "0", below


def _cell(ax: Axes, j: int, i: int, content: tuple[str, str, str], chosen: bool) -> None:
    color, main, below = content
    box = (j + 0.03, i + 0.04), 0.94, 0.92
    ax.add_patch(Rectangle(*box, facecolor=color, edgecolor="none", linewidth=0, zorder=1))
    if chosen:
        ax.add_patch(Rectangle(*box, facecolor="none", edgecolor=style.INK, linewidth=2.2, zorder=3))
    number = color in style.COOL
    ink = style.PAPER if color in style.COOL[:2] else style.INK if number else style.QUIET
    letters(ax, j + 0.5, i + (0.42 if below else 0.5), main, ha="center", va="center", color=ink, zorder=4, bold=chosen,
            size=style.TEXT if number else style.SMALL)  # fmt: skip
    if below:
        letters(ax, j + 0.5, i + 0.74, below, ha="center", va="center", color=ink, zorder=4, size=style.SMALL)


def _told(rows: dict[str, Gap], scales: list[str], shapes: list[str], best: float, unit: str) -> str:
    cells = {key: rows[key] for s in scales for r in shapes if (key := f"{s} ~ {r}") in rows}
    if not cells:
        return "Map of the ladder: nothing in it can be used on these rows."
    first = min(cells, key=lambda key: cells[key].size)
    nearest = f"Nearest: {first}, {numerals.behind(cells[first].size, best, unit)} behind."
    return (
        f"Map of the ladder, {len(scales)} scales by {len(shapes)} shapes: held-out error behind the lowest (mean). "
        f"{nearest} Cells tied: {sum(gap.tied for gap in cells.values())}."
    )
