"""How the numbers of an examination were made, with the methods' names and sources."""

from __future__ import annotations

import platform
from importlib.metadata import PackageNotFoundError, version
from typing import TYPE_CHECKING

from batten.effects.numbers import counted, show
from batten.effects.smoothing import curve_freedom
from batten.fit.carried import no_mean_interval
from batten.fit.estimate import Estimate
from batten.fit.means import jackknifed
from batten.fit.smear import mean_factor
from batten.report.cautions import left_out_words
from batten.report.curves import JACKKNIFE_ROWS
from batten.report.lettering import plain

if TYPE_CHECKING:
    from batten.exam.examination import Examination

__all__ = ["how_computed", "interval_words", "mean_words", "p_words", "smear_factor", "smoothing_words", "software"]


def how_computed(exam: Examination, key: str | None = None) -> tuple[str, ...]:
    """Sentences on rows, scoring, choice, trial, means and intervals, for one remedy (the choice by default)."""
    est = exam.comparison.estimates[key or exam.choice.key]
    told = (
        rows_words(exam), scoring_words(exam), tie_words(exam), trial_words(exam), smoothing_words(est),
        mean_words(est),
        f"Intervals of means and differences: {interval_words(est, exam.question.errors)}.",
        _band_words(est, exam.question.errors), software(),
    )  # fmt: skip
    return tuple(sentence for sentence in told if sentence)


def rows_words(exam: Examination) -> str:
    """The formula and the rows that every remedy shares."""
    p = exam.problem
    lost = left_out_words(p) or "None were left out."
    rows = f"{p.rows.count:,} rows, the same for every remedy"
    return f"Formula: {plain(p.formula)}, on {plain(p.frame_name)}: {rows}. {lost} {beside_words(exam)}".rstrip()


def beside_words(exam: Examination) -> str:
    """What weights, clusters and exposure make of the rows, "" without them."""
    p, beside, told = exam.problem, exam.problem.beside, []
    if p.times is not None:
        told.append(f"{p.stored:,} stored rows stand for {p.rows.count:,}, by {plain(beside.weights or '')}.")
    elif beside.weights is not None:
        told.append(
            f"Rows are weighted by {plain(beside.weights)} (variance inversely proportional to it); errors and spreads "
            "are those of a row of average weight."
        )
    if beside.exposure is not None:
        told.append(
            f"{plain(p.response_column)} is taken per unit of {plain(beside.exposure)}, and rows are weighted by it; "
            "errors and spreads are those of a row of average exposure."
        )
    if p.rows.cluster is not None:
        told.append(
            f"Rows that share {plain(beside.cluster or '')} ({int(p.rows.cluster.max()) + 1:,} clusters) stay together "
            "in every fold, and errors are by cluster."
        )
    return " ".join(told)


def scoring_words(exam: Examination) -> str:
    """How held-out errors are made."""
    p, splits = exam.problem, exam.comparison.splits
    repeats = len(splits.fold)
    times = f", repeated {repeats} times" if repeats > 1 else ""
    return (
        f"Held-out error: root mean squared error of the mean in units of {plain(p.response)}, {splits.k} folds dealt "
        f"along {plain(p.focus)}{times} (seed {exam.question.seed}); everything a remedy learns is learned again in "
        "every training set."
    )


def tie_words(exam: Examination) -> str:
    """How ties and the choice are made."""
    aim = "whose left-over bend does not matter, " if exam.question.aim == "effect" else ""
    return (
        "Tied: not farther behind the lowest than one corrected standard error of the paired difference (Nadeau and "
        f"Bengio 2003), or 1% of it. The choice is the simplest of those {aim}tied with the best of them "
        f"(aim: {exam.question.aim})."
    )


