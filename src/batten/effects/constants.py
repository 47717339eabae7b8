"""What a remedy learned besides coefficients: searched constants with their sets, and facts fixed by x alone.

Searched constants have profile sets, which count everything else being refitted; they may come in pieces or run to the
end of what was searched. Knots, edges and centres are chosen from x (or by hand) and have no interval.
"""

from __future__ import annotations

import ast
from dataclasses import dataclass
from typing import Literal

import numpy as np
from scipy.optimize import minimize
from scipy.stats import f as fisher
from scipy.stats import norm as normal

from batten.effects.profile import Profile, profile_of_power, profile_of_shape
from batten.effects.smoothing import curve_freedom, freedom_note
from batten.engine.linear import factor, solve
from batten.engine.rows import Array
from batten.families.base import Code, Constants
from batten.families.shapes.hinge import Hinge
from batten.fit.estimate import Estimate
from batten.fit.searched import weighted_design

__all__ = ["Constant", "learned_constants"]

#: more constants of one kind than this are counted, not listed
LISTED = 12

Kind = Literal["power of y", "power of x", "place in x", "curve", "listed", "spread", "fixed"]


@dataclass(frozen=True, eq=False)
class Constant:
    """One learned constant.

    name: in plain words. pieces: every value the data do not rule out; an open end is infinite. named: False where the
    set covers all that was searched, so that no value can be named. profile: how it was found, None for fixed facts.
    position: of the constant among theta, None for a power of y. unit: "", "x", "y", "y per x" or "per x".
    """

    name: str
    kind: Kind
    estimate: float
    pieces: tuple[tuple[float, float], ...] = ()
    note: str = ""
    profile: Profile | None = None
    position: int | None = None

    @property
    def named(self) -> bool:
        return self.kind == "fixed" or not all(np.isinf(end) for end in (self.low, self.high))

    @property
    def low(self) -> float:
        """Lower end of the set, -inf where it is open, NaN for fixed facts."""
        return self.pieces[0][0] if self.pieces else float("nan")

    @property
    def high(self) -> float:
        return self.pieces[-1][1] if self.pieces else float("nan")


def learned_constants(est: Estimate, *, x: str = "x", y: str = "y", level: float = 0.95) -> tuple[Constant, ...]:
    """Searched constants first, then a curve's own coefficients, then fixed facts; x, y: names for the words."""
    searched = _searched(est, x, y, level)
    found = (*searched, *_of_spread(est, y, level), *_curve_levels(est, x, searched, level), *_freedom(est))
    return (*found, *_facts(est, x, y))


def _searched(est: Estimate, x: str, y: str, level: float) -> tuple[Constant, ...]:
    out = []
    if est.remedy.left.searched and est.link is None:
        profile = profile_of_power(est, level=level)
        out.append(_constant(f"power of {y}", "power of y", profile, None))
    words = est.shape.constant_words(x, y) if est.theta else ()
    for j, name in enumerate(words):
        kind = _kind(est, name)
        out.append(_constant(name, kind, profile_of_shape(est, j, level=level), j))
    return tuple(out)


def _of_spread(est: Estimate, y: str, level: float) -> tuple[Constant, ...]:
    """How the spread changes with the mean, where weights were learned from that; a Wald interval, robust to shape."""
    spread = est.spread
    if spread is None:
        return ()
    half = float(normal.ppf(0.5 + level / 2)) * spread.error
    name = f"power of the spread of {y} along its mean"
    note = "0: the same spread everywhere; 1: in proportion to the mean"
    if not spread.positive:
        name = f"growth of the log spread of {y} per {spread.unit:.4g} of its mean"
        note = "0: the same spread everywhere"
    return (Constant(name, "spread", spread.power, ((spread.power - half, spread.power + half),), note),)


def _kind(est: Estimate, name: str) -> Kind:
    if est.shape.finite:
        return "listed"
    if est.shape.own_level:
        return "curve"
    return "place in x" if isinstance(est.shape, Hinge) else "power of x"


def _constant(name: str, kind: Kind, profile: Profile, position: int | None) -> Constant:
    """The profile's set, with open ends infinite, and words where it is no plain interval."""
    if kind == "listed":
        kept = [low for low, _ in profile.pieces]
        alone = len(kept) == 1
        note = "" if alone else f"{_listed(kept)} fit about as well; only these values were tried"
        return Constant(name, kind, profile.best, profile.pieces, note, profile, position)
    pieces = [list(piece) for piece in profile.pieces]
    if profile.open_low:
        pieces[0][0] = -np.inf
    if profile.open_high:
        pieces[-1][1] = np.inf
    notes = []
    if profile.open_low and profile.open_high and len(pieces) == 1:
        notes.append("not identified by these data: every value searched fits about as well")
    elif profile.open_low or profile.open_high:
        ends = {"lower": profile.open_low, "upper": profile.open_high}
        which = " and ".join(side for side, is_open in ends.items() if is_open)
        notes.append(_open_words(kind, which, profile))
    if len(pieces) > 1:
        notes.append(f"the set comes in {len(pieces)} pieces: {_in_words(pieces)}")
    return Constant(name, kind, profile.best, tuple((p[0], p[1]) for p in pieces), "; ".join(notes), profile, position)


