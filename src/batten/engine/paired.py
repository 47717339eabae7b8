"""Is one remedy's held-out error really smaller than another's?"""

from __future__ import annotations

import numpy as np

from batten.engine.rows import Array

__all__ = ["corrected_se"]


def corrected_se(d: Array, folds: int) -> float:
    """Standard error of the mean of paired loss differences d (J,) over the splits of (repeated) K-fold validation.

    sqrt(var(d) (1/J + 1/(K - 1))): training sets overlap, so splits are not independent and var(d)/J is too small
    (Nadeau and Bengio 2003). Use with t on J - 1. A correction, not an unbiased estimate: none exists (Bengio and
    Grandvalet 2004). NaN below two splits.
    """
    if len(d) < 2:
        return float("nan")
    return float(np.sqrt(np.var(d, ddof=1) * (1 / len(d) + 1 / (folds - 1))))