def trial_words(exam: Examination) -> str:
    """How the straight line was tried."""
    trial, unit = exam.straight, exam.problem.unit(exam.problem.response)
    if not trial.knots:
        return "Trial of the straight line: not possible, the predictor has too few different values."
    own = "a quarter of that spline's residual SD, our default" if trial.tolerance_is_default else "as asked"
    return (
        f"Trial of the straight line: its gap to a restricted cubic spline with {trial.knots} knots, whose places the "
        f"number of rows alone decides (Harrell 2015), over the central 90% of {plain(exam.problem.focus)}, with a "
        f"simultaneous {exam.question.level:.0%} band, against {show(trial.tolerance, unit)} ({own}). Robust test of "
        f"the spline's bending columns: F({trial.df[0]}, {trial.df[1]}) = {show(trial.f)}, {p_words(trial.p)}."
    )


def p_words(p: float) -> str:
    """A p value, which always stands beside a size."""
    return "p < 0.001" if p < 0.001 else f"p = {p:.3f}"


def mean_words(est: Estimate) -> str:
    """How means and medians come back to units of y."""
    if est.link is not None:
        return "Means: the log or logit link models the mean itself, so nothing has to be brought back."
    if est.scale.closed == "identity":
        return "Means: the response is not transformed, so fitted values are means."
    if est.scale.closed == "exp":
        return (
            "Means: exp() of a mean logarithm is a typical value, not a mean; the average of exp(residual), "
            f"{show(smear_factor(est))}, is the factor that makes it one (smearing, Duan 1983)."
        )
    return "Means: the average over the residuals, each brought back by itself (smearing, Duan 1983)."


def smoothing_words(est: Estimate) -> str:
    """How a penalised curve was fitted, "" for other remedies."""
    if est.roughness is None:
        return ""
    used, lines = curve_freedom(est)
    weight = "its weight" if lines == 1 else "one weight for all curves, each counted once,"
    return (
        f"Curve: natural cubic spline with {len(est.state)} knots at quantiles, its integrated squared second "
        f"derivative penalised, {weight} by restricted likelihood (Patterson and Thompson 1971; Wood 2011): "
        f"{counted(used)} effective degrees of freedom."
    )


def smear_factor(est: Estimate) -> float:
    """The factor from median to mean on the log scale."""
    return float(mean_factor(est.residual[None])[0])


def interval_words(est: Estimate, errors: str) -> str:
    """How intervals of a mean difference and of a new row are made."""
    if no_mean_interval(est):
        return no_mean_interval(est)
    if errors == "constant":
        return f"errors taken to spread evenly{_bias_words(est)}, t quantiles"
    row, kind = ("row", "HC3") if est.clusters is None else ("cluster", "CR3")
    if jackknifed(est):
        made = f"every {row} left out in turn (jackknife; Wu 1986)"
    elif est.link is None and est.scale.closed == "identity" and est.clusters is None:
        made = "heteroscedasticity-robust errors (HC3; MacKinnon and White 1985)"
    elif est.link is None and est.scale.closed == "identity":
        made = "cluster-robust errors (CR3; Bell and McCaffrey 2002)"
    else:
        made = f"the influence of each {row} ({kind}-type)"
    made += _bias_words(est)
    new = "a new row" if est.clusters is None else "a row of a new cluster"
    return f"{made}, t quantiles; of {new}, jackknife+ with each tail by itself (Barber and others 2021)"


def _bias_words(est: Estimate) -> str:
    if est.roughness is None:
        return ""
    return " and what smoothing may have taken away (Nychka 1988), knots and amount of smoothing as given"


def _band_words(est: Estimate, errors: str) -> str:
    """How the drawn band is made, where that is not how the table's intervals are."""
    if errors == "robust" and est.n > JACKKNIFE_ROWS and jackknifed(est) and not no_mean_interval(est):
        return "The drawn band uses the influence of each row instead, which is quicker and nearly the same."
    return ""


def software() -> str:
    """Names and versions."""
    from batten import __version__

    found = []
    for name in ("numpy", "scipy", "pandas"):
        try:
            found.append(f"{name} {version(name)}")
        except PackageNotFoundError:  # built into something without metadata
            found.append(name)
    return f"Computed with batten {__version__} on Python {platform.python_version()}, {', '.join(found)}."
