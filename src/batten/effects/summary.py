"""The in-sample numbers a report is asked for, each with its unit, and words where it is not there.

They describe the rows the fit was made on, so they flatter it; remedies are compared by held-out error.
"""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np
from scipy.special import gammaln

from batten.diagnose.span import outside
from batten.diagnose.tests_of_shape import AddOn, add_on, add_on_robust
from batten.effects.check import Working, plain_scale, working
from batten.effects.tell import Names
from batten.engine.rows import Array
from batten.families.links.loglink import LogLink
from batten.fit.estimate import Estimate
from batten.fit.means import means_at_rows

__all__ = ["Entry", "in_sample_means", "summary"]

_MODELS_THE_MEAN = "a model of the mean has no sum of squares of its own; see deviance explained"
_NO_LIKELIHOOD = "a pseudo-likelihood: the mean is modelled, the distribution is not"
_LEAST_SQUARES = "fitted by least squares: see the residual sum of squares"


@dataclass(frozen=True)
class Entry:
    """One number; NaN with the reason in note. unit: "" for counts and shares."""

    name: str
    value: float
    unit: str = ""
    note: str = ""


def summary(est: Estimate, names: Names, *, errors: str = "robust") -> tuple[Entry, ...]:
    """Size, spread, R2, overall F, likelihood and deviance of one fit."""
    work = working(est)
    return (
        *_size(est),
        *_spread(est, names),
        *_r2(est, work, names),
        *_overall(est, work, errors),
        *_likelihood(est, names),
        *_deviance(est, names),
    )


def _size(est: Estimate) -> Iterator[Entry]:
    yield Entry("rows", est.n)
    if est.clusters is not None:
        yield Entry("clusters", est.clusters.count, note="errors are taken by cluster")
    searched = est.parameters - 1 - len(est.coef)
    found = f", {searched:g} searched" if searched else ""
    note = f"{len(est.coef)} coefficients{found}, and the spread"
    if est.roughness is not None:
        note = f"effective ones: {len(est.coef)} coefficients held back by a penalty, and the spread"
    yield Entry("parameters", est.parameters, note=note)
    yield Entry("residual degrees of freedom", est.df_residual)


def _spread(est: Estimate, names: Names) -> Iterator[Entry]:
    average = " of a row of average weight" if est.rows.weights is not None else ""
    if est.link is not None:
        note = f"residuals{average} over the square root of the variance that the link takes"
        yield Entry("residual SD, fitting scale", est.sigma, note=note)
    elif plain_scale(est):
        yield Entry("residual SD, fitting scale", est.sigma, names.y_unit, f"of {names.y}{average}")
    else:
        note = f"of {est.scale.words(names.y)}{average}"
        yield Entry("residual SD, fitting scale", est.sigma, note=note)
    rss = _squares(est, est.rows.y - in_sample_means(est))
    note = f"{names.y} around its fitted mean{average}"
    yield Entry("residual SD, units of y", math.sqrt(rss / est.df_residual), names.y_unit, note)


def in_sample_means(est: Estimate) -> Array:
    """Fitted means of y at the rows (n,)."""
    if plain_scale(est):
        return est.eta
    if est.link is not None:
        return est.mu
    rows = est.rows
    return means_at_rows(est, rows.x, rows.base, rows.modifier, root=False).value


def _squares(est: Estimate, values: Array) -> float:
    return float(np.sum(est.rows.weigh(values) ** 2))


def _r2(est: Estimate, work: Working, names: Names) -> Iterator[Entry]:
    """Shares of the squared deviations from the mean (Kvalseth 1985 on the many R2)."""
    y, df, weighted = est.rows.y, est.df_residual, "" if est.rows.weights is None else ", rows weighted"
    away = y - np.average(y, weights=est.rows.weights)
    r2 = _share(_squares(est, y - in_sample_means(est)), _squares(est, away))
    yield _defined("R2, units of y", r2, f"{names.y} does not vary", f"of {names.y} by its fitted mean{weighted}")
    yield _defined(
        "adjusted R2, units of y", 1 - (1 - r2) * (est.n - 1) / df, f"{names.y} does not vary",
        "as above, with the constants paid for",
    )  # fmt: skip
    if est.link is not None:
        yield Entry("R2, fitting scale", math.nan, note=_MODELS_THE_MEAN)
        yield Entry("adjusted R2, fitting scale", math.nan, note=_MODELS_THE_MEAN)
        return
    total = float(np.sum(_about_constant(est, work) ** 2))
    r2 = _share(float(work.e @ work.e), total)
    free = est.n - 1 if est.rows.constant else est.n
    scale = est.scale.words(names.y) if not plain_scale(est) else names.y
    about = "" if est.rows.constant else ", about zero since there is no constant"
    yield _defined("R2, fitting scale", r2, "the response does not vary", f"of {scale}{about}")
    yield _defined(
        "adjusted R2, fitting scale", 1 - (1 - r2) * free / df, "the response does not vary",
        "as above, with the constants paid for",
    )  # fmt: skip


def _share(left: float, total: float) -> float:
    return 1 - left / total if total > 0 else math.nan


