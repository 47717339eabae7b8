"""A published curve read from its formula, differentiated without loss, and laid out for variable projection."""

from __future__ import annotations

import ast
import re
from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from functools import cached_property
from itertools import combinations
from types import CodeType

import numpy as np
from case_tables import NotDelivered

from batten.engine.search import Searched

__all__ = ["Layout", "Written"]

Array = np.ndarray

_FUNCTIONS = {
    "exp": np.exp, "log": np.log, "sqrt": np.sqrt, "arctan": np.arctan, "atan": np.arctan, "cos": np.cos,
    "sin": np.sin, "pi": np.pi,
}  # fmt: skip
#: complex steps this small lose no digits (Squire and Trapp 1998)
_STEP = 1e-30


@dataclass(frozen=True, eq=False)
class Written:
    """A curve as published: an expression in columns and parameters. data: the columns it uses, each (n,)."""

    text: str
    data: Mapping[str, Array]

    @classmethod
    def read(cls, expression: str, frame: Mapping[str, Array]) -> Written:
        """One side of a formula."""
        text = expression.strip().replace("^", "**").replace("np.", "")
        names = [n.id for n in ast.walk(ast.parse(text, mode="eval")) if isinstance(n, ast.Name)]
        return cls(text, {name: np.asarray(frame[name], float) for name in names if name in frame})

    @cached_property
    def parameters(self) -> tuple[str, ...]:
        """In the order in which they are written."""
        found = re.findall(r"[A-Za-z_]\w*", self.text)
        return tuple(dict.fromkeys(n for n in found if n not in self.data and n not in _FUNCTIONS))

    def value(self, b: Array) -> Array:
        """The curve at every row (n,); b may be complex."""
        names = {**_FUNCTIONS, **self.data, **dict(zip(self.parameters, b, strict=True))}
        with np.errstate(all="ignore"):
            out = eval(self._code, {"__builtins__": {}}, names)
        return np.broadcast_to(out, next(iter(self.data.values())).shape)

    @cached_property
    def _code(self) -> CodeType:
        return compile(self.text, "curve", "eval")

    def jacobian(self, b: Array) -> Array:
        """d value / d b (n, p)."""
        columns = []
        for j in range(len(b)):
            step = _STEP * (abs(b[j]) or 1.0)
            moved = np.array(b, complex)
            moved[j] += 1j * step
            columns.append(self.value(moved).imag / step)
        return np.column_stack(columns)

    def somewhere(self, count: int) -> Iterator[Array]:
        """Parameter values of either sign, of sizes at which products with the columns' powers stay moderate."""
        rng = np.random.default_rng(5)
        usual = float(np.median(np.abs(np.concatenate(list(self.data.values()))))) or 1.0
        for _ in range(count):
            size = usual ** -rng.integers(0, 3, len(self.parameters)).astype(float)
            yield size * np.exp(rng.normal(-0.5, 0.5, len(size))) * rng.choice([-1, 1], len(size))

    @cached_property
    def linear(self) -> tuple[int, ...]:
        """Positions of parameters that the curve is linear in, all at once; () if none."""
        places = list(self.somewhere(40))
        chosen: list[int] = []
        for j in range(len(self.parameters)):
            if all(self._keeps_slopes([*chosen, j], b) for b in places):
                chosen.append(j)
        for b in places:
            b[chosen] = 0
        offset = [np.abs(self.value(b)).max() for b in places]
        if chosen and np.nanmax(offset) > 1e-12:
            raise NotDelivered("a part of the curve has no free multiplier, which variable projection needs")
        return tuple(chosen)

    def _keeps_slopes(self, which: list[int], b: Array) -> bool:
        """Whether slopes in some parameters stay the same when these are changed."""
        moved = b.copy()
        moved[which] *= np.linspace(1.3, 2.1, len(which))
        one, two = self.jacobian(b)[:, which], self.jacobian(moved)[:, which]
        sizes = np.abs(np.stack([one, two]))
        # beyond these sizes the imaginary parts run out of range
        usable = (np.isfinite(sizes) & (sizes < 1e100) & ((sizes > 1e-100) | (sizes == 0))).all(axis=0)
        one, two = one[usable], two[usable]
        return bool((np.abs(one - two) <= 1e-9 * np.maximum(np.abs(one), np.abs(two))).all())


