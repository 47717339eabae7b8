"""One check of a fit: what was asked, what was found, in units a reader can weigh; and what the checks work on."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Literal

import numpy as np

from batten.diagnose.span import basis, outside
from batten.diagnose.tests_of_shape import AddOn, add_on, add_on_robust
from batten.effects.numbers import show
from batten.effects.tell import Names
from batten.engine.rows import Array, Ints
from batten.fit.estimate import Estimate

__all__ = [
    "CHANCE", "About", "Check", "Tested", "Working", "added", "added_check", "added_t", "chance", "plain_scale",
    "working",
]  # fmt: skip

About = Literal["shape", "scale", "spread", "rows"]

#: below this p, a difference is called more than chance
CHANCE = 0.05


@dataclass(frozen=True)
class Tested:
    """kind: "F", "t", "chi-square" or "Durbin-Watson d"; df: one or two degrees of freedom, () where it has none."""

    kind: str
    statistic: float
    df: tuple[int, ...]
    p: float


@dataclass(frozen=True)
class Check:
    """name, what it is about, what was asked, size in `unit`, reading in words, and the test where there is one.

    row: position of the row the reading is about; "{row}" in the reading stands for its label.
    """

    name: str
    about: About
    asked: str
    size: float
    unit: str
    reading: str
    test: Tested | None = None
    row: int | None = None

    @property
    def p(self) -> float:
        return math.nan if self.test is None else self.test.p


@dataclass(frozen=True, eq=False)
class Working:
    """The fit as least squares with errors of one variance, rows times `root` (n,).

    X (n, k): effective design (coefficients, then what the searched constants of the shape pull). q (n, k): its basis.
    z (n,): response; e (n,): residuals. lean: what one unit of them is in y, at the middle of the fit.
    """

    X: Array
    q: Array
    z: Array
    e: Array
    root: Array
    lean: float
    cluster: Ints | None


def working(est: Estimate) -> Working:
    """A scale is on its own scale already; a link is at the working response of its last step."""
    rows = est.rows
    root, e, lean = rows.root_weight, est.residual, 1.0
    if est.link is not None:
        spread = np.sqrt(est.link.variance(est.mu))
        e, lean = rows.weigh(est.residual / spread), float(np.median(spread))
        root = rows.weigh(est.link.mean_slope(est.eta) / spread)
    elif est.scale.closed != "identity":
        slope = np.abs(est.scale.inverse_slope(est.eta, est.c))
        lean = float(np.median(slope[np.isfinite(slope)]))
    X = est.jacobian_at(rows.x, rows.base, rows.modifier)[:, : len(est.coef) + est.moving] * root[:, None]
    return Working(X, est.factored.q, e + est.eta * root, e, root, lean, rows.cluster)


def plain_scale(est: Estimate) -> bool:
    """Whether the fit is of y itself by least squares."""
    return est.link is None and est.scale.closed == "identity"


def chance(p: float) -> str:
    return "more than chance would give" if p < CHANCE else "no more than chance would give"


def added(work: Working, extra: Array, *, errors: str, X0: Array | None = None) -> AddOn | None:
    """What columns (n, k), not yet times `root`, add to the design (or to X0), with the errors in use."""
    columns, X0 = extra * work.root[:, None], work.q if X0 is None else X0
    if errors == "robust":
        return add_on_robust(X0, columns, work.z, cluster=work.cluster)
    return add_on(X0, columns, work.z)


def added_t(work: Working, column: Array, *, errors: str, X0: Array | None = None) -> tuple[AddOn, Tested] | None:
    """The same for one column (n,), as a t whose sign is that of its coefficient."""
    found = added(work, column[:, None], errors=errors, X0=X0)
    if found is None:
        return None
    new = outside(basis(work.q if X0 is None else X0), column * work.root)
    t = float(np.sign(new @ work.z)) * math.sqrt(found.statistic)
    return found, Tested("t", t, found.df[1:], found.p)


def added_check(
    name: str, about: About, asked: str, found: AddOn | None, work: Working, names: Names, *, more: str = ""
) -> Check | None:
    """The size is the largest difference that the columns make to a fitted value. more: words put at the end."""
    if found is None:
        return None
    size = found.gap_max * work.lean
    reading = f"the two fits differ by up to {show(size, names.y_unit)}, {chance(found.p)}{more}"
    return Check(name, about, asked, size, names.y_unit, reading, Tested("F", found.statistic, found.df, found.p))
