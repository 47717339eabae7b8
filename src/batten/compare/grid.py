"""The whole comparison: fit every remedy, score it held out, measure its left-over bend, choose."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass, fields, replace
from functools import partial
from types import MappingProxyType

import numpy as np

from batten.compare.choose import ROUNDING, Candidate, Choice, choose
from batten.compare.heldout import HeldOut, Prepared, held_out
from batten.diagnose.bend import Bend, Flexible, bend_of, flexible
from batten.engine.folds import Splits, deal, default_repeats
from batten.engine.rows import Rows
from batten.engine.threads import MANY_ROWS, one_thread, side_by_side
from batten.errors import Refusal
from batten.errors.compare import nothing_fits
from batten.families.remedy import Remedy, parse
from batten.fit.estimate import Estimate
from batten.fit.fitting import Designs, estimate
from batten.fit.means import averaged_means
from batten.fit.question import Question

__all__ = ["Comparison", "Progress", "compare", "extend"]

#: progress(done, total, label)
Progress = Callable[[int, int, str], None]
STRAIGHT = "y ~ x"
#: places along the data where a curve's turning is looked for
TURN_PLACES = 41


@dataclass(frozen=True, eq=False)
class Comparison:
    """Everything the search found.

    estimates: every remedy that could be fitted, by key, in table order (held-out RMSE; unranked ones last).
    scores, bends: by key, for the ranked ones (a bend may be None). refused: why others cannot be used.
    """

    rows: Rows
    question: Question
    splits: Splits
    reference: Flexible
    estimates: Mapping[str, Estimate]
    scores: Mapping[str, HeldOut]
    bends: Mapping[str, Bend | None]
    turns: Mapping[str, str]
    refused: Mapping[str, Refusal]
    choice: Choice

    @property
    def candidates(self) -> dict[str, Candidate]:
        """The remedies that can be ranked."""
        return _candidates(self.estimates, self.scores, self.bends, self.turns)

    def asked(self, question: Question, *, unit: str = "") -> Comparison:
        """The same fits and scores under another aim."""
        return replace(self, question=question, choice=choose(self.candidates, question, self.splits.k, unit))

    def __getstate__(self) -> dict[str, object]:
        # mapping proxies do not pickle
        return {f.name: dict(v) if isinstance(v := getattr(self, f.name), Mapping) else v for f in fields(self)}

    def __setstate__(self, state: dict[str, object]) -> None:
        for name, value in state.items():
            object.__setattr__(self, name, MappingProxyType(value) if isinstance(value, dict) else value)


def compare(
    rows: Rows, remedies: tuple[Remedy, ...], question: Question, *, unit: str = "", progress: Progress | None = None
) -> Comparison:
    """Fit, score and compare the remedies on the same rows and folds; the straight line is always among them."""
    with one_thread():
        return _compare(rows, remedies, question, unit=unit, progress=progress)


def _compare(
    rows: Rows, remedies: tuple[Remedy, ...], question: Question, *, unit: str, progress: Progress | None
) -> Comparison:
    repeats = question.repeats or default_repeats(rows.count)
    splits = deal(rows, folds=question.folds, repeats=repeats, seed=question.seed)
    reference = flexible(rows, tolerance=question.tolerance, level=question.level)
    wanted = dict.fromkeys([STRAIGHT, *(r.key for r in remedies)])
    if question.planned is not None:
        wanted[parse(question.planned).key] = None
    return _run(rows, question, splits, reference, [parse(k) for k in wanted], unit=unit, progress=progress)


def extend(old: Comparison, remedy: Remedy, *, unit: str = "") -> Comparison:
    """The same comparison with one more remedy on the same rows and folds."""
    with one_thread():
        new = _run(old.rows, old.question, old.splits, old.reference, [parse(STRAIGHT), remedy], unit=unit)
    return _assemble(
        old.rows, old.question, old.splits, old.reference, {**old.estimates, **new.estimates},
        {**old.scores, **new.scores}, {**old.bends, **new.bends}, {**old.turns, **new.turns},
        {**{k: v for k, v in old.refused.items() if k not in new.estimates}, **new.refused}, unit=unit,
    )  # fmt: skip


def _run(
    rows: Rows,
    question: Question,
    splits: Splits,
    reference: Flexible,
    remedies: list[Remedy],
    *,
    unit: str,
    progress: Progress | None = None,
) -> Comparison:
    ready = Prepared.of(rows, splits)
    # remedies of one shape share its columns; with many rows nothing as long as they is kept beyond its group
    groups: dict[str, list[Remedy]] = {}
    for remedy in remedies:
        groups.setdefault(remedy.shape.key, []).append(remedy)
    begun = np.cumsum([0, *(len(group) for group in groups.values())])

    def tell(place: int) -> None:
        if progress:
            progress(int(begun[place]), len(remedies), list(groups.values())[place][0].key)

    tasks: list[Callable[[], list[_Tried]]] = [
        partial(_try, rows, group, ready, reference, question) for group in groups.values()
    ]
    tried = {one.remedy.key: one for some in side_by_side(tasks, rows=rows.count, before=tell) for one in some}
    done = [tried[remedy.key] for remedy in remedies]
    # refused before it was fitted, before it was scored, before its bend was measured
    refused = {
        one.remedy.key: one.refusal for stage in range(3) for one in done if one.refusal and one.stage == stage
    }  # fmt: skip
    fine = [one for one in done if one.est is not None and one.score is not None]
    found = _assemble(
        rows, question, splits, reference, {one.remedy.key: one.est for one in fine if one.est},
        {one.remedy.key: one.score for one in fine if one.score}, {one.remedy.key: one.bend for one in fine},
        {one.remedy.key: one.turns for one in fine}, refused, unit=unit,
    )  # fmt: skip
    if progress:
        progress(len(remedies), len(remedies), "done")
    return found


@dataclass(frozen=True, eq=False)
class _Tried:
    """One remedy's fit, score, bend and turning, or the reason why it has none and the stage (0 to 2) that said so."""

    remedy: Remedy
    est: Estimate | None = None
    score: HeldOut | None = None
    bend: Bend | None = None
    turns: str = ""
    refusal: Refusal | None = None
    stage: int = 0


