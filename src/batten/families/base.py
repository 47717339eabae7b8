"""The contracts that every family keeps.

A remedy learns a few numbers from the data, turns columns into design columns, and brings predictions back to the
analyst's units. A *scale* transforms the response and back; a *shape* turns the focal predictor into design columns; a
*link* models the mean of the response itself. Members are frozen: what they learn is returned as a tuple of floats
(`state`, fixed by the predictor alone; `theta`, searched with the response; `c`, the scale's constants) and handed
back on every later call.
"""

from __future__ import annotations

from abc import ABC, abstractmethod
from dataclasses import dataclass
from typing import ClassVar, Literal

import numpy as np
import numpy.typing as npt

from batten.errors import Refusal

Array = npt.NDArray[np.float64]
Bools = npt.NDArray[np.bool_]
Constants = tuple[float, ...]

__all__ = ["Array", "Bools", "Code", "Constants", "Link", "Scale", "Shape"]


@dataclass(frozen=True)
class Code:
    """How a member is written in a standalone script.

    constants: (NAME, literal, comment) lines that open the script.
    helper: source of a module-level function, or "".
    columns: (plain column name, numpy expression in `x`) for shapes; one ("z", expression in `y`) for scales.
    inverse: numpy expression in `z` that returns the response (scales and links), or "".
    check: (numpy condition on `y` or `x` that must hold, words if it does not) or None.
    """

    columns: tuple[tuple[str, str], ...]
    constants: tuple[tuple[str, str, str], ...] = ()
    helper: str = ""
    inverse: str = ""
    check: tuple[str, str] | None = None


class Scale(ABC):
    """A response scale z = T(y; c), strictly monotone where it is defined."""

    family: ClassVar[str]
    #: names of constants estimated by maximum likelihood ("lambda",), or () when all are fixed
    searched: tuple[str, ...] = ()
    #: how a difference on this scale reads in units of y
    reading: ClassVar[Literal["difference", "ratio", "none"]] = "none"
    #: closed form of the mean over residuals of g(eta + e): "identity", "exp", "square", or "" for the general average
    closed: ClassVar[Literal["identity", "exp", "square", ""]] = ""
    #: False where a change of the units of y changes the answer (log1p, asinh, Yeo-Johnson)
    unit_free: ClassVar[bool] = True
    #: name for `only` where the shape does not decide it: "ladder", or "powers" where lambda is searched
    group: ClassVar[str] = "ladder"
    #: place in the order from simple to elaborate, and the place among members of the same rank
    rank: ClassVar[int] = 0
    detail: ClassVar[int] = 0
    #: whether a reader can be told in one sentence what the model says
    readable: ClassVar[bool] = True

    @property
    @abstractmethod
    def key(self) -> str:
        """Left-hand side of the remedy's key, "log y"."""

    def read(self, word: str, numbers: Constants | None) -> Scale | None:
        """The member that is written `word(numbers) y`, or None when the word is another family's."""
        return self if numbers is None and word == self.key.removesuffix(" y") else None

    @abstractmethod
    def words(self, y: str) -> str:
        """Display name, "log of minutes"."""

    def takes(self, y: Array) -> Bools:
        """Which responses (n,) lie in the domain; the rows that do not are those `refuse` counts."""
        return np.ones(len(y), dtype=bool)

    @abstractmethod
    def refuse(self, y: Array) -> Refusal | None:
        """Why these responses (n,) cannot take the scale, or None."""

    @abstractmethod
    def forward(self, y: Array, c: Constants) -> Array:
        """T(y; c), any shape."""

    @abstractmethod
    def inverse(self, z: Array, c: Constants) -> Array:
        """g(z; c) in units of y. Outside `limits`: the end of y's domain that lies there (0 for a square root below
        zero, infinite for a reciprocal at or below zero), so that interval ends keep their meaning."""

    @abstractmethod
    def inverse_slope(self, z: Array, c: Constants) -> Array:
        """g'(z; c); outside `limits` 0 where the inverse is clipped and NaN where it is infinite."""

    @abstractmethod
    def log_jacobian(self, y: Array, c: Constants) -> Array:
        """log |T'(y; c)| per row."""

    def limits(self, c: Constants) -> tuple[float, float]:
        """Open interval of z that can be inverted."""
        return -np.inf, np.inf

    def learn(self, y: Array) -> Constants:
        """Constants that are fixed by y alone (not searched): a given lambda, the sign of y; () for most members."""
        return ()

    def search(self) -> tuple[float, float]:
        """Range of the searched constant."""
        return -3.0, 3.0

    @abstractmethod
    def code(self, y: str, c: Constants) -> Code:
        """The scale in a script; `y` is how the response is called in comments."""


