"""Where one further row lies along the focal predictor, covariates as the rows have them."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np

from batten.engine.rows import Array, Ints
from batten.families.base import Link
from batten.fit.estimate import Estimate
from batten.fit.predict import DELETIONS_ROWS, further_values, new_row_interval

__all__ = ["moved_row_interval"]

#: rows beyond which an even sample of them, along x, serves
MOVED = 20_000


def moved_row_interval(
    est: Estimate, xs: Array, *, level: float = 0.95, errors: str = "robust", profile: tuple[Array, Array] | None = None
) -> tuple[Array, Array]:
    """Low and high ends (G,), units of y, for a further row at each of xs (G,), with covariates as the rows have them.

    Every row is moved to x with its own covariates and its own left-out error, by the fit without it: the jackknife+ of
    Barber, Candes, Ramdas and Tibshirani 2021 with each tail by itself, over covariates and errors together, so no
    shape of the errors is assumed. With too few rows for the level the ends are the outermost values. Where the
    covariates do not vary this is `new_row_interval`. profile: covariates (base, modifier) of every row instead.
    """
    base, modifier = profile or (est.rows.base, est.rows.modifier)
    if np.ptp(base, axis=0).max(initial=0.0) == 0 and np.ptp(modifier, axis=0).max() == 0:
        alike = np.tile(base[:1], (len(xs), 1)), np.tile(modifier[:1], (len(xs), 1))
        return new_row_interval(est, xs, *alike, level=level, errors=errors)
    some = np.argsort(est.rows.x, kind="stable")[np.linspace(0, est.n - 1, min(est.n, MOVED)).astype(np.intp)]
    low, high = np.empty(len(xs)), np.empty(len(xs))
    first = max(int(np.floor((1 - level) / 2 * (len(some) + 1) + 1e-9)) - 1, 0)
    last = len(some) - 1 - first
    moves = est.row_moves()[some] if est.n <= DELETIONS_ROWS else None
    bring_back = _own_errors(est, some, moves)
    for g, x in enumerate(xs):
        j = est.jacobian_at(np.full(len(some), x), base[some], modifier[some])
        design = j[:, : len(est.coef)]
        eta = design @ est.coef
        if moves is not None:
            eta = eta + np.einsum("np,np->n", moves, j)
        ordered = np.partition(bring_back(eta, est.further_root(design)), [first, last])
        low[g], high[g] = ordered[first], ordered[last]
    return low, high


def _own_errors(est: Estimate, some: Ints, moves: Array | None) -> Callable[[Array, Array], Array]:
    """The map from the chosen rows' linear predictors, and roots of weights, to y, each with its own left-out error."""
    link = est.remedy.left
    if not isinstance(link, Link):
        error = est.left_out_residual[some]
        return lambda eta, root: est.scale.inverse(eta + error / root, est.c)
    own = est.eta[some]
    if moves is not None:
        own = own + np.einsum("np,np->n", moves, est.residual_jacobian[some])
    y, mu, before = est.rows.y[some], link.mean(own), est.rows.root_weight[some]
    return lambda eta, root: further_values(est, link.mean(eta), mu, y, root / before)