def _try(rows: Rows, group: list[Remedy], ready: Prepared, reference: Flexible, question: Question) -> list[_Tried]:
    """Remedies of one shape, fitted and scored together."""
    designs: Designs = {}
    fits = [estimate(rows, remedy, designs=designs) for remedy in group]
    scores = iter(held_out([fit for fit in fits if isinstance(fit, Estimate)], ready))
    return [
        _Tried(remedy, refusal=fit) if isinstance(fit, Refusal) else _judged(fit, next(scores), reference, question)
        for remedy, fit in zip(group, fits, strict=True)
    ]


def _judged(est: Estimate, score: HeldOut | Refusal, reference: Flexible, question: Question) -> _Tried:
    """An estimate with its bend and turning beside its score."""
    if isinstance(score, Refusal):
        return _Tried(est.remedy, refusal=score, stage=1)
    bend = bend_of(reference, est, level=question.level)
    if isinstance(bend, Refusal):
        return _Tried(est.remedy, refusal=bend, stage=2)
    rounding = ROUNDING * float(np.std(est.rows.y))
    bend = _against_the_better(bend, score, reference, rounding=rounding)
    kept = est.lean if est.n > MANY_ROWS else est
    return _Tried(est.remedy, kept, score, bend, _turns(est, question.expect))


def _against_the_better(bend: Bend | None, score: HeldOut, reference: Flexible, *, rounding: float) -> Bend | None:
    """A gap to the flexible curve is no left-over bend where the remedy, held out, errs less than that curve in sample.

    With little noise a spline misses an exact curve by more than the tolerance; it is then the spline that is off.
    """
    if bend is None or bend.verdict != "matters" or score.rmse >= max(reference.residual_sd, rounding):
        return bend
    return replace(bend, verdict="cannot tell")


def _assemble(
    rows: Rows,
    question: Question,
    splits: Splits,
    reference: Flexible,
    estimates: Mapping[str, Estimate],
    scores: Mapping[str, HeldOut],
    bends: Mapping[str, Bend | None],
    turns: Mapping[str, str],
    refused: Mapping[str, Refusal],
    *,
    unit: str,
) -> Comparison:
    candidates = _candidates(estimates, scores, bends, turns)
    if not candidates:
        raise nothing_fits(refused)
    choice = choose(candidates, question, splits.k, unit)
    order = sorted(estimates, key=lambda k: (scores[k].rmse, estimates[k].remedy.order))

    def frozen(items: Mapping[str, object]) -> Mapping[str, object]:
        return MappingProxyType({k: items[k] for k in order})

    return Comparison(
        rows, question, splits, reference, frozen(estimates), frozen(scores), frozen(bends), frozen(turns),  # type: ignore[arg-type]
        MappingProxyType(dict(refused)), choice,
    )  # fmt: skip


def _candidates(
    estimates: Mapping[str, Estimate],
    scores: Mapping[str, HeldOut],
    bends: Mapping[str, Bend | None],
    turns: Mapping[str, str],
) -> dict[str, Candidate]:
    return {k: Candidate(estimates[k], scores[k], bends[k], turns[k]) for k in scores}


def _turns(est: Estimate, expect: str | None) -> str:
    """Words for where the mean curve runs against the expected direction inside the data, or ""."""
    if expect is None:
        return ""
    x = est.rows.x
    places = np.linspace(x.min(), x.max(), TURN_PLACES)
    curve = averaged_means(est, places, root=False).value
    steps = np.diff(curve) * (1 if expect == "rising" else -1)
    against = np.flatnonzero(steps < -1e-9 * np.ptp(curve))
    if not len(against):
        return ""
    start, stop = places[against[0]], places[against[-1] + 1]
    return f"not {expect} between {start:.4g} and {stop:.4g}"
