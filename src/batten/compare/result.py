"""What a held-out pass comes back with: scores, or the reason why a remedy has none."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from batten.engine.rows import Array, Ints
from batten.errors import Refusal
from batten.fit.estimate import Estimate

__all__ = ["HeldOut", "fewer", "inverse_or_none", "joined", "rank_lost", "unsafe", "unsettled"]


@dataclass(frozen=True, eq=False)
class HeldOut:
    """Mean losses of every split (S,): squared and absolute error in units of y, share within 10%, log score.

    squared belongs to the mean, absolute to the median; errors are those of a row of average weight, sqrt(w) times the
    row's own. log_score is None for a pseudo-likelihood. rows (S,): held-out rows of each split.
    """

    squared: Array
    absolute: Array
    within: Array
    log_score: Array | None
    rows: Ints

    def overall(self, losses: Array) -> float:
        """Average over all held-out rows."""
        return float(losses @ self.rows / self.rows.sum())

    @property
    def rmse(self) -> float:
        return float(np.sqrt(self.overall(self.squared)))


def joined(parts: tuple[HeldOut | Refusal | None, ...]) -> HeldOut | Refusal | None:
    """The scores of several repeats as one; a refusal or None where one of them is."""
    found = [part for part in parts if isinstance(part, HeldOut)]
    if len(found) < len(parts):
        return next(part for part in parts if not isinstance(part, HeldOut))
    scores = [part.log_score for part in found if part.log_score is not None]
    return HeldOut(
        np.concatenate([part.squared for part in found]), np.concatenate([part.absolute for part in found]),
        np.concatenate([part.within for part in found]), np.concatenate(scores) if scores else None,
        np.concatenate([part.rows for part in found]),
    )  # fmt: skip


def inverse_or_none(cross: Array) -> Array | None:
    """Inverse of a near-identity cross-product, or None where the training set lost a direction."""
    values, vectors = np.linalg.eigh(cross)
    if values[0] < 1e-10 * max(1.0, values[-1]):
        return None
    return np.asarray((vectors / values) @ vectors.T)


def rank_lost(shape: str) -> Refusal:
    return Refusal(
        wrong="One training set cannot fit this remedy.",
        seen=f"With a tenth of the rows held out, columns of {shape} or of the covariates coincide.",
        instead="Fewer columns, or merge levels that few rows have.",
    )


def fewer(shape: str) -> Refusal:
    return Refusal(
        wrong="One training set has too few different values for this remedy.",
        seen=f"{shape} loses a knot or a group when a tenth of the rows is held out.",
        instead="Fewer knots or groups, or edges given by hand: bins(10, 20) x.",
    )


def unsettled(est: Estimate) -> Refusal:
    return Refusal(
        wrong="The fit of this mean model does not settle in every training set.",
        seen=f"With a tenth of the rows held out a coefficient of {est.remedy.key} runs away.",
        instead="A scale of y (log y, sqrt y), fewer columns, or merge levels that few rows have.",
    )


def unsafe(est: Estimate) -> Refusal:
    return Refusal(
        wrong="Held-out predictions leave what this scale can undo.",
        seen=f"In at least one training set {est.remedy.key} gives rows no finite mean.",
        instead="log y or a log link, whose mean always exists.",
    )
