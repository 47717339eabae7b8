"""Is the spread even? Along x, along the fit, over all predictors; around the fit and around a flexible one."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from batten.diagnose.span import basis, beyond, outside
from batten.diagnose.tests_of_spread import (
    Spread,
    SpreadTest,
    brown_forsythe,
    fitted_spread,
    koenker,
    park,
    white,
    white_special,
)
from batten.effects.check import Check, Tested, Working, chance, plain_scale
from batten.effects.checks_of_shape import bending_columns
from batten.effects.numbers import about, show
from batten.effects.tell import Names
from batten.engine.rows import Array
from batten.families.shapes.straight import Straight
from batten.fit.estimate import Estimate

__all__ = ["checks_of_spread"]

#: numbers up to which all squares and products of the predictors are made
PRODUCTS = 20_000_000


def checks_of_spread(est: Estimate, work: Working, names: Names, *, every: bool) -> Iterator[Check | None]:
    """Along x first, then around a flexible fit, since a missed bend passes for uneven spread.

    every: also along the fit, and over all predictors.
    """
    x, told = est.rows.x, _Told(est, work, names)
    asked = f"is the spread the same all along {names.x} (Koenker)?"
    yield told.along_x("spread", asked, work.e, koenker(work.e, x[:, None]))
    extra = bending_columns(est)
    if extra is not None:
        left = outside(beyond(work.q, extra * work.root[:, None]), work.e)
        asked = f"is it the same along {names.x} around a fit that may bend freely (Koenker)?"
        yield told.along_x("spread, bends taken out", asked, left, koenker(left, x[:, None]))
    if not every:
        return
    columns = _predictors(est)
    if columns.shape[1] > 1 or not isinstance(est.shape, Straight):  # else this was the first test
        asked = "is the spread the same whatever the predictors (Koenker)?"
        yield told.along("spread, all predictors", asked, koenker(work.e, columns), _expected(work.e, columns))
    asked = "is the spread the same along the fit (White's special form)?"
    yield told.along("spread along the fit", asked, white_special(work.e, est.eta), est.eta)
    if est.n * columns.shape[1] ** 2 <= PRODUCTS:
        asked = "is it the same over the predictors, their squares and products (White)?"
        yield told.along("spread, all products", asked, white(work.e, columns), _expected(work.e, columns))
    yield _halves(est, work, names)
    yield _with_mean(est, names)


class _Told:
    """Writes a test of spread with the SDs it is about, in units of y."""

    def __init__(self, est: Estimate, work: Working, names: Names) -> None:
        self.est, self.work, self.names = est, work, names

    def along_x(self, name: str, asked: str, e: Array, test: SpreadTest | None) -> Check | None:
        spread = fitted_spread(e, self.est.rows.x)
        if test is None or spread is None:
            return None
        low, high = (about(v, self.names.x_unit) for v in spread.at)
        return self._check(name, asked, test, spread, f"at {low}", f"at {high}")

    def along(self, name: str, asked: str, test: SpreadTest | None, driver: Array) -> Check | None:
        spread = fitted_spread(self.work.e, driver)
        if test is None or spread is None:
            return None
        fit = driver is self.est.eta
        low, high = ("at low fits", "at high fits") if fit else ("where least is expected", "where most is")
        return self._check(name, asked, test, spread, low, high)

    def _check(self, name: str, asked: str, test: SpreadTest, spread: Spread, low: str, high: str) -> Check:
        unit, lean = self.names.y_unit, self.work.lean
        scale = "" if plain_scale(self.est) else " (as seen at the middle of the fit)"
        scale += "" if self.est.rows.weights is None else " once weighted"
        reading = (
            f"errors spread {show(spread.ratio)} times as much {high} as {low}: {show(spread.high * lean, unit)} "
            f"against {show(spread.low * lean, unit)}{scale}, {chance(test.p)}"
        )
        tested = Tested("chi-square", test.statistic, (test.df,), test.p)
        return Check(name, "spread", asked, (spread.high - spread.low) * lean, unit, reading, tested)


def _predictors(est: Estimate) -> Array:
    """Columns of the design that vary (n, k)."""
    X = est.design_at(est.rows.x, est.rows.base, est.rows.modifier)
    return X[:, np.ptp(X, axis=0) > 1e-10 * np.abs(X).max(axis=0)]


def _expected(e: Array, columns: Array) -> Array:
    """Squared residuals as the columns expect them (n,)."""
    Q = basis(np.column_stack([np.ones(len(e)), columns]))
    return np.asarray(Q @ (Q.T @ e**2))


def _halves(est: Estimate, work: Working, names: Names) -> Check | None:
    """Levene's test with medians (Brown and Forsythe 1974)."""
    found = brown_forsythe(work.e, est.eta)
    if found is None:
        return None
    low, high = (sd * work.lean for sd in found.sds)
    reading = (
        f"errors spread by {show(low, names.y_unit)} in the half with low fits, by {show(high, names.y_unit)} in the "
        f"other, {chance(found.p)}"
    )
    test = Tested("F", found.statistic, found.df, found.p)
    asked = "do low and high fits spread alike (Brown-Forsythe)?"
    return Check("spread in two halves", "spread", asked, high - low, names.y_unit, reading, test)


def _with_mean(est: Estimate, names: Names) -> Check | None:
    """How the variance grows with the mean (Manning and Mullahy 2001): for fits of the mean of y itself."""
    if not (plain_scale(est) or est.link is not None):
        return None
    mu = est.eta if est.link is None else est.mu
    found = park(est.rows.y, mu)
    if found is None:
        return None
    reading = (
        f"the variance grows like the mean to the power {show(found.slope)} (standard error {show(found.std_error)}): "
        "0 is even spread, 1 that of counts, 2 spread in proportion to the mean"
    )
    asked = f"how does the variance of {names.y} grow with its mean (Park)?"
    return Check("spread and mean", "spread", asked, found.slope, "power of the mean", reading)
