"""Many covariate rows pooled into a few narrow classes, so that a curve averaged over them can be asked at many x.

Rows of equal modifiers are ordered by what their covariates add to the linear predictor and cut into classes, each at
its own mean. Along a smooth inverse the error is of second order in a class's width: with a thousand classes a few
hundred-thousandths of the mean, far below its own error.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from batten.engine.rows import Array
from batten.fit.estimate import Estimate
from batten.fit.means import means_at_rows

__all__ = ["Classes", "covariate_classes"]

#: up to this many rows are kept as they are
WHOLE = 3_000
#: classes that more rows are pooled into
CLASSES = 1_000
#: modifiers with more different rows than this are pooled as if they were covariates
MODIFIERS = 50


@dataclass(frozen=True, eq=False)
class Classes:
    """base (k, q), modifier (k, m), weights (k,) summing to one. own: they stand for the estimate's own rows."""

    base: Array
    modifier: Array
    weights: Array
    own: bool

    def spread(self, est: Estimate, xs: Array, *, of: str) -> Array:
        """Variance (G,) of a mean over covariates that are a sample themselves; zero for covariates that are given."""
        if not self.own:
            return np.zeros(len(xs))
        out = np.empty(len(xs))
        for g, x in enumerate(xs):
            at = np.full(len(self.base), float(x))
            value = means_at_rows(est, at, self.base, self.modifier, of=of, root=False).value
            out[g] = self.weights @ (value - self.weights @ value) ** 2 / est.n
        return out


def covariate_classes(est: Estimate, base: Array | None, modifier: Array | None) -> Classes | None:
    """Classes of the covariate rows asked for (the estimate's own by default); None where they are few enough."""
    own = base is None or modifier is None
    base, modifier = (est.rows.base, est.rows.modifier) if base is None or modifier is None else (base, modifier)
    if len(base) <= WHOLE:
        return None
    middle = np.full(len(base), float(np.median(est.rows.x)))
    eta = est.design_at(middle, base, modifier) @ est.coef
    kinds, which = np.unique(modifier, axis=0, return_inverse=True)
    if len(kinds) > MODIFIERS:
        which = np.zeros(len(base), dtype=np.intp)
    order = np.lexsort((eta, which.ravel()))
    edges = np.unique(np.concatenate([
        np.linspace(0, len(base), CLASSES + 1).astype(np.intp)[:-1],
        np.flatnonzero(np.diff(which.ravel()[order], prepend=-1)),
    ]))  # fmt: skip
    counts = np.diff(np.append(edges, len(base))).astype(float)
    pooled_base, pooled_modifier = (
        np.add.reduceat(part[order], edges, axis=0) / counts[:, None] for part in (base, modifier)
    )  # fmt: skip
    return Classes(pooled_base, pooled_modifier, counts / len(base), own)
