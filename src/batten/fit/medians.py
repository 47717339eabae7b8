"""The median residual that turns a linear predictor into a median of y, and how it moves.

Leaving rows out one by one is no guide to the error of a median (Efron 1982, section 3.4), so it is had from the
density at the median: each row's influence is sign(e - median) / (2 f(median)), and a change of the parameters moves
the median as it moves the residuals near it. Densities by a normal kernel (Silverman 1986).
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from batten.engine.rows import Array
from batten.fit.estimate import Estimate

__all__ = ["Middle", "middle"]


@dataclass(frozen=True, eq=False)
class Middle:
    """value: median of the residuals, or of y / mu for a link. slope (P,): its change with the parameters.
    influence (n,): of each row.
    """

    value: float
    slope: Array
    influence: Array

    def moved(self, move: Array) -> Array:
        """The median when the parameters have moved by move (R, P): (R,)."""
        return np.asarray(self.value + move @ self.slope)


def middle(est: Estimate) -> Middle:
    """The middle of an estimate's residuals (fitting scale), or of its ratios y / mu."""
    pull = est.residual_jacobian
    if est.link is None:
        e, change = est.residual, -pull
    else:
        mu = np.maximum(est.mu, 1e-300)
        ratio = est.rows.y / mu
        e = 1 + est.rows.weigh(ratio - 1)  # that of a row of average weight
        change = -est.rows.weigh(ratio * est.link.mean_slope(est.eta) / mu)[:, None] * pull
    value = float(np.median(e))
    spread = float(np.std(e)) or 1.0
    quartiles = float(np.subtract(*np.quantile(e, [0.75, 0.25]))) / 1.349
    width = 0.9 * (min(spread, quartiles) or spread) * est.n ** (-0.2)
    kernel = np.exp(-0.5 * ((e - value) / width) ** 2)
    density = float(kernel.mean()) / (width * np.sqrt(2 * np.pi))
    return Middle(value, kernel @ change / kernel.sum(), np.sign(e - value) / (2 * density))