def _defined(name: str, value: float, why: str, note: str) -> Entry:
    return Entry(name, value, note=note if math.isfinite(value) else why)


def _about_constant(est: Estimate, work: Working) -> Array:
    """The response on the working scale with the constant taken off, where there is one (n,)."""
    if not est.rows.constant:
        return work.z
    return outside((work.root / np.linalg.norm(work.root))[:, None], work.z)


def _overall(est: Estimate, work: Working, errors: str) -> Iterator[Entry]:
    """All predictors together against the constant alone."""
    searched = bool(est.theta) or bool(est.remedy.left.searched) or est.shape.own_level
    smooth = est.roughness is not None
    found = None if searched or smooth else _all_predictors(est, work, errors)
    if found is None:
        why = "a searched constant has no such test" if searched else "no such test can be made on these rows"
        why = "a curve under a penalty has no such test" if smooth else why
        for name in ("overall F", "overall F, df", "overall F, residual df", "overall F, p"):
            yield Entry(name, math.nan, note=why)
        return
    how = {"constant": "even spread", "HC3": "robust to uneven spread (HC3)"}.get(
        found.errors, f"by cluster ({found.errors})"
    )
    against = "the constant alone" if est.rows.constant else "zero"
    yield Entry("overall F", found.statistic, note=f"all predictors against {against}; {how}")
    yield Entry("overall F, df", found.df[0])
    yield Entry("overall F, residual df", found.df[1])
    yield Entry("overall F, p", found.p, note="R2 is the size that goes with it")


def _all_predictors(est: Estimate, work: Working, errors: str) -> AddOn | None:
    first = work.root[:, None] if est.rows.constant else np.empty((est.n, 0))
    if errors == "robust":
        return add_on_robust(first, work.X, work.z, cluster=work.cluster)
    return add_on(first, work.X, work.z)


def _likelihood(est: Estimate, names: Names) -> Iterator[Entry]:
    value, k = est.log_likelihood, est.parameters
    units = f"of {names.y} itself, so that scales can be compared"
    if value is None:
        pseudo = est.link is not None
        why = _NO_LIKELIHOOD if pseudo else "the fit is perfect"
        yield Entry("log-likelihood", math.nan, note=why)
    else:
        yield Entry("log-likelihood", value, note=units)
    why = _no_criterion(est)
    counted = f"{k:g} constants counted"
    for name, number in (("AIC", _aic(est)), ("AICc", est.aicc), ("BIC", _bic(est))):
        number = math.nan if why else number
        few = f"{est.n} rows are too few for {k:g} constants"
        yield Entry(name, number, note=why or (counted if math.isfinite(number) else few))
    yield from _poisson(est)


def _no_criterion(est: Estimate) -> str:
    if est.log_likelihood is None:
        return _NO_LIKELIHOOD if est.link is not None else "the fit is perfect"
    if est.clusters is not None:
        return "rows of one cluster are not independent"
    if est.theta and est.shape.steps and est.shape.finite:
        return "a cut found by searching makes these criteria too kind"
    return ""


def _aic(est: Estimate) -> float:
    return math.nan if est.log_likelihood is None else -2 * est.log_likelihood + 2 * est.parameters


def _bic(est: Estimate) -> float:
    return math.nan if est.log_likelihood is None else -2 * est.log_likelihood + est.parameters * math.log(est.n)


def _poisson(est: Estimate) -> Iterator[Entry]:
    """For whole numbers the pseudo-likelihood of the log link is also a likelihood, if their variance is their mean."""
    if not (isinstance(est.link, LogLink) and est.link.kind == "poisson"):
        return
    y, name = est.rows.y, "Poisson log-likelihood"
    if est.rows.weights is not None or not (y == np.round(y)).all():
        yield Entry(name, math.nan, note="only for counts: whole numbers, each row alike")
        return
    value = float(np.sum(y * np.log(est.mu) - est.mu - gammaln(y + 1)))
    note = "taking the counts to be Poisson, their variance to be their mean; not used for ranking"
    yield Entry(name, value, note=note)


def _deviance(est: Estimate, names: Names) -> Iterator[Entry]:
    if est.link is None:
        plain = plain_scale(est)
        square, of = (
            f"{names.y_unit} squared" * bool(plain and names.y_unit),
            names.y if plain else est.scale.words(names.y),
        )
        rss = float(est.residual @ est.residual)
        yield Entry("residual sum of squares, fitting scale", rss, square, f"of {of}")
        for name in ("deviance", "deviance explained", "dispersion"):
            yield Entry(name, math.nan, note=_LEAST_SQUARES)
        return
    y, prior = est.rows.y, est.rows.root_weight**2
    mean = np.full(est.n, np.average(y, weights=prior))
    found = float(prior @ est.link.deviance(y, est.mu))
    none = float(prior @ est.link.deviance(y, mean))
    yield Entry("residual sum of squares, fitting scale", math.nan, note=_MODELS_THE_MEAN)
    yield Entry("deviance", found, note=f"that of a constant mean is {none:.6g}")
    yield _defined("deviance explained", _share(found, none), "the response does not vary", "against a constant mean")
    yield Entry("dispersion", est.sigma**2, note="Pearson's chi-square over the residual degrees of freedom")
