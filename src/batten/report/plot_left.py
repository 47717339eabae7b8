"""What is left: residuals of a fit along the predictor, beside those of the straight line."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np
from matplotlib.axes import Axes

from batten.compare.grid import STRAIGHT
from batten.effects.numbers import show
from batten.engine.rows import Array
from batten.fit.estimate import Estimate
from batten.report import parts, style
from batten.report.canvas import Picture, inches, letters, pane, settle, sheet
from batten.report.curves import beyond
from batten.report.days import counted_from
from batten.report.lettering import fitted, plain, shortened, titled
from batten.report.naming import remedy_in, remedy_words
from batten.report.scales import scale

if TYPE_CHECKING:
    from batten.exam.fit import Fit

__all__ = ["left_figure", "running_median"]

HEIGHT, BOTTOM, TOP, LEFT, GAP = 3.5, 0.86, 0.64, 0.62, 0.72


def left_figure(fit: Fit, straight: Fit | None = None, *, choice: bool = False) -> Picture:
    """Residuals of the fit on its own scale, at the right of the straight line's where that is given.

    choice: whether it is the choice, which has its colour also where it is the straight line.
    """
    problem = fit.problem
    both = straight is not None and straight.key != fit.key
    figure = sheet(style.WIDTH, HEIGHT)
    told = [f"Residuals along {titled(problem.focus, problem.unit(problem.focus), limit=200)}, {fit.rows:,} rows."]
    if both:
        assert straight is not None
        wide = (style.WIDTH - LEFT - GAP - 0.14) / 2
        first = pane(figure, LEFT, BOTTOM, style.WIDTH - LEFT - wide, TOP)
        told.append(_residuals(first, straight, style.LINE))
        second = pane(figure, LEFT + wide + GAP, BOTTOM, 0.14, TOP)
    else:
        second = pane(figure, LEFT, BOTTOM, 0.14, TOP)
    told.append(_residuals(second, fit, style.LINE if fit.key == STRAIGHT and not choice else style.CHOICE))
    notes = [
        parts.drawn_of(len(problem.rows.x)),
        "Curve: running median of neighbouring rows. Near zero all along: no bend is left. "
        "Even height of the cloud: even spread.",
    ]
    parts.caption(figure, notes, left=0.14)
    return settle(figure, [*told, *notes])


def _residuals(ax: Axes, fit: Fit, color: str) -> str:
    """One pane; returns its content in words."""
    problem, est = fit.problem, fit.estimate
    x, left, unit = problem.rows.x, _left(est), problem.unit(problem.response) if _plain_scale(est) else ""
    at = beyond(x)
    ax.set_xlim(at.left, at.right)
    size = float(np.abs(left).max()) * 1.08 or 1.0
    low, high = min(float(left.min()) * 1.08, -0.3 * size), max(float(left.max()) * 1.08, 0.3 * size)
    ax.set_ylim(low - 0.06 * (high - low), high)
    scale(ax, "x", most=5, start=counted_from(problem))
    scale(ax, "y", grid=True)
    parts.ground(ax, at)
    some = parts.shown_rows(x)
    parts.scatter(ax, x[some], left[some])
    parts.rug(ax, x[some])
    ax.axhline(0, color=style.INK, linewidth=0.8, linestyle="solid", zorder=3, marker="None", alpha=1.0)
    places, middle = running_median(x, left)
    ax.plot(places, middle, color=color, linewidth=2.0, linestyle="solid", zorder=4, marker="None", alpha=1.0,
            solid_joinstyle="round", antialiased=True)  # fmt: skip
    _titles(ax, fit, unit, color)
    ends = [show(float(v), unit, width=float(high - low)) for v in (middle.min(), middle.max())]
    words = f"{remedy_words(problem, fit.key)}: {_named(est, plain(problem.response))}"
    return f"{words}; their running median lies between {ends[0]} and {ends[1]}."


def _titles(ax: Axes, fit: Fit, unit: str, color: str) -> None:
    problem, (wide, tall) = fit.problem, inches(ax)
    name = remedy_in(problem, fit.key, wide, bold=True)
    letters(ax, 0, 1 + 0.34 / tall, name, transform=ax.transAxes, color=color, bold=True)

    def residual(limit: int) -> str:
        return titled(_named(fit.estimate, shortened(problem.response, limit)), unit, limit=200)

    letters(ax, 0, 1 + 0.14 / tall, fitted(residual, wide, size=style.SMALL), transform=ax.transAxes, size=style.SMALL)
    x_unit = "" if counted_from(problem) else problem.unit(problem.focus)
    below = fitted(lambda limit: titled(problem.focus, x_unit, limit=limit), wide, bold=True)
    letters(ax, 1, -0.33 / tall, below, transform=ax.transAxes, ha="right", va="center", bold=True)


def _left(est: Estimate) -> Array:
    """Residuals on the fitting scale; of a mean model, over their expected spread."""
    if est.link is None:
        return est.residual
    return np.asarray(est.residual / (est.sigma * np.sqrt(est.link.variance(est.mu))))


def _named(est: Estimate, response: str) -> str:
    """What the residuals are."""
    if est.link is not None:
        return f"{response}: observed less fitted, in expected spreads"
    return f"{est.scale.words(response)}: observed less fitted"


def _plain_scale(est: Estimate) -> bool:
    return est.link is None and est.scale.key == "y"


def running_median(x: Array, values: Array) -> tuple[Array, Array]:
    """Medians of x and values (m,) over windows of neighbours along x, each overlapping the next by half."""
    order = np.argsort(x, kind="stable")
    n = len(order)
    # wide enough to be calm, narrow enough to reach the ends
    width = min(n, max(7, int(n**0.65)))
    starts = np.unique(np.append(np.arange(0, n - width + 1, max(1, width // 2)), n - width))
    groups = [order[s : s + width] for s in starts]
    return np.array([np.median(x[g]) for g in groups]), np.array([np.median(values[g]) for g in groups])
