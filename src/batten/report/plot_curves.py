"""The rows with the curves of fits: the line against the choice, and one fit by itself."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from matplotlib.axes import Axes

from batten.compare.grid import STRAIGHT
from batten.effects.numbers import show
from batten.engine.rows import Array
from batten.fit.estimate import Estimate
from batten.frame.problem import Problem
from batten.report import parts, style
from batten.report.canvas import Picture, inches, letters, pane, settle, sheet
from batten.report.curves import Curve, Ground, SpanEnds, beyond, curve_of, places_along, row_band, span_ends
from batten.report.days import counted_from
from batten.report.lettering import shortened, titled, width_of, wrapped
from batten.report.naming import brief, place_in, remedy_words, span_in
from batten.report.scales import scale

if TYPE_CHECKING:
    from batten.exam.examination import Examination
    from batten.exam.fit import Fit

__all__ = ["fit_figure", "line_against_choice"]

#: inches
HEIGHT, LEFT, RIGHT, BOTTOM, TOP = 4.3, 0.62, 1.78, 0.88, 0.4
#: room above the rows for the span, and below them for the rug, as shares of their range
ABOVE, BELOW = 0.17, 0.05
GROUND = "Tinted: the outer tenth of the rows. Darker: no rows, so the dotted curve is a guess."


def line_against_choice(exam: Examination) -> Picture:
    """The straight line against the chosen remedy, in units of y, with the span that was asked about."""
    problem, fit = exam.problem, exam.chosen
    is_line = fit.key == STRAIGHT
    other = exam.comparison.reference.estimate if is_line else exam[STRAIGHT].estimate
    asked = _Asked.of(fit)
    choice, span = asked.mean(fit.estimate), asked.ends(fit.estimate)
    second = None if other is None else asked.value(other, choice.x)
    figure, ax, at = _prepared(problem, [choice] + ([second] if second else []))
    parts.draw_band(ax, choice)
    ends = [parts.End(_name(fit), "the choice", _end(choice, at), style.CHOICE)]
    if second is not None:
        color = style.QUIET if is_line else style.LINE
        parts.draw_curve(ax, second, at, color=color, dashed=True, width=1.7, zorder=3.5)
        words, below = ("flexible curve", "for comparison") if is_line else ("straight line", "")
        ends.append(parts.End(words, below, _end(second, at), color))
    parts.draw_curve(ax, choice, at, color=style.CHOICE)
    _draw_span(ax, span, choice, problem)
    parts.ends_of_curves(ax, ends)
    notes = [parts.drawn_of(len(problem.rows.x)), _band_words("Band", choice, asked)]
    notes += [_averaged(problem, choice), GROUND]
    parts.caption(figure, notes, left=0.14)
    return settle(figure, [*_seen(problem), *_told(fit, span, second, is_line), *notes])


def fit_figure(fit: Fit, straight: Fit | None = None, *, choice: bool = False) -> Picture:
    """One fit with its mean, its median, the band of the mean and where a new row lies; the straight line if given.

    choice: whether it is the choice, which has its colour also where it is the straight line.
    """
    problem, est, asked = fit.problem, fit.estimate, _Asked.of(fit)
    mean, span = asked.mean(est), asked.ends(est)
    rows = row_band(est, mean.x, level=asked.level, errors=asked.errors, profile=asked.profile)
    median = asked.value(est, mean.x, of="median")
    apart = _apart(mean, median, problem.rows.y)
    is_line = fit.key == STRAIGHT
    amber = is_line and not choice
    color, tint, tint_word = (style.LINE, style.LINE_BAND, "Amber") if amber else (style.CHOICE, style.BAND, "Blue")
    figure, ax, at = _prepared(problem, [mean], room=[rows])
    parts.draw_band(ax, rows, color=style.FAINT, alpha=0.8, zorder=0.8, edge=style.RULE)
    parts.draw_band(ax, mean, color=tint)
    ends = [parts.End(_name(fit), "mean", _end(mean, at), color)]
    if apart:
        parts.draw_curve(ax, median, at, color=style.INK, dashed=True, width=1.2, zorder=3.8)
        ends.append(parts.End("median", "the typical row", _end(median, at), style.INK))
    if straight is not None and not is_line:
        line = asked.value(straight.estimate, mean.x)
        parts.draw_curve(ax, line, at, color=style.LINE, dashed=True, width=1.5, zorder=3.5)
        ends.append(parts.End("straight line", "", _end(line, at), style.LINE))
    parts.draw_curve(ax, mean, at, color=color)
    _draw_span(ax, span, mean, problem, color=color)
    parts.ends_of_curves(ax, ends)
    notes = [
        parts.drawn_of(len(problem.rows.x)),
        _band_words(f"{tint_word} band", mean, asked),
        f"Grey band: where {asked.level:.0%} of new rows are expected.",
        "" if apart else "Mean and median lie too close to draw both.",
        _averaged(problem, mean), GROUND,
    ]  # fmt: skip
    parts.caption(figure, notes, left=0.14)
    return settle(figure, [*_seen(problem), *_told(fit, span, None, False), *notes])


@dataclass(frozen=True, eq=False)
class _Asked:
    """What every curve of one figure has in common."""

    span: tuple[float, float]
    level: float
    errors: str
    profile: tuple[Array, Array] | None

    @staticmethod
    def of(fit: Fit) -> _Asked:
        question = fit.question
        return _Asked(question.span, question.level, question.errors, fit.problem.profile)

    def mean(self, est: Estimate) -> Curve:
        """The mean with its band."""
        return curve_of(est, places_along(est), level=self.level, errors=self.errors, profile=self.profile)

    def value(self, est: Estimate, xs: Array, of: str = "mean") -> Curve:
        """A curve without a band."""
        return curve_of(est, xs, of=of, band=False, profile=self.profile)

    def ends(self, est: Estimate) -> SpanEnds:
        """The mean at both ends of the span."""
        return span_ends(est, self.span, level=self.level, errors=self.errors, profile=self.profile)


def _prepared(problem: Problem, curves: list[Curve], room: list[Curve] | None = None) -> tuple[Picture, Axes, Ground]:
    """Sheet, axes with limits and ticks, ground, rug and rows."""
    rows = problem.rows
    at = beyond(rows.x)
    low, high = _limits(rows.y, curves, room or [], at)
    figure = sheet(style.WIDTH, HEIGHT)
    ax = pane(figure, LEFT, BOTTOM, RIGHT, TOP)
    ax.set_xlim(at.left, at.right)
    ax.set_ylim(low, high)
    start = counted_from(problem)
    x_word, y_word = scale(ax, "x", start=start), scale(ax, "y", grid=True)
    y, x = problem.response, problem.focus
    parts.heading(ax, (y, _unit(problem, y, y_word)), (x, "" if start else _unit(problem, x, x_word)))
    parts.ground(ax, at)
    some = parts.shown_rows(rows.x)
    parts.scatter(ax, rows.x[some], rows.y[some])
    parts.rug(ax, rows.x[some])
    return figure, ax, at


def _band_words(name: str, curve: Curve, asked: _Asked) -> str:
    if np.isfinite(curve.low).any():
        return f"{name}: {asked.level:.0%} for the mean."
    return f"No band: {curve.how}." if curve.how else "No band."


def _name(fit: Fit) -> str:
    """The remedy in the words that stand at its curve."""
    return wrapped(brief(fit.problem, fit.key, 22), RIGHT - 0.2, 4, bold=True)


def _unit(problem: Problem, column: str, scale: str) -> str:
    return ", ".join(word for word in (problem.unit(column), scale) if word)


def _limits(y: Array, curves: list[Curve], room: list[Curve], at: Ground) -> tuple[float, float]:
    """Every row and every curve inside the data, with room for the span above and the rug below.

    A curve may pull the axis by half of the rows' range at most, so that a curve that runs away stays readable.
    """
    low, high = float(y.min()), float(y.max())
    reach = 0.5 * ((high - low) or abs(high) or 1.0)
    for curve in curves + room:
        inside = (curve.x >= at.low) & (curve.x <= at.high)
        for values in (curve.value, curve.low, curve.high):
            seen = values[inside & np.isfinite(values)]
            if len(seen):
                low = min(low, max(float(seen.min()), float(y.min()) - reach))
                high = max(high, min(float(seen.max()), float(y.max()) + reach))
    size = (high - low) or abs(high) or 1.0
    return low - BELOW * size, high + ABOVE * size


def _end(curve: Curve, at: Ground) -> float:
    """The curve at the right end of the sheet, or of the data where it has nothing beyond them."""
    beyond_data = parts.value_at(curve, at.right)
    return beyond_data if np.isfinite(beyond_data) else parts.value_at(curve, at.high)


def _draw_span(ax: Axes, span: SpanEnds, curve: Curve, problem: Problem, *, color: str = style.CHOICE) -> None:
    """The two x values of the question: a bracket with the difference, and the curve's places."""
    low, high = ax.get_ylim()
    level = high - 0.085 * (high - low)
    inside = [end for end in (span.a, span.b) if ax.get_xlim()[0] <= end <= ax.get_xlim()[1]]
    for end in inside:
        on_curve = parts.value_at(curve, end)
        foot = on_curve if np.isfinite(on_curve) else low
        ax.plot([end, end], [min(foot, level), level], color=style.INK, linewidth=0.7, linestyle=(0, (1, 2)), zorder=3,
                marker="None", alpha=1.0)  # fmt: skip
        if np.isfinite(on_curve):
            ax.plot([end], [on_curve], linestyle="none", marker="o", markersize=5.5, markerfacecolor=style.PAPER,
                    markeredgecolor=color, markeredgewidth=1.6, zorder=5, alpha=1.0)  # fmt: skip
    ax.plot([span.a, span.b], [level, level], color=style.INK, linewidth=1.1, zorder=3, marker="|", markersize=5,
            markeredgewidth=1.1, markeredgecolor=style.INK, linestyle="solid", alpha=1.0)  # fmt: skip
    words, ends = _span_words(span, problem), ax.get_xlim()
    middle = (span.a + span.b) / 2
    # the words are centred on the span unless that would carry them over an edge
    half = 0.5 * (width_of(words, size=style.SMALL) + 0.1) / inches(ax)[0] * (ends[1] - ends[0])
    middle = min(max(middle, ends[0] + half), max(ends[1] - half, ends[0] + half))
    letters(ax, middle, level + 0.018 * (high - low), words, ha="center", size=style.SMALL, zorder=6)