@dataclass(frozen=True, eq=False)
class Layout:
    """Which published parameters are searched, and how columns are made from the others.

    held: for a curve without a linear parameter, the group whose common multiple is a multiplier of the whole curve
    (both parts of a denominator): its first member is held and the multiplier is the linear coefficient.
    """

    curve: Written
    linear: tuple[int, ...]
    searched: tuple[int, ...]
    held: tuple[int, ...] = ()
    hold: float = 1.0

    @classmethod
    def of(cls, curve: Written, start: Array | None = None) -> Layout:
        p = len(curve.parameters)
        if curve.linear:
            return cls(curve, curve.linear, tuple(j for j in range(p) if j not in curve.linear))
        held = _divisors(curve)
        if not held:
            raise NotDelivered("no parameter of the curve is linear")
        searched = tuple(j for j in range(p) if j != held[0])
        return cls(curve, (), searched, held, 1.0 if start is None else float(start[held[0]]))

    def whole(self, theta: Array, coef: Array) -> Array:
        """Published parameters."""
        b = np.empty(len(self.curve.parameters))
        b[[*self.searched]] = theta
        if self.held:
            b[self.held[0]] = self.hold
            b[[*self.held]] /= coef[0]
        else:
            b[[*self.linear]] = coef
        return b

    def theta(self, b: Array) -> Array:
        """Searched constants for published parameters."""
        if self.held:
            b = b.copy()
            b[[*self.held]] *= self.hold / b[self.held[0]]
        return b[[*self.searched]]

    def columns(self, theta: Array) -> Array:
        """(n, k), complex where theta is."""
        b = np.zeros(len(self.curve.parameters), dtype=np.asarray(theta).dtype)
        b[[*self.searched]] = theta
        if self.held:
            b[self.held[0]] = self.hold
            return self.curve.value(b)[:, None]
        out = []
        for j in self.linear:
            b[[*self.linear]] = 0
            b[j] = 1
            out.append(self.curve.value(b))
        return np.column_stack(out)

    def slopes(self, theta: Array) -> Array:
        """(q, n, k)."""
        out = []
        for j in range(len(theta)):
            step = _STEP * (abs(theta[j]) or 1.0)
            moved = np.array(theta, complex)
            moved[j] += 1j * step
            out.append(self.columns(moved).imag / step)
        return np.stack(out)

    def model(self, candidates: Array) -> Searched:
        n, q = len(next(iter(self.curve.data.values()))), len(self.searched)

        def rebuild(which: Array) -> Searched:
            part = Written(self.curve.text, {k: v[which] for k, v in self.curve.data.items()})
            return Layout(part, self.linear, self.searched, self.held, self.hold).model(candidates)

        return Searched(
            fixed=np.empty((n, 0)), columns=lambda t: np.real(self.columns(t)), slopes=self.slopes,
            candidates=candidates, lower=np.full(q, -np.inf), upper=np.full(q, np.inf), rebuild=rebuild,
        )  # fmt: skip


def _divisors(curve: Written) -> tuple[int, ...]:
    """Parameters whose doubling halves the curve; () if there are none."""
    for group in _groups(len(curve.parameters)):
        if all(_halves(curve, group, b) for b in curve.somewhere(10)):
            return group
    return ()


def _halves(curve: Written, group: tuple[int, ...], b: Array) -> bool:
    moved = b.copy()
    moved[[*group]] *= 2
    return bool(np.allclose(curve.value(moved) * 2, curve.value(b), rtol=1e-12, atol=0, equal_nan=True))


def _groups(count: int) -> Iterator[tuple[int, ...]]:
    for size in range(1, count + 1):
        yield from combinations(range(count), size)
