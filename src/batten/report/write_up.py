"""A paragraph of methods and one of results about one remedy, to paste into a report.

Names of published methods stand here with author and year; every number comes from the examination.
"""

from __future__ import annotations

import math
from typing import TYPE_CHECKING

from batten.compare.grid import STRAIGHT
from batten.effects.numbers import counted, show
from batten.report import how, numerals
from batten.report.cautions import SUBTITLE, left_out_words
from batten.report.entries import lowest
from batten.report.lettering import plain
from batten.report.naming import remedy_words
from batten.report.words import span_words

if TYPE_CHECKING:
    from batten.exam.examination import Examination

__all__ = ["write_up"]


def write_up(exam: Examination, key: str) -> str:
    """Methods and results of one remedy, with exact numbers; two paragraphs."""
    name = exam[key].key
    methods = [
        _rows(exam), _trial(exam), _compared(exam), _chosen(exam, name), _means(exam, name), _counted(exam, name),
        how.software(),
    ]  # fmt: skip
    results = [
        _line(exam), _errors(exam, name), span_words(exam, name), _coefficients(exam, name), _scatter(exam, name),
        SUBTITLE,
    ]  # fmt: skip
    return "\n\n".join(" ".join(s for s in sentences if s) for sentences in (methods, results))


def _rows(exam: Examination) -> str:
    p = exam.problem
    plural = "s" if len(p.covariates) > 1 else ""
    beside = f", with {' and '.join(map(plain, p.covariates))} as covariate{plural}" if p.covariates else ""
    lost = left_out_words(p) or "No row was left out."
    return (
        f"{_with_unit(exam, p.response)} was regressed on {_with_unit(exam, p.focus)}{beside} "
        f"(formula {plain(p.formula)}; n = {p.rows.count:,}). {lost} {how.beside_words(exam)}".rstrip()
    )


def _with_unit(exam: Examination, column: str) -> str:
    unit = exam.problem.unit(column)
    return f"{plain(column)} ({plain(unit)})" if unit else plain(column)


def _trial(exam: Examination) -> str:
    trial, p = exam.straight, exam.problem
    if not trial.knots:
        return f"{plain(p.focus)} takes too few different values for a test of the straight line."
    tolerance = show(trial.tolerance, p.unit(p.response))
    own = "a quarter of the spline's residual standard deviation" if trial.tolerance_is_default else "set in advance"
    return (
        f"Whether a straight line serves was judged by its largest gap to a restricted cubic spline with {trial.knots} "
        f"knots at places fixed by the number of rows (Harrell 2015), over the central 90% of {plain(p.focus)}, with a "
        f"simultaneous {exam.question.level:.0%} band, against a tolerance of {tolerance} ({own})."
    )


def _compared(exam: Examination) -> str:
    splits, p = exam.comparison.splits, exam.problem
    repeats = len(splits.fold)
    times = f", repeated {repeats} times" if repeats > 1 else ""
    return (
        f"{exam.choice.tried} remedies were compared by the root mean squared error of the mean in {splits.k}-fold "
        f"cross-validation with folds dealt along {plain(p.focus)}{times} (seed {exam.question.seed}), on the same "
        "rows and folds and in the response's own units, with every constant estimated again in each training set; "
        "differences were judged by the corrected resampled standard error (Nadeau and Bengio 2003)."
    )


def _chosen(exam: Examination, key: str) -> str:
    words = f"{remedy_words(exam.problem, key)} ({key})"
    if exam.question.planned == key:
        return f"The model reported, {words}, was planned in advance; the others show how much hangs on it."
    if key != exam.choice.key:
        return f"The model reported is {words}; the rule stated here would choose {exam.choice.key}."
    kept = " that leave no curvature shown to exceed the tolerance" if exam.question.aim == "effect" else ""
    return (
        f"The model reported, {words}, is the simplest among the remedies{kept} whose held-out error could not be told "
        "from the lowest of theirs."
    )


