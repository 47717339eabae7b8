"""Ties and the choice: the simplest remedy that cannot be told from the best, with its reasons."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np

from batten.compare.heldout import HeldOut
from batten.diagnose.bend import Bend
from batten.effects.numbers import show
from batten.engine.paired import corrected_se
from batten.families.base import Link
from batten.fit.estimate import Estimate
from batten.fit.question import Question

__all__ = ["ROUNDING", "Candidate", "Choice", "Gap", "choose", "gaps"]

#: gaps under this share of the best error are ties whatever their standard error
NEAR = 0.01
#: errors under this share of the SD of y are rounding
ROUNDING = 1e-9
#: gaps over this share of the best error are never ties: where one row makes both the gap and its standard error huge,
#: the corrected rule alone would call an error ten times the best "tied"
FAR = 0.5


@dataclass(frozen=True, eq=False)
class Candidate:
    """A remedy that can be ranked: its fit, held-out scores and left-over bend."""

    estimate: Estimate
    scores: HeldOut
    bend: Bend | None
    turns_inside: str  # "" or words for where the curve turns against what was expected

    @property
    def key(self) -> str:
        return self.estimate.remedy.key


@dataclass(frozen=True)
class Gap:
    """Held-out RMSE behind the best and its corrected paired standard error, units of y; tied or not."""

    size: float
    error: float
    tied: bool


@dataclass(frozen=True)
class Choice:
    """key: the chosen remedy. runner_up: the next by the same rule, or None. tied: keys that cannot be told apart.

    reasons: sentences, in the order the rule was applied. otherwise: yardsticks that would choose differently, as
    (yardstick in words, key).
    """

    key: str
    runner_up: str | None
    best: str
    tied: tuple[str, ...]
    reasons: tuple[str, ...]
    otherwise: tuple[tuple[str, str], ...]
    tried: int


def gaps(candidates: Mapping[str, Candidate], folds: int) -> dict[str, Gap]:
    """Gap of each remedy to the best, from the same splits (Nadeau and Bengio 2003)."""
    best = min(candidates.values(), key=lambda c: c.scores.rmse)
    low = best.scores.rmse
    # perfect fits differ by rounding alone
    nothing = ROUNDING * float(np.std(best.estimate.rows.y))
    out = {}
    for key, c in candidates.items():
        behind = c.scores.rmse - low
        d = c.scores.squared - best.scores.squared
        both = c.scores.rmse + low
        # a mean squared difference d is (rmse - low)(rmse + low): the same division brings its error to units of y
        error = corrected_se(d, folds) / both if both > 0 and key != best.key else 0.0
        close = behind <= max(NEAR * low, nothing) or (behind <= error and behind <= FAR * low)
        out[key] = Gap(behind, error, bool(close or key == best.key))
    return out


def choose(candidates: Mapping[str, Candidate], question: Question, folds: int, unit: str) -> Choice:
    """Apply the rules of the aim. candidates: rankable remedies by key, at least one."""
    gap = gaps(candidates, folds)
    ranked = sorted(candidates, key=lambda k: (candidates[k].scores.rmse, candidates[k].estimate.remedy.order))
    best = ranked[0]
    reasons: list[str] = []
    pool = [k for k in ranked if not candidates[k].turns_inside] or ranked
    if len(pool) < len(ranked):
        reasons.append(
            f"{len(ranked) - len(pool)} remedies turn inside the data although {question.expect} was expected."
        )
    if question.aim == "effect":
        pool = _without_bend(candidates, pool, reasons)
    head = min(pool, key=lambda k: candidates[k].scores.rmse)
    if head == best:
        tied = [k for k in pool if gap[k].tied]
    else:
        local = gaps({k: candidates[k] for k in pool}, folds)
        tied = [k for k in pool if local[k].tied]
    tied.sort(key=lambda k: candidates[k].estimate.remedy.order)
    chosen = tied[0]
    reasons.append(_tie_words(candidates, gap, chosen, head, len(tied), len(candidates), unit))
    plain = _simpler_and_better(candidates, pool, chosen)
    if plain != chosen:
        reasons.append(f"{plain} is simpler still and has a lower held-out error than {chosen}, so it is taken.")
        tied, chosen = [plain, *tied], plain
    runner_up = tied[1] if len(tied) > 1 else next((k for k in pool if k != chosen), None)
    if question.planned is not None and question.planned in candidates:
        chosen, runner_up = question.planned, chosen if chosen != question.planned else runner_up
        reasons = [
            "Planned in advance: no choosing, no penalty for choosing; the other remedies show how much hangs on it."
        ]
    everywhere = tuple(k for k in ranked if gap[k].tied)
    return Choice(chosen, runner_up, best, everywhere, tuple(reasons), _otherwise(candidates, chosen), len(candidates))


def _without_bend(candidates: Mapping[str, Candidate], pool: list[str], reasons: list[str]) -> list[str]:
    """Drop remedies whose left-over bend matters; if that leaves none, keep those that bend least."""
    straight = [k for k in pool if (b := candidates[k].bend) is None or b.verdict != "matters"]
    if straight:
        if len(straight) < len(pool):
            count = len(pool) - len(straight)
            reasons.append(f"{count} of {len(pool)} remedies leave a bend that matters and were set aside.")
        return straight
    reasons.append("Every remedy leaves a bend that matters; the choice is the least bad, not a good one.")
    sizes = {k: 0.0 if (b := candidates[k].bend) is None else b.largest for k in pool}
    least = min(pool, key=lambda k: sizes[k])
    return [least]


def _simpler_and_better(candidates: Mapping[str, Candidate], pool: list[str], chosen: str) -> str:
    """The simplest remedy that is no more elaborate than the chosen one and errs less held out, else the chosen one.

    A noisy paired error can leave such a remedy just outside the ties while a worse one is inside.
    """
    mine = candidates[chosen]
    better = [
        k
        for k in pool
        if candidates[k].scores.rmse < mine.scores.rmse
        and candidates[k].estimate.remedy.order < mine.estimate.remedy.order
    ]
    return min(better, key=lambda k: candidates[k].estimate.remedy.order, default=chosen)


def _tie_words(
    candidates: Mapping[str, Candidate],
    gap: Mapping[str, Gap],
    chosen: str,
    head: str,
    tied: int,
    tried: int,
    unit: str,
) -> str:
    lowest = candidates[head].scores.rmse
    width = min(c.scores.rmse for c in candidates.values()) / 100  # the digits of the table
    opening = f"Lowest held-out error of {tried} tried, so flattering: {show(lowest, unit, width=width)} ({head})."
    if tied == 1:
        return f"{opening} Nothing simpler comes within one standard error of it."
    if chosen == head:
        return f"{opening} {tied - 1} more cannot be told from it; it is the simplest of them."
    behind = show(candidates[chosen].scores.rmse - lowest, unit, width=width)
    return f"{opening} {tied - 1} more cannot be told from it; {chosen} is the simplest, {behind} behind."


def _otherwise(candidates: Mapping[str, Candidate], chosen: str) -> tuple[tuple[str, str], ...]:
    """Other yardsticks and what they would choose, where that differs."""
    lists: list[tuple[str, dict[str, float]]] = [
        ("lowest held-out error of the mean", {k: c.scores.rmse for k, c in candidates.items()}),
        (
            "lowest absolute error of the median",
            {k: c.scores.overall(c.scores.absolute) for k, c in candidates.items()},
        ),
        (
            "log score of held-out rows",
            {k: -c.scores.overall(c.scores.log_score) for k, c in candidates.items() if c.scores.log_score is not None},
        ),
        (
            "likelihood with a charge for each constant",
            {k: c.estimate.aicc for k, c in candidates.items() if not isinstance(c.estimate.remedy.left, Link)},
        ),
    ]
    out = []
    for words, values in lists:
        finite = {k: v for k, v in values.items() if np.isfinite(v)}
        if finite and (first := min(finite, key=lambda k: finite[k])) != chosen:
            out.append((words, first))
    return tuple(out)
