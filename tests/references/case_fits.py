"""One form fitted by batten, and its coefficients under the names and units of the publication."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from functools import cached_property
from typing import Any

import numpy as np
import pandas as pd
from case_forms import Form
from case_tables import NotDelivered
from case_weights import Weights, is_intercept

import batten

__all__ = ["Fitted"]


@dataclass(frozen=True, eq=False)
class Fitted:
    """A form and batten's fit of it. level: of intervals."""

    form: Form
    level: float = 0.95

    @cached_property
    def fit(self) -> batten.Fit:
        """Constant errors, as publications have them; one dealing of folds, for nothing here rests on them."""
        form = self.form
        try:
            exam = batten.examine(
                form.formula, form.frame, focus=form.focus, only=form.key, errors="constant", repeats=1,
                level=self.level,
            )  # fmt: skip
            return exam[form.key]
        except batten.BattenError as error:
            raise NotDelivered(f"refused: {' '.join(str(error).split())}") from error

    @property
    def z(self) -> np.ndarray:
        """Response on the fitting scale (n,)."""
        return self.fit.estimate.z

    @property
    def x(self) -> np.ndarray:
        return self.fit.problem.rows.x

    @property
    def y(self) -> np.ndarray:
        return self.fit.problem.rows.y

    @cached_property
    def design(self) -> np.ndarray:
        """Columns of the fit (n, p)."""
        rows = self.fit.problem.rows
        return self.fit.estimate.design_at(rows.x, rows.base, rows.modifier)

    @property
    def rss(self) -> float:
        return self.fit.sigma**2 * self.fit.df_residual

    @property
    def tss(self) -> float:
        """About the mean, or about zero without a constant."""
        around = self.z.mean() if self.fit.problem.rows.constant else 0.0
        return float(((self.z - around) ** 2).sum())

    @property
    def eta(self) -> np.ndarray:
        """Fitted values on the fitting scale (n,)."""
        return self.fit.estimate.eta

    def back(self, eta: np.ndarray) -> np.ndarray:
        """From the fitting scale to units of y without correction."""
        est = self.fit.estimate
        return est.link.mean(eta) if est.link is not None else est.scale.inverse(eta, est.c)

    def row(self, at: Mapping[str, Any]) -> pd.DataFrame:
        """One row to predict; columns not named stand as in the first row used."""
        first = self.form.frame.loc[[self.fit.problem.index[0]]]
        return first.assign(**{k: v for k, v in at.items() if k in first})

    def linear(self, at: Mapping[str, Any]) -> tuple[float, float]:
        """Fitting scale at one row: value and standard error of the fit."""
        new, est = self.fit.problem.new_rows(self.row(at)), self.fit.estimate
        line = est.design_at(new.x, new.base, new.modifier)[0]
        return float(line @ est.coef), float(np.sqrt(line @ self.covariance @ line))

    @property
    def covariance(self) -> np.ndarray:
        """Of the coefficients (p, p), constant errors."""
        p = len(self.fit.estimate.coef)
        return self.fit.estimate.covariance("constant")[:p, :p]

    def coefficient(self, term: str) -> tuple[float, float]:
        """Estimate and ordinary standard error of a published term."""
        value, error = self._combined(self._weights.of(term))
        if is_intercept(term):
            value += self.form.shift / self.form.factor
        return self.form.factor * value, abs(self.form.factor) * error * self._dispersion

    def hc1(self, term: str) -> float:
        """HC1 standard error, from the rows' first-order influences."""
        w = self._weights.of(term)
        moves = self.fit.estimate.moves(leave_out=False)[:, : len(w)] @ w
        n, p = self.design.shape
        return abs(self.form.factor) * float(np.sqrt(n / (n - p) * (moves**2).sum()))

    @cached_property
    def _weights(self) -> Weights:
        return Weights(self.form, self.fit)

    @property
    def _dispersion(self) -> float:
        """Published errors of counts take the variance to be the mean; batten's take it from the rows."""
        return 1 / self.fit.sigma if self.form.left == "loglink y" else 1.0

    def _combined(self, weights: np.ndarray) -> tuple[float, float]:
        """A combination of coefficients and its error; of a single one, as the table of coefficients has it."""
        used = np.flatnonzero(weights)
        if len(used) == 1:
            row, w = self.fit.coefficients.iloc[used[0]], weights[used[0]]
            return float(w * row["estimate"]), float(abs(w) * row["std_error"])
        value = float(weights @ self.fit.coefficients["estimate"].to_numpy()[: len(weights)])
        return value, float(np.sqrt(weights @ self.covariance @ weights))
