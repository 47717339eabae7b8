"""A remedy: a response scale or link, a predictor shape, and whether errors are weighted. And the default grid."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass

import numpy as np

from batten.errors import keys as key_errors
from batten.families import keys
from batten.families.base import Array, Link, Scale, Shape

__all__ = ["FAMILIES", "Remedy", "default_grid", "expand", "parse"]

#: names that `only` accepts besides keys
FAMILIES = (
    "ladder", "powers", "polynomials", "fractional", "groups", "hinges", "splines", "smooth", "links", "shares",
    "curves", "weighted",
)  # fmt: skip

#: response forms x predictor forms of the default grid
_DEFAULT: tuple[tuple[str, str], ...] = (
    ("y, log y, sqrt y, 1/y, boxcox y", "x, log x, sqrt x, 1/x, x^2"),
    ("y, log y", "x^p, fp1 x, bins5 x, hinge x, smooth x, spline3 x, spline4 x, spline5 x"),
    ("y, log y, sqrt y", "poly2 x, poly3 x"),
    ("loglink y, share y", "x, log x, spline4 x"),
    ("loglink-gamma y, loglink-gaussian y", "x, log x"),
    ("y", "exponential x, power x, level-exp x, level-hyp x, s-curve x"),
    ("weighted y", "x"),
)


@dataclass(frozen=True)
class Remedy:
    """One composition of members; `str(remedy)` is its key, and `parse` reads it back."""

    left: Scale | Link
    shape: Shape
    weighted: bool = False

    def __post_init__(self) -> None:
        if self.shape.own_level and self.left.key != "y":
            raise key_errors.curve_needs_plain_response(self.left.key, self.shape.key)

    def __str__(self) -> str:
        return self.key

    @property
    def key(self) -> str:
        return f"{'weighted ' * self.weighted}{self.left.key} ~ {self.shape.key}"

    def words(self, y: str, x: str) -> str:
        """Display name: "straight line", "log of minutes on log of mass", "quadratic in mass, weighted"."""
        if self.left.key == "y":
            name = "straight line" if self.shape.key == "x" else self.shape.words(x)
        else:
            name = f"{self.left.words(y)} on {self.shape.words(x)}"
        return f"{name}, weighted" if self.weighted else name

    @property
    def family(self) -> str:
        """The name for `only` that covers this remedy, one of FAMILIES."""
        if self.weighted:
            return "weighted"
        if isinstance(self.left, Link):
            return self.left.group
        return self.left.group if self.shape.group == "ladder" else self.shape.group

    @property
    def readable(self) -> bool:
        """Whether a reader can be told in one sentence what the model says."""
        return self.left.readable and self.shape.readable

    @property
    def order(self) -> tuple[int, ...]:
        """Place from simple to elaborate; remedies sort by it.

        The rank is that of the more elaborate member. Ladder steps and log links (ranks 0-3) come one-sided first, with
        log-log counted among the one-sided, right after log y. Others come by the elaborate member, then by what stands
        beside it. A weighted remedy follows its unweighted twin.
        """
        left, shape = self.left, self.shape
        rank, other = max(left.rank, shape.rank), min(left.rank, shape.rank)
        elaborate = (left if left.rank > shape.rank else shape).detail if rank >= 4 else 0
        if (left.key, shape.key) == ("log y", "log x"):
            other = 0
        return rank, elaborate, other, left.detail, shape.detail, int(self.weighted)


def parse(text: str) -> Remedy:
    """The remedy that a key names; `parse(remedy.key) == remedy`.

    Raises UnknownNameError with "did you mean" where a side names no family, InputError where its numbers do not fit.
    """
    weighted, left, right = keys.split(text)
    return Remedy(keys.read_left(left, text), keys.read_right(right, text), weighted)


def default_grid(y: Array, x: Array, *, zero_is_arbitrary: bool) -> tuple[Remedy, ...]:
    """The remedies tried unless others are asked for, from simple to elaborate; `refuse` tells later which can be used.

    y, x: the rows' response and focal predictor (n,). zero_is_arbitrary: x is a date, a year or a temperature, so
    roots, logs and powers of it are left out.
    """
    positive = bool(np.min(y) > 0)
    share = bool(np.min(y) >= 0 and np.max(y) <= 1)
    chosen = [remedy if positive else _for_any_sign(remedy) for remedy in _full_grid()]
    return tuple(
        remedy
        for remedy in sorted(chosen, key=lambda r: r.order)
        if not (zero_is_arbitrary and remedy.shape.needs_zero) and (share or remedy.family != "shares")
    )


def expand(only: str | Iterable[str], grid: Sequence[Remedy]) -> tuple[Remedy, ...]:
    """The remedies that `only` names, from simple to elaborate, each once.

    A family's name stands for its members in `grid`; where the grid has none (shares of a response beyond 0 to 1), for
    the members it would have, so that their refusal can be read. Any other name is a key.
    """
    chosen: list[Remedy] = []
    for name in [only] if isinstance(only, str) else only:
        if name in FAMILIES:
            chosen += [r for r in grid if r.family == name] or [r for r in _full_grid() if r.family == name]
        elif "~" in name:
            chosen.append(parse(name))
        else:
            raise key_errors.unknown_remedy(name, FAMILIES)
    return tuple(sorted(dict.fromkeys(chosen), key=lambda r: r.order))


def _full_grid() -> list[Remedy]:
    return [
        parse(f"{left} ~ {right}")
        for lefts, rights in _DEFAULT
        for left in lefts.split(", ")
        for right in rights.split(", ")
    ]


def _for_any_sign(remedy: Remedy) -> Remedy:
    """Yeo-Johnson in the place of Box-Cox, where y has zeros or negatives."""
    return parse(f"yeojohnson y ~ {remedy.shape.key}") if remedy.left.key == "boxcox y" else remedy