def _means(exam: Examination, key: str) -> str:
    est = exam.comparison.estimates[key]
    if est.link is not None:
        means = "The model is one of the mean itself."
    elif est.scale.closed == "identity":
        means = "The response was not transformed, so fitted values are means."
    else:
        factor = f"; factor {show(how.smear_factor(est))}" if est.scale.closed == "exp" else ""
        means = f"Fitted values were brought back to means by smearing (Duan 1983{factor})."
    over = " Means are averaged over the rows' own covariates." if exam.problem.covariates else ""
    made = how.interval_words(est, exam.question.errors)
    return f"{means}{over} Intervals ({exam.question.level:.0%}) of means and differences: {made}."


def _counted(exam: Examination, key: str) -> str:
    if exam.question.planned == key:
        return "No choosing enters the intervals."
    return (
        f"Intervals are as if this model had been fixed in advance: choosing among {exam.choice.tried} is not counted, "
        "and the lowest of so many held-out errors flatters."
    )


def _line(exam: Examination) -> str:
    trial, p = exam.straight, exam.problem
    if not trial.knots:
        return plain(trial.words)
    unit = p.unit(p.response)
    width = (trial.gap_high - trial.gap_low) / 10
    limits = f"{show(trial.gap_low, width=width)} to {show(trial.gap_high, unit, width=width)}"
    kind = "robust" if p.rows.cluster is None else "cluster-robust"
    test = f"{kind} F({trial.df[0]}, {trial.df[1]}) = {show(trial.f)}, {how.p_words(trial.p)}"
    return (
        f"The straight line's mean lay up to {show(trial.gap, unit, width=width)} (limits {limits}) from the flexible "
        f"curve ({test}): {trial.verdict}."
    )


def _errors(exam: Examination, key: str) -> str:
    scores, p = exam.comparison.scores, exam.problem
    unit, best = p.unit(p.response), lowest(exam)
    own = f"Held-out error was {numerals.error(scores[key].rmse, best, unit)} for this model"
    line = "" if key == STRAIGHT else f", {numerals.error(scores[STRAIGHT].rmse, best, unit)} for the straight line"
    lowest_words = f" and {numerals.error(best, best, unit)} at the lowest ({exam.choice.best})"
    first = "" if key == exam.choice.best else lowest_words
    return f"{own}{line}{first}; {len(exam.choice.tied)} of {exam.choice.tried} could not be told from the lowest."


def _coefficients(exam: Examination, key: str) -> str:
    """The focal predictor's own coefficients, on the fitting scale; those of a penalised curve mean nothing."""
    fit = exam[key]
    if fit.estimate.roughness is not None:
        return how.smoothing_words(fit.estimate)
    table = fit.coefficients.iloc[len(exam.problem.base_names) - (1 if fit.estimate.shape.own_level else 0) :]
    told = []
    for name, row in zip(table.index, table.to_numpy(float), strict=True):
        value, error, low, high = (float(v) for v in row)
        if not math.isfinite(error):
            told.append(f"{plain(name)} {show(value)}")
            continue
        digits = (high - low) / 10
        ends = f"{show(low, width=digits)} to {show(high, width=digits)}"
        told.append(f"{plain(name)} {show(value, width=digits)} (SE {show(error, width=digits)}, {ends})")
    return f"Coefficients on the fitting scale: {'; '.join(told)}." if told else ""


def _scatter(exam: Examination, key: str) -> str:
    fit, p = exam[key], exam.problem
    est = fit.estimate
    plain_scale = est.link is None and est.scale.key == "y"
    scale = "" if plain_scale else " on the fitting scale"
    sd = f"Residual standard deviation{scale}: {show(fit.sigma, p.unit(p.response) if plain_scale else '')}"
    aicc = f"; AICc in units of {plain(p.response)}: {fit.aicc:.1f}" if math.isfinite(fit.aicc) else ""
    constants = f"{counted(fit.parameters)} constants counted"
    return f"{sd} on {counted(fit.df_residual)} degrees of freedom; {constants}{aicc}."
