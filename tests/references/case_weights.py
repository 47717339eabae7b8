"""A published coefficient as a combination of batten's coefficients."""

from __future__ import annotations

import math
import re
from dataclasses import dataclass

import numpy as np
from case_forms import Form
from case_tables import NotDelivered
from case_terms import Term

import batten

__all__ = ["Weights", "is_intercept"]


def is_intercept(term: str) -> bool:
    return term in ("Intercept", "intercept", "0")


@dataclass(frozen=True, eq=False)
class Weights:
    """Finds published terms among the coefficients of a fit."""

    form: Form
    fit: batten.Fit

    def of(self, term: str) -> np.ndarray:
        """Weights (p,) of batten's coefficients, in their order."""
        out = np.zeros(len(self.fit.estimate.coef))
        found = self._focal_term(term)
        if is_intercept(term):
            out[self._label("intercept")] = 1
            self._add_focal(out, self._expanded(0))
            self._add_band(out, self._reference, 1.0)
        elif found is None:
            out[self._place(term)] = 1
        elif found.kind == "power":
            self._add_focal(out, self._expanded(int(found.value)))
        elif found.kind == "hinge":
            places = sorted(t.value for t in self.form.terms.values() if t.kind == "hinge")
            out[self._first + 1 + places.index(found.value)] = 1
        elif found.kind == "band":
            self._add_band(out, int(found.value), 1.0)
            self._add_band(out, self._reference, -1.0)
        else:
            out[self._first] = found.value if found.kind == "log" else 1
        return out

    def _focal_term(self, term: str) -> Term | None:
        if term == "hinge":
            return next((t for t in self.form.terms.values() if t.kind == "hinge"), None)
        return self.form.terms.get(term)

    # --- places --------------------------------------------------------------------------------------------------

    @property
    def _columns(self) -> int:
        """Columns of the shape, for each column it is multiplied with."""
        est = self.fit.estimate
        return int(est.shape.columns(est.rows.x[:1], est.state, est.theta).shape[1])

    @property
    def _first(self) -> int:
        """Position of the first coefficient of the focal predictor by itself."""
        names = self.fit.problem.modifier_names
        return self._start + (names.index("") if "" in names else 0) * self._columns

    @property
    def _start(self) -> int:
        return len(self.fit.estimate.coef) - self._columns * len(self.fit.problem.modifier_names)

    def _place(self, term: str) -> int:
        """Position of a covariate, an interaction, a group; numbers count focal coefficients, as for splines."""
        if term.isdigit():
            return self._first + int(term) - 1
        group = re.fullmatch(rf"C\({re.escape(self.form.focus)}\)\[T?\.?(.+)\]", term)
        if group and self.form.right.startswith("bins"):
            return self._first + self._level(group[1]) - 1
        *_, factor = sorted(term.split(":"), key=lambda f: f in self.form.terms)
        if ":" in term and factor in self.form.terms:
            rest = parts_of(":".join(f for f in term.split(":") if f != factor))
            modifiers = [parts_of(name) for name in self.fit.problem.modifier_names]
            if rest in modifiers:
                return self._start + modifiers.index(rest) * self._columns
        return self._label(term)

    def _label(self, term: str) -> int:
        labels = [parts_of(label) for label in self.fit.coefficients.index]
        if parts_of(term) not in labels:
            raise NotDelivered(f"no coefficient {term} among {', '.join(self.fit.coefficients.index)}")
        return labels.index(parts_of(term))

    def _level(self, name: str) -> int:
        """Number of a group among the groups in order."""
        if self.form.levels:
            return self.form.levels.index(name)
        return int(np.searchsorted(np.unique(self.fit.problem.rows.x), float(name)))

    # --- powers and bands ----------------------------------------------------------------------------------------

    def _add_focal(self, out: np.ndarray, weights: np.ndarray) -> None:
        out[self._first : self._first + len(weights)] += weights

    def _expanded(self, power: int) -> np.ndarray:
        """Weights of sum b_k (x - c)^k, k = 1, 2, ..., in the coefficient of (x - published centre)^power."""
        fixed = re.fullmatch(r"x\^([\d.]+)", self.form.right)
        if fixed:
            return np.array([float(power == float(fixed[1]))])
        if not self.form.right.startswith("poly"):
            return np.array([float(power == 1)]) if power else np.zeros(0)
        away = self.form.centre - self.fit.estimate.state[0]
        k = range(1, self._columns + 1)
        return np.array([math.comb(i, power) * away ** (i - power) if i >= power else 0.0 for i in k])

    @property
    def _reference(self) -> int | None:
        """Number of the published reference band, where the focal predictor stands in bands."""
        numbers = {int(t.value) for t in self.form.terms.values() if t.kind == "band"}
        return next((k for k in range(len(numbers) + 1) if k not in numbers), None) if numbers else None

    def _add_band(self, out: np.ndarray, band: int | None, sign: float) -> None:
        """One band against batten's own reference, the lowest one (band 0)."""
        if band:
            out[self._first + band - 1] += sign


def parts_of(label: str) -> frozenset[str]:
    """A term's factors whatever the spelling: "female : black" and "female:black", "treat: B" and "C(treat)[T.B]"."""
    text = re.sub(r"C\((\w+)\)\[T\.(.+?)\]|(\w+)\[T\.(.+?)\]", lambda m: f"{m[1] or m[3]}={m[2] or m[4]}", label)
    text = text.replace(" : ", "&").replace(" × ", "&").replace(": ", "=").replace(":", "&")
    parts = [part.replace(" ", "").replace("np.", "") for part in text.split("&")]
    return frozenset(re.sub(r"^I\((.*)\)$", r"\1", part) for part in parts)
