"""Held-out scores of `weighted` remedies: the change of spread is learned again in every training set."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from batten.compare.losses import Split, log_t, losses
from batten.engine.linear import factor
from batten.engine.rows import Array
from batten.engine.sets import BLOCK, masks
from batten.engine.spread import learn_spread
from batten.engine.threads import MANY_ROWS
from batten.fit.estimate import Estimate
from batten.fit.guard import meets_constant
from batten.fit.searched import weighted_design
from batten.fit.spread import driver, given_rows, unit_of

__all__ = ["spread_losses"]


def spread_losses(est: Estimate, sets: Sequence[Split]) -> Array | str:
    """Squared and absolute error, share within 10% and log score (4, S); or what failed: "fewer" or "rank"."""
    rows, shape = given_rows(est), est.shape
    states = [shape.learn(split.sorted_x, constant=meets_constant(rows, shape)) for split in sets]
    shared = all(state == est.state for state in states)
    out = np.empty((4, len(sets)))
    # with many rows one set at a time stays near the processor
    block = max(1, BLOCK // (4 * rows.count)) if shared and rows.count <= MANY_ROWS else 1
    whole = factor(weighted_design(rows, shape, est.state, ())).q if shared else None
    for first in range(0, len(sets), block):
        some = sets[first : first + block]
        q = whole
        if q is None:
            design = weighted_design(rows, shape, states[first], ())
            if design.shape[1] != len(est.coef):
                return "fewer"
            q = factor(design).q
        found = _block(est, q, some)
        if found is None:
            return "rank"
        out[:, first : first + block] = found
    return out


def _block(est: Estimate, q: Array, sets: Sequence[Split]) -> Array | None:
    """The same for some sets that share the basis q (n, p) of their columns, rows times sqrt(given weights)."""
    assert est.spread is not None
    rows, positive = given_rows(est), est.spread.positive
    y, given, z = rows.y, rows.root_weight, rows.weigh(rows.y)
    units = np.array([[unit_of(y[split.train], positive=positive)] for split in sets])
    u = driver(units, positive=positive)
    mask = masks(rows.count, [split.test for split in sets])
    found = learn_spread(q, z, lambda eta: u(eta / given), mask, start=est.spread.power)
    if not found.settled.all():
        return None
    out = np.empty((4, len(sets)))
    for s, split in enumerate(sets):
        train, test = split.train, split.test
        mean, root = found.eta[s] / given, found.root[s]
        residual = (root * (z - found.eta[s]))[train]
        held = q[test] * root[test, None]
        v = np.einsum("ij,jk,ik->i", held, found.inverse[s], held)
        error = (root * (z - found.eta[s]))[test]
        score = log_t(error[None], (residual[None] ** 2).sum(axis=1), v[None], np.array([len(train) - q.shape[1]]))[0]
        # the median is that of a row of average weight, as in a fit
        shift = np.median(residual) / np.sqrt(np.mean((root * given)[train] ** 2))
        out[:3, s] = losses(y[test], mean[test], mean[test] + shift, rows.weights, test)
        out[3, s] = (score + np.log(root[test] * given[test])).mean()
    return out
