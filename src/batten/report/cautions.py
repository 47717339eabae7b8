"""What a reader of these data must not overlook: at most two cautions for a remedy, and the lines that always stand."""

from __future__ import annotations

from collections import Counter
from collections.abc import Iterator
from typing import TYPE_CHECKING

from batten.diagnose.dependence import neighbouring_residuals
from batten.effects.numbers import counted, place, show
from batten.fit.carried import carried, no_mean_interval
from batten.fit.estimate import Estimate
from batten.frame.problem import Problem
from batten.report.lettering import plain, shortened
from batten.report.numerals import percent

if TYPE_CHECKING:
    from batten.exam.examination import Examination

__all__ = ["CARE", "MOST", "SUBTITLE", "cautions", "choosing_note", "left_out_words"]

SUBTITLE = "A difference between rows, not proof of cause."
CARE = (
    "Where decisions can hurt someone (dosing, structural or process safety, clinical or legal use), "
    "local codes and a qualified statistician or engineer decide."
)
#: cautions shown for one remedy
MOST = 2
#: rows below which every interval leans on single rows, and rows that each constant needs
FEW, PER_CONSTANT = 30, 10
#: rows beyond an end of the span, fewer than which that end hangs on them
BEYOND_END = 5
#: leverage from which a row decides most of its own fitted value
OWNED = 0.5
#: share of rows left out that is worth a caution
LEFT_OUT = 0.05
#: correlation of neighbouring errors worth a caution, where chance explains it poorly
ALIKE, RARE = 0.2, 0.01


def cautions(exam: Examination, key: str | None = None) -> tuple[str, ...]:
    """At most two, the gravest first, about one remedy (the choice by default)."""
    name = key or exam.choice.key
    est = exam.comparison.estimates[name]
    every = (
        *_bend_left(exam, name), *_carried(exam.problem, est), *_outside(exam), *_owned(exam.problem, est),
        *_few(exam.problem, est), *_thin_ends(exam), *_neighbours(est), *_left_out(exam.problem),
    )  # fmt: skip
    return every[:MOST]


def choosing_note(exam: Examination) -> str:
    """How intervals are to be read while the search has not been repeated on resamples."""
    if exam.question.planned is not None:
        return "This remedy was planned in advance, so its interval pays nothing for choosing."
    tied = len(exam.choice.tied)
    alike = f" ({tied} of them tied)" if tied > 1 else ""
    return (
        f"The interval is as if this remedy had been fixed in advance: "
        f"choosing among {exam.choice.tried}{alike} is not yet counted."
    )


def _bend_left(exam: Examination, key: str) -> Iterator[str]:
    bend = exam.comparison.bends.get(key)
    if bend is None or bend.verdict != "matters":
        return
    p = exam.problem
    unit = p.unit(p.response)
    yield (
        f"This curve still misses a flexible one by up to {show(bend.largest, unit)}, near {plain(p.focus)} "
        f"{place(float(f'{bend.at:.3g}'), p.unit(p.focus))}; {show(bend.tolerance, unit)} would matter."
    )


def _carried(problem: Problem, est: Estimate) -> Iterator[str]:
    found = carried(est)
    if found is None or not no_mean_interval(est):
        return
    row, share = found
    yield (
        f"Row {shortened(problem.index[row], 30)} alone supplies {percent(share)} of the correction that brings "
        f"{est.scale.words(plain(problem.response))} back to a mean: no interval of the mean is given. Read the median."
    )


def _outside(exam: Examination) -> Iterator[str]:
    p, (low, high) = exam.problem, (float(exam.problem.rows.x.min()), float(exam.problem.rows.x.max()))
    unit = p.unit(p.focus)
    out = [place(end, unit) for end in exam.question.span if not low <= end <= high]
    if out:
        yield (
            f"{plain(p.focus)} of {' and '.join(out)} lies outside the rows ({place(low)} to {place(high, unit)}): "
            "there every curve is a guess, and its interval does not know it."
        )


def _owned(problem: Problem, est: Estimate) -> Iterator[str]:
    row = int(est.leverage.argmax())
    share = float(est.leverage[row])
    if share > OWNED:
        x = place(float(est.rows.x[row]), problem.unit(problem.focus))
        yield (
            f"Row {shortened(problem.index[row], 30)} ({plain(problem.focus)} {x}) decides {percent(share)} of its own "
            "fitted value: near it the curve says little beyond that row."
        )


def _few(problem: Problem, est: Estimate) -> Iterator[str]:
    n, k = problem.rows.count, est.parameters
    if n < FEW:
        yield f"Only {n} rows: single rows can turn the answer, and no test here could see a moderate bend."
    elif n < PER_CONSTANT * k:
        few = f"{n} rows for {counted(k)} constants, under {PER_CONSTANT} for each"
        yield f"{few}: expect the curve to move with new rows."


def _thin_ends(exam: Examination) -> Iterator[str]:
    p, (a, b) = exam.problem, exam.question.span
    ends = (int((p.rows.x <= a).sum()), "below", a), (int((p.rows.x >= b).sum()), "above", b)
    few = [f"{n} at or {side} {place(end, p.unit(p.focus))}" for n, side, end in ends if 0 < n < BEYOND_END]
    if few:
        yield f"Few rows reach the ends of the span: {' and '.join(few)}. The difference hangs on them."


def _neighbours(est: Estimate) -> Iterator[str]:
    if est.link is not None:
        return
    found = neighbouring_residuals(est.factored.q, est.z)
    if found is not None and found.correlation > ALIKE and found.p < RARE:
        yield (
            f"Rows stored beside each other err alike (correlation {show(found.correlation)}): if their order is time "
            "or place, the intervals are too narrow."
        )


def _left_out(problem: Problem) -> Iterator[str]:
    lost = len(problem.left_out)
    if lost > LEFT_OUT * (lost + problem.stored):
        yield f"{left_out_words(problem)} If those rows differ from the rest, so would the answer."


def left_out_words(problem: Problem) -> str:
    """How many rows were left out and why, "" for none."""
    lost = len(problem.left_out)
    if not lost:
        return ""
    why = Counter(str(reason) for reason in problem.left_out["why"])
    told = ", ".join(f"{count} {plain(reason)}" for reason, count in why.most_common(3))
    more = f", {len(why) - 3} other reasons" if len(why) > 3 else ""
    return f"{lost:,} of {lost + problem.stored:,} rows were left out ({told}{more})."
