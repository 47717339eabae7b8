"""`weighted`: the response itself by weighted least squares, with weights learned from how its spread changes."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace
from typing import TYPE_CHECKING

import numpy as np

from batten.engine.linear import Factored
from batten.engine.rows import Array, Rows
from batten.engine.spread import LearnedSpread, learn_spread
from batten.errors import Refusal

if TYPE_CHECKING:
    from batten.fit.estimate import Estimate

__all__ = ["Spread", "driver", "given_rows", "learn", "unit_of"]

#: fitted values below this share of the middle response count as that much
FLOOR = 0.05


@dataclass(frozen=True, eq=False)
class Spread:
    """What was learned: a row's SD is proportional to exp(power * u(f)), f its fitted value by plain least squares.

    u(f) = log(max(f, unit)) where every response is positive, else f / unit. first (p,): plain coefficients.
    centre: the part of u that makes the average weight one. error: standard error of the power. given: the rows'
    own weights (n,) before these, or None.
    """

    power: float
    error: float
    positive: bool
    unit: float
    centre: float
    first: Array
    given: Array | None

    def root(self, design: Array) -> Array:
        """Root of the weight (k,) of rows with this design (k, p), that of an average row being one."""
        u = driver(self.unit, positive=self.positive)(design @ self.first)
        return np.asarray(np.exp(-self.power * (u - self.centre)))


def driver(unit: float | Array, *, positive: bool) -> Callable[[Array], Array]:
    """The function u of the fitted value; unit: one, or a column of one per training set."""
    if positive:
        return lambda f: np.log(np.maximum(f, unit))
    return lambda f: f / unit


def unit_of(y: Array, *, positive: bool) -> float:
    """Where u stops falling, or what f is measured in: learned from training responses."""
    return FLOOR * float(np.median(y)) if positive else float(np.std(y))


def learn(rows: Rows, linear: Factored) -> tuple[Rows, Spread] | Refusal:
    """The rows with learned weights, and what was learned; linear: QR of the design, rows times sqrt(given weights)."""
    positive = bool((rows.y > 0).all())
    unit = unit_of(rows.y, positive=positive)
    given = rows.root_weight
    u = driver(unit, positive=positive)
    found = learn_spread(linear.q, rows.weigh(rows.y), lambda eta: u(eta / given), np.ones((1, rows.count)))
    if not found.settled[0]:
        return not_learned(found)
    learned = (given * found.root[0]) ** 2
    average = float(learned.mean())
    power = float(found.power[0])
    centre = float(found.centre[0]) - (0.5 * np.log(average) / power if power else 0.0)
    spread = Spread(
        power, float(found.error[0]), positive, unit, centre, linear.root @ found.first[0], rows.weights
    )  # fmt: skip
    return replace(rows, weights=learned / average), spread


def not_learned(found: LearnedSpread) -> Refusal:
    return Refusal(
        "The change of spread cannot be learned from these rows.",
        f"Its power runs to {found.power[0]:.3g}: a few rows may lie almost on the curve.",
        "Robust errors (the default), or log y where the spread grows with the level.",
    )


def given_rows(est: Estimate) -> Rows:
    """The estimate's rows with the weights they came with."""
    return est.rows if est.spread is None else replace(est.rows, weights=est.spread.given)
