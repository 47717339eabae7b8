"""Constants inside the columns of a mean model: Fisher scoring in coefficients and constants together.

A grid comes first, since the deviance may have several minima in the constants; then every step solves the working
least-squares problem whose columns are the design and its slopes along the constants, and is halved until the deviance
falls.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from scipy.optimize import minimize_scalar

from batten.engine.irls import Mean, Solved, iterate
from batten.engine.linear import factor
from batten.engine.rows import Array
from batten.engine.search import Searched, apart

__all__ = ["FoundMean", "search_mean"]

#: a candidate of the grid is judged after this many steps; the second where a fit of more rows shows the way
LOOK, LOOK_NEAR = 8, 3
#: corners looked at in the cells around a place
CORNERS = 40
#: local minima of the grid that are refined
TRIES = 3
#: beyond this many rows a training set's constants lie beside those of all rows
GRID_ROWS = 20_000
#: scoring ends when a step promises less than this share of the deviance
PROMISED = 1e-20


@dataclass(frozen=True, eq=False)
class FoundMean:
    """theta (q,), coef (p,) of [fixed | columns], deviance; whether the search settled inside its bounds."""

    theta: Array
    coef: Array
    deviance: float
    settled: bool


def search_mean(
    model: Mean, shape: Searched, y: Array, *, prior: Array | None, eta: Array, start: Array | None = None
) -> FoundMean:
    """Lowest deviance over the shape's candidates (and `start`, the place of a fit to more rows), refined.

    eta (n,): linear predictor to start from. prior (n,): weights of the rows. A finite set is only looked through.
    """
    fit = _Fits(model, shape, y, np.ones_like(y) if prior is None else prior, eta)
    if shape.finite:
        return min((fit.at(theta) for theta in shape.candidates), key=lambda found: found.deviance)
    places = shape.candidates if start is None or len(y) <= GRID_ROWS else shape.candidates[:0]
    tried = [fit.at(theta, steps=LOOK if start is None else LOOK_NEAR) for theta in places]
    starts = [] if start is None else [fit.at(start)]
    if tried:
        profile = np.array([found.deviance for found in tried])
        order = np.argsort(profile, kind="stable")
        starts += [tried[k] for k in apart(shape, order, profile, TRIES)]
    return min((fit.refined(found) for found in starts), key=lambda found: found.deviance)


@dataclass(frozen=True, eq=False)
class _Fits:
    model: Mean
    shape: Searched
    y: Array
    prior: Array
    eta: Array

    def columns(self, theta: Array) -> Array:
        return np.hstack([self.shape.fixed, self.shape.columns(theta)])

    def at(self, theta: Array, *, steps: int = 60) -> FoundMean:
        """The best coefficients at theta."""
        x = self.columns(theta)
        if not np.isfinite(x).all() or factor(x).aliased:
            return FoundMean(theta, np.zeros(x.shape[1]), np.inf, settled=False)
        done: Solved = iterate(self.model, x, self.y, eta=self.eta, prior=self.prior, steps=steps)
        return FoundMean(theta, done.coef, self.deviance(done.eta), done.settled)

    def deviance(self, eta: Array) -> float:
        with np.errstate(all="ignore"):
            total = float(self.prior @ self.model.deviance(self.y, self.model.mean(eta)))
        return total if np.isfinite(total) else np.inf

    def refined(self, found: FoundMean) -> FoundMean:
        """Scoring from a candidate; a single constant stopped by a corner of its profile is searched along it."""
        done = self._scored(found)
        if not done.settled and len(done.theta) == 1 and np.isfinite(done.deviance):
            done = self._along(done)
        if self.shape.corners is not None:
            # a minimum at a corner is one, although no step settles there
            done = self._walked(done) if len(done.theta) == 1 else done
            done = replace(done, settled=bool(np.isfinite(done.deviance)))
        lower, upper = self.shape.lower, self.shape.upper
        near = 1e-9 * (upper - lower)
        inside = ((done.theta > lower + near) & (done.theta < upper - near)).all()
        return FoundMean(done.theta, done.coef, done.deviance, bool(inside and done.settled))

    def _scored(self, found: FoundMean) -> FoundMean:
        theta, coef, now = found.theta, found.coef, found.deviance
        for _ in range(200):
            x = self.columns(theta)
            eta = x @ coef
            mu, slope = self.model.mean(eta), self.model.slope(eta)
            root = np.sqrt(self.prior / self.model.variance(mu))
            slopes = self.shape.slopes(theta)
            pull = np.einsum("qnk,k->nq", slopes, coef[len(coef) - slopes.shape[2] :])
            working = factor(np.hstack([x, pull]) * (root * slope)[:, None])
            if not np.isfinite(now) or working.aliased:
                break
            along = working.q.T @ (root * (self.y - mu))
            step = working.root @ along
            if float(along @ along) <= PROMISED * now:
                return FoundMean(theta, coef, now, settled=True)
            fraction, better = 1.0, False
            while fraction > 1e-5 and not better:
                trial = np.clip(theta + fraction * step[len(coef) :], self.shape.lower, self.shape.upper)
                new = coef + fraction * step[: len(coef)]
                deviance = self.deviance(self.columns(trial) @ new)
                better = deviance < now
                fraction *= 0.5
            if not better:
                # the deviance no longer shows a gain: settled where the step is small beside the constants' range
                small = np.abs(step[len(coef) :]) <= 1e-7 * (self.shape.upper - self.shape.lower)
                return FoundMean(theta, coef, now, settled=bool(small.all()))
            theta, coef, now = trial, new, deviance
        return FoundMean(theta, coef, now, settled=False)

    def _walked(self, found: FoundMean) -> FoundMean:
        """On to the best corner in the cells of the grid around a place, as long as it is better: a profile with
        corners may have minima that the grid does not show."""
        corners = self.shape.corners
        assert corners is not None
        for _ in range(5):
            low, high = self._around(found.theta[0], cells=3)
            inside = corners[(corners > low) & (corners < high)]
            inside = inside[:: max(1, len(inside) // CORNERS)]
            tried = (self.at(np.array([v]), steps=LOOK_NEAR) for v in inside)
            best = min(tried, key=lambda one: one.deviance, default=found)
            if not best.deviance < found.deviance * (1 - 1e-13):
                break
            again = self._scored(self.at(best.theta))
            found = min((again, found), key=lambda one: one.deviance)
        return found

    def _around(self, theta: float, *, cells: int = 1) -> tuple[float, float]:
        """The places of the grid around theta, some cells away."""
        grid = np.unique(np.concatenate([self.shape.candidates[:, 0], self.shape.lower, self.shape.upper]))
        low = grid[max(int(np.searchsorted(grid, theta, side="left")) - cells, 0)]
        return float(low), float(grid[min(int(np.searchsorted(grid, theta, side="right")) + cells - 1, len(grid) - 1)])

    def _along(self, found: FoundMean) -> FoundMean:
        """Brent's method along the profile of one constant, in the cells of the grid around its place."""
        low, high = self._around(found.theta[0])
        best = minimize_scalar(
            lambda v: self.at(np.array([v])).deviance, bounds=(low, high), method="bounded",
            options={"xatol": 1e-9 * (high - low)},
        )  # fmt: skip
        return min(found, self.at(np.array([float(best.x)])), key=lambda one: one.deviance)