def _span_words(span: SpanEnds, problem: Problem) -> str:
    unit_y, ends = shortened(problem.unit(problem.response), 14), span_in(problem, span.a, span.b, 14)
    if not span.difference.defined:
        return ends
    d, width = span.difference, span.difference.high - span.difference.low
    sign = "+" if d.estimate > 0 else ""
    return f"{ends}: {sign}{show(d.estimate, unit_y, width=width)} (mean)"


def _averaged(problem: Problem, curve: Curve) -> str:
    if problem.profile is not None:
        return "Covariates held at the asked values."
    if not problem.covariates:
        return ""
    over = f"{curve.averaged:,} of the rows" if curve.averaged else "the rows"
    return f"Averaged over the covariates of {over}."


def _apart(mean: Curve, median: Curve, y: Array) -> bool:
    """Whether mean and median can be told apart: four line widths between them somewhere."""
    gap = np.abs(mean.value - median.value)
    return bool(np.isfinite(gap).any() and np.nanmax(gap) > 0.025 * np.ptp(y))


def _seen(problem: Problem) -> list[str]:
    y, x = (titled(name, problem.unit(name), limit=200) for name in (problem.response, problem.focus))
    return [f"{y} against {x}: {len(problem.rows.y):,} rows as points."]


def _told(fit: Fit, span: SpanEnds, second: Curve | None, is_line: bool) -> list[str]:
    """The curves in numbers: at both ends of the span."""
    problem = fit.problem
    unit, words = problem.unit(problem.response), remedy_words(problem, fit.key)
    if not span.at_a.defined:
        return [f"Curve: {words}."]
    width = max(e.high - e.low for e in (span.at_a, span.at_b))
    a, b = (show(e.estimate, unit, width=width) for e in (span.at_a, span.at_b))
    where = [place_in(problem, x, problem.unit(problem.focus)) for x in (span.a, span.b)]
    out = [f"Mean by {words}: {a} at {where[0]}, {b} at {where[1]}."]
    if second is not None:
        ends = [show(parts.value_at(second, x), unit, width=width) for x in (span.a, span.b)]
        name = "flexible curve" if is_line else "straight line"
        out.append(f"The {name}, dashed: {ends[0]} and {ends[1]}.")
    return out
