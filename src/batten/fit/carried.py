"""Whether one row carries the correction that brings a transformed fit back to means.

With heavy right tails the average of g(eta + e) hangs on its largest term, and no interval for it can be trusted.
"""

from __future__ import annotations

import numpy as np

from batten.fit.estimate import Estimate

__all__ = ["CARRIES", "carried", "no_mean_interval"]

#: largest share of the average that one row may supply, where an even share is well below it
CARRIES = 0.10
#: with few rows every row supplies much: this many even shares are allowed
EVEN_SHARES = 3.0


def carried(est: Estimate) -> tuple[int, float] | None:
    """The row that supplies most of the average of g(eta + e) at the middle of the fit, and its share of it.

    None where means need no correction.
    """
    if est.link is not None or est.scale.closed == "identity":
        return None
    with np.errstate(all="ignore"):
        lifted = np.abs(est.scale.inverse(np.median(est.eta) + est.residual, est.c))
    total = float(lifted.sum())
    if not (np.isfinite(total) and total > 0):
        return None
    row = int(np.argmax(lifted))
    return row, float(lifted[row]) / total


def no_mean_interval(est: Estimate) -> str:
    """Why no interval is given for a mean of this fit, or ""."""
    found = carried(est)
    if found is None or found[1] <= max(CARRIES, EVEN_SHARES / est.n):
        return ""
    return f"no interval for a mean: one row supplies too much of the correction back from {est.scale.key}"