class Shape(ABC):
    """A shape of the focal predictor: x (n,) -> design columns (n, k)."""

    family: ClassVar[str]
    #: names of constants searched by variable projection ("break",), or ()
    searched: tuple[str, ...] = ()
    #: True for known curves, which bring their own level: the intercept is left out of the other columns
    own_level: ClassVar[bool] = False
    #: True where columns are steps, so that slopes are undefined
    steps: ClassVar[bool] = False
    #: True where the sign and size of x's own zero matters (roots, logs, powers, reciprocals)
    needs_zero: ClassVar[bool] = False
    #: what the curve does beyond the data: "straight", "flat", "bends on", "levels off"
    tail: ClassVar[str] = "straight"
    #: True where `candidates` are all the values the searched constants can take (nothing to refine)
    finite: ClassVar[bool] = False
    #: True where the searched constant is a place along x, so that the residual sum of squares has a corner at each row
    corners: ClassVar[bool] = False
    #: name for `only`: "ladder", "powers", "polynomials", "groups", ...
    group: ClassVar[str] = "ladder"
    #: place in the order from simple to elaborate, and the place among members of the same rank
    rank: ClassVar[int] = 0
    detail: ClassVar[int] = 0
    #: whether a reader can be told in one sentence what the model says
    readable: ClassVar[bool] = True

    @property
    @abstractmethod
    def key(self) -> str:
        """Right-hand side of the remedy's key, "spline4 x"."""

    def read(self, word: str, numbers: Constants | None) -> Shape | None:
        """The member that is written `word(numbers) x`, or None when the word is another family's."""
        return self if numbers is None and word == self.key.removesuffix(" x") else None

    def constant_words(self, x: str, y: str) -> tuple[str, ...]:
        """What each searched constant means, "mass_kg at half of the ceiling"."""
        return self.searched

    @abstractmethod
    def words(self, x: str) -> str:
        """Display name, "quadratic in mass"."""

    def takes(self, x: Array) -> Bools:
        """Which predictor values (n,) lie in the domain; the rows that do not are those `refuse` counts."""
        return np.ones(len(x), dtype=bool)

    @abstractmethod
    def refuse(self, x: Array) -> Refusal | None:
        """Why these predictor values (n,) cannot take the shape, or None."""

    def learn(self, x: Array, *, constant: bool = True) -> Constants:
        """Constants fixed by x alone: knots, edges, centre. `constant`: whether a constant is in the span."""
        return ()

    def candidates(self, x: Array, state: Constants) -> Array:
        """Grid (K, q) of starting values for the searched constants."""
        return np.empty((1, 0))

    def bounds(self, x: Array, state: Constants) -> tuple[Array, Array]:
        """Lower and upper limits (q,) of the searched constants."""
        return np.empty(0), np.empty(0)

    @abstractmethod
    def columns(self, x: Array, state: Constants, theta: Constants = ()) -> Array:
        """Design columns (n, k); NaN in rows where x is missing or outside the shape's domain."""

    @abstractmethod
    def slopes(self, x: Array, state: Constants, theta: Constants = ()) -> Array:
        """d columns / dx, (n, k); NaN for steps."""

    def theta_slopes(self, x: Array, state: Constants, theta: Constants) -> Array:
        """d columns / d theta, (q, n, k)."""
        return np.empty((0, len(x), self.columns(x[:1], state, theta).shape[1]))

    def cuts(self, state: Constants, theta: Constants = ()) -> Constants | None:
        """Places (knots, edges, breaks) between which every column is a cubic in x or less; None for other shapes.

        A step belongs to the cell on its right: the cell of a cut starts at the cut.
        """
        return None

    def penalty(self, state: Constants) -> Array | None:
        """Roughness penalty (k, k) on the coefficients of the columns, its amount left to the engine; None for none."""
        return None

    @abstractmethod
    def names(self, x: str, state: Constants, theta: Constants = ()) -> list[str]:
        """Plain label of each column, "mass_kg squared"."""

    @abstractmethod
    def code(self, x: str, state: Constants, theta: Constants = ()) -> Code:
        """The shape in a script; `x` is how the predictor is called in comments, expressions use the name `x`."""


class Link(ABC):
    """A model of the mean of y itself: mu = g(eta)."""

    family: ClassVar[str]
    searched: tuple[str, ...] = ()
    #: "ratio" where means are above zero and errors are a share of them, so that new rows are ratios to the mean
    reading: ClassVar[Literal["difference", "ratio", "none"]] = "ratio"
    #: whether a difference of the linear predictor is then a ratio of means too
    multiplies: ClassVar[bool] = True
    #: name for `only`
    group: ClassVar[str] = "links"
    #: place in the order from simple to elaborate, and the place among members of the same rank
    rank: ClassVar[int] = 3
    detail: ClassVar[int] = 0
    readable: ClassVar[bool] = True

    @property
    @abstractmethod
    def key(self) -> str: ...

    def read(self, word: str, numbers: Constants | None) -> Link | None:
        """The member that is written `word(numbers) y`, or None when the word is another family's."""
        return self if numbers is None and word == self.key.removesuffix(" y") else None

    @abstractmethod
    def words(self, y: str) -> str: ...

    def takes(self, y: Array) -> Bools:
        """Which responses (n,) lie in the domain; the rows that do not are those `refuse` counts."""
        return np.ones(len(y), dtype=bool)

    @abstractmethod
    def refuse(self, y: Array) -> Refusal | None: ...

    @abstractmethod
    def mean(self, eta: Array) -> Array:
        """mu = g(eta)."""

    @abstractmethod
    def mean_slope(self, eta: Array) -> Array:
        """d mu / d eta."""

    @abstractmethod
    def variance(self, mu: Array) -> Array:
        """Working variance function V(mu)."""

    @abstractmethod
    def deviance(self, y: Array, mu: Array) -> Array:
        """Deviance contribution per row."""

    @abstractmethod
    def start(self, y: Array) -> Array:
        """Starting eta (n,)."""

    @abstractmethod
    def log_likelihood(self, y: Array, mu: Array) -> float | None:
        """Maximised log-likelihood in units of y, or None for a pseudo-likelihood."""

    @abstractmethod
    def code(self, y: str) -> Code:
        """The link in a script; `inverse` is the mean as an expression in `z`."""
