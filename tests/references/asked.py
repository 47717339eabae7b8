"""One question of a case: a fitted form, with the place and the level that the case gives."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, field

import numpy as np
from case_fits import Fitted
from case_forms import Form
from case_tables import NotDelivered
from scipy import stats

__all__ = ["FORMS", "Asked", "Placed", "Rule"]

#: second models by the names that cases give them: left and right of the remedy's key
FORMS: dict[str, tuple[str, str]] = {
    "linear": ("y", "x"), "quadratic": ("y", "poly2 x"), "quad": ("y", "poly2 x"), "cubic": ("y", "poly3 x"),
    "linlog": ("y", "log x"), "linrecip": ("y", "1/x"), "linsqrt": ("y", "sqrt x"), "sqrtx": ("y", "sqrt x"),
    "loglin": ("log y", "x"), "logy": ("log y", "x"), "loglog": ("log y", "log x"), "sqrty": ("sqrt y", "x"),
    "recipy": ("1/y", "x"), "recip": ("1/y", "1/x"),
}  # fmt: skip


@dataclass(frozen=True, eq=False)
class Asked:
    """fitted: the form the key belongs to. at: column values of the row to predict. x: focal value for slopes."""

    fitted: Fitted
    at: dict[str, float]
    x: float | None = None
    others: dict[tuple[str, str], Fitted] = field(default_factory=dict)

    @property
    def form(self) -> Form:
        return self.fitted.form

    @property
    def t(self) -> float:
        """Quantile for intervals at the case's level."""
        return float(stats.t.ppf(0.5 + self.fitted.level / 2, self.fitted.fit.df_residual))

    def other(self, left: str, right: str) -> Fitted:
        """Another remedy on the same data."""
        return self.others.setdefault((left, right), Fitted(self.form.with_key(left, right), self.fitted.level))

    def named(self, name: str) -> Fitted:
        """The form a case calls so; its own form without a name."""
        if not name:
            return self.fitted
        if name not in FORMS:
            raise NotDelivered(f"no form {name}")
        return self.other(*FORMS[name])

    def predicted(self, column: str, *, of: str = "mean", interval: str | None = None, at: str = "") -> float:
        """estimate, low or high at the given row, or at a focal value with the other columns of the first row."""
        row = self.fitted.row({self.form.focus: float(at)} if at else self.at)
        return float(self.fitted.fit.predict(row, of=of, interval=interval)[column].iloc[0])

    def naive(self, at: str = "") -> float:
        """Back-transformed fit without correction, units of y."""
        eta = self.fitted.linear({self.form.focus: float(at)} if at else self.at)[0]
        return float(self.fitted.back(np.array([eta]))[0])


#: a key's rest (a term, or "") to its number
Rule = Callable[[Asked, str], float]
#: parts of a key that hold numbers to its number
Placed = tuple[str, Callable[..., float]]