def _open_words(kind: Kind, which: str, profile: Profile) -> str:
    if kind == "place in x":
        return f"no {which} end: the set runs to the end of the data where a break can be looked for"
    if kind == "curve":
        return f"no {which} end: not identified by these data"
    end = profile.lower if which == "lower" else profile.upper
    return f"no {which} end: the set runs to the end of what was searched ({end:.6g})"


def _in_words(pieces: list[list[float]]) -> str:
    return " and ".join(f"{low:.4g} to {high:.4g}" for low, high in pieces)


def _listed(values: list[float]) -> str:
    shown = [f"{v:.6g}" for v in values]
    return shown[0] if len(shown) == 1 else f"{', '.join(shown[:-1])} and {shown[-1]}"


def _curve_levels(est: Estimate, x: str, searched: tuple[Constant, ...], level: float) -> tuple[Constant, ...]:
    """A known curve's own coefficients (ceiling, level at the start) with their joint profile sets.

    Held at theta, a coefficient's set is v +- sqrt((limit - RSS) c) with v and c of the linear fit; its profile set is
    the union of these over theta.
    """
    if not (est.shape.own_level and est.moving and est.rows.modifier.shape[1] == 1):
        return ()
    names = est.shape.names(x, est.state, est.theta)
    first = len(est.coef) - len(names)
    limit = float(est.residual @ est.residual) * (1 + fisher.ppf(level, 1, est.df_residual) / est.df_residual)
    loose = any(np.isinf([c.low, c.high]).any() for c in searched)
    out = []
    for k, name in enumerate(names, start=first):
        low, high, note = -np.inf, np.inf, "not identified by these data: it moves with a constant that is not"
        if not loose:
            low, high, note = _reach(est, k, -1.0, limit), _reach(est, k, 1.0, limit), ""
        out.append(Constant(name, "curve", float(est.coef[k]), ((low, high),), note))
    return tuple(out)


def _reach(est: Estimate, k: int, side: float, limit: float) -> float:
    """The farthest value of coefficient k with RSS up to the limit, the other constants free."""
    errors = np.sqrt(np.diagonal(est.covariance("constant")))[len(est.coef) :]
    lower, upper = est.shape.bounds(est.rows.x, est.state)

    def loss(step: Array) -> float:
        theta = np.array(est.theta) + step * errors
        if ((theta < lower) | (theta > upper)).any():
            return np.inf
        X = weighted_design(est.rows, est.shape, est.state, tuple(theta))
        if not np.isfinite(X).all():
            return np.inf
        linear = factor(X)
        if linear.aliased:
            return np.inf
        coef, residual = solve(linear, X, est.z)
        spare = limit - float(residual @ residual)
        if spare < 0:
            return float(-side * est.coef[k] + abs(spare) / limit * 1e3 * abs(est.coef[k]))
        return -side * float(coef[k] + side * np.sqrt(spare * linear.inverse_cross[k, k]))

    found = minimize(
        loss, np.zeros(len(est.theta)), method="Nelder-Mead",
        options={"xatol": 1e-9, "fatol": 1e-12 * max(abs(float(est.coef[k])), 1e-300), "maxiter": 4000},
    )  # fmt: skip
    return float(-side * found.fun)


def _freedom(est: Estimate) -> tuple[Constant, ...]:
    if est.roughness is None:
        return ()
    return (Constant("degrees of freedom of the curve", "fixed", curve_freedom(est)[0], note=freedom_note(est)),)


def _facts(est: Estimate, x: str, y: str) -> tuple[Constant, ...]:
    """Constants of the script that were not searched: knots, edges, centres, bounds, given powers."""
    out = [*_of_code(est.shape.code(x, est.state, est.theta), est.theta)]
    if est.link is None:
        out += _of_code(est.scale.code(y, est.c), est.c if est.remedy.left.searched else ())
    return tuple(out)


def _of_code(code: Code, searched: Constants) -> list[Constant]:
    out = []
    for name, literal, comment in code.constants:
        value = ast.literal_eval(literal)
        values = value if isinstance(value, tuple) else (value,)
        if set(values) <= set(searched):
            continue
        word = name.lower().replace("_", " ")
        if len(values) > LISTED:
            reach = f"from {values[0]:.6g} to {values[-1]:.6g}"
            note = f"{reach}; {comment}; fixed beforehand, no interval"
            out.append(Constant(f"number of {word}", "fixed", float(len(values)), note=note))
            continue
        single = word.removesuffix("s") if isinstance(value, tuple) else word
        for i, number in enumerate(values, start=1):
            label = f"{single} {i}" if isinstance(value, tuple) else single
            out.append(Constant(label, "fixed", float(number), note=f"{comment}; fixed beforehand, no interval"))
    return out
