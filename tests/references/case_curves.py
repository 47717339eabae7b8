"""Curves written out in their parameters: batten's own curve under another spelling, or its search with their columns.

Where one of batten's curves is the same function, batten's fit is rewritten in the published parameters, with its
covariance. Otherwise the curve's own columns and slopes go through batten's variable projection.
"""

from __future__ import annotations

from dataclasses import dataclass
from itertools import product

import numpy as np
from case_fits import Fitted
from case_forms import Form
from case_tables import NotDelivered
from case_written import Layout, Written

from batten.engine.linear import factor
from batten.engine.search import Found, refine, scan

__all__ = ["CurveFit", "certified", "in_letters", "own_curve"]

Array = np.ndarray

#: batten's curves, with and without a constant in the formula
_CURVES = (
    ("exponential x", True), ("power x", True), ("level-hyp x", True), ("level-exp x", False), ("level-exp x", True),
    ("s-curve x", True), ("gompertz x", True),
)  # fmt: skip


@dataclass(frozen=True, eq=False)
class CurveFit:
    """Published parameters with standard errors, and the residual sum of squares."""

    names: tuple[str, ...]
    b: Array
    error: Array
    rss: float
    n: int

    @property
    def df_resid(self) -> int:
        return self.n - len(self.b)

    def number(self, key: str) -> float:
        """coef:, se:, rss, resid_sd, mse, n, df_resid."""
        name, _, term = key.partition(":")
        if name in ("coef", "se") and term in self.names:
            return float((self.b if name == "coef" else self.error)[self.names.index(term)])
        sums = {
            "rss": self.rss, "mse": self.rss / self.df_resid, "resid_sd": np.sqrt(self.rss / self.df_resid),
            "n": self.n, "df_resid": self.df_resid,
        }  # fmt: skip
        if key not in sums:
            raise NotDelivered(f"no rule for {key} of a curve")
        return float(sums[key])


def own_curve(written: Written, form: Form) -> CurveFit:
    """The published curve as one of batten's; NotDelivered where none is the same function."""
    for key, intercept in _CURVES:
        fitted = Fitted(form.with_key("y", key, covariates=(), crossed=(), intercept=intercept))
        try:
            est = fitted.fit.estimate
            if len(est.coef) + len(est.theta) != len(written.parameters):
                continue  # a special case of the published curve, or the other way round
            b = in_letters(written, est.eta)
        except NotDelivered:
            continue
        J = est.jacobian_at(fitted.x, est.rows.base, est.rows.modifier)
        moved = np.linalg.lstsq(written.jacobian(b), J, rcond=None)[0]
        error = np.sqrt(np.diagonal(moved @ est.covariance("constant") @ moved.T))
        return CurveFit(written.parameters, b, error, fitted.rss, fitted.fit.rows)
    raise NotDelivered("none of batten's curves is this function")


def in_letters(written: Written, fitted: Array) -> Array:
    """Parameters at which the published curve runs through fitted values (n,); NotDelivered where it cannot."""
    layout = Layout.of(written)
    found, coef = _best(layout, fitted, _grid(layout))
    b = layout.whole(found.theta, coef)
    for _ in range(5):
        with np.errstate(all="ignore"):
            b = b + np.linalg.lstsq(written.jacobian(b), fitted - written.value(b), rcond=None)[0]
    away = np.abs(written.value(b) - fitted).max()
    if not away <= 1e-9 * np.abs(fitted).max():
        raise NotDelivered("the fitted values do not lie on the published curve")
    return b


def certified(written: Written, y: Array, starts: list[Array]) -> CurveFit:
    """The published curve by batten's search with its own columns, from each start; the lowest is kept."""
    best: tuple[float, Array] | None = None
    for start in starts or (None,):
        layout = Layout.of(written, start)
        candidates = _grid(layout) if start is None else layout.theta(start)[None]
        found, coef = _best(layout, y, candidates)
        if np.isfinite(found.rss) and (best is None or found.rss < best[0]):
            best = found.rss, layout.whole(found.theta, coef)
    if best is None:
        raise NotDelivered("the search does not settle from these starts")
    rss, b = best
    J = factor(written.jacobian(b))
    error = np.sqrt(rss / (len(y) - len(b)) * np.diagonal(J.inverse_cross))
    return CurveFit(written.parameters, b, error, rss, len(y))


def _best(layout: Layout, y: Array, candidates: Array) -> tuple[Found, Array]:
    """Lowest of the best candidates, refined; and the linear coefficients there."""
    model = layout.model(candidates)
    with np.errstate(all="ignore"):
        if len(candidates) > 1:
            order = np.argsort(scan(model, y[:, None])[:, 0], kind="stable")
            candidates = candidates[order[:4]]
        found = min((refine(model, theta, y, steps=500) for theta in candidates), key=lambda f: f.rss)
        columns = model.columns(found.theta)
    if not np.isfinite(columns).all():
        raise NotDelivered("the search does not settle")
    length = np.sqrt((columns**2).sum(axis=0))
    return found, np.linalg.lstsq(columns / length, y, rcond=None)[0] / length


def _grid(layout: Layout) -> Array:
    """Constants of either sign over many sizes."""
    q = len(layout.searched)
    count = {0: 0, 1: 60, 2: 26}.get(q, 7)
    sizes = np.geomspace(1e-5, 1e4, count)
    return np.array(list(product(np.concatenate([-sizes[::-1], sizes]), repeat=q)))
