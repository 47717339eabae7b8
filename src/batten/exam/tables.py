"""The public tables: the one place where the comparison meets pandas."""

from __future__ import annotations

import math
from collections.abc import Hashable, Mapping

import pandas as pd

from batten.compare.choose import gaps
from batten.compare.grid import Comparison
from batten.effects.contrast import SpanEffect
from batten.exam.fit import Fit
from batten.families import parse
from batten.frame.problem import Problem

__all__ = ["comparison_table", "effects_table", "refusal_table"]

_NO_LIKELIHOOD = "pseudo-likelihood: no AICc, no log score"


def refusal_table(comparison: Comparison, labels: pd.Index) -> pd.DataFrame:
    """key, wrong, seen, instead, and rows: labels of the rows whose y or x the remedy cannot take."""
    rows = [
        (key, r.wrong, r.seen, r.instead, _not_taken(comparison, key, labels)) for key, r in comparison.refused.items()
    ]
    return pd.DataFrame(rows, columns=["key", "wrong", "seen", "instead", "rows"]).set_index("key")


def _not_taken(comparison: Comparison, key: str, labels: pd.Index) -> tuple[Hashable, ...]:
    """() where the refusal has another reason than single values."""
    remedy, rows = parse(key), comparison.rows
    lost = ~(remedy.left.takes(rows.y) & remedy.shape.takes(rows.x))
    return tuple(labels[lost])


def comparison_table(problem: Problem, comparison: Comparison, spans: Mapping[str, SpanEffect]) -> pd.DataFrame:
    """One row for each of the spans, in their order; errors, gaps and differences in units of y."""
    gap = gaps(comparison.candidates, comparison.splits.k)
    rows = []
    for key, span in spans.items():
        est, scores, bend = comparison.estimates[key], comparison.scores[key], comparison.bends[key]
        notes = [*est.notes, comparison.turns[key], span.difference.note]
        if est.log_likelihood is None:
            notes.append(_NO_LIKELIHOOD)
        rows.append({
            "key": key,
            "rmse": scores.rmse,
            "rmse_gap": gap[key].size,
            "rmse_gap_se": gap[key].error,
            "tied": gap[key].tied,
            "mae": scores.overall(scores.absolute),
            "within_10": scores.overall(scores.within),
            "log_score": math.nan if scores.log_score is None else scores.overall(scores.log_score),
            "aicc": est.aicc,
            "r2": _r2(comparison, key),
            "leftover": "cannot tell" if bend is None else bend.verdict,
            "parameters": est.parameters,
            "difference": span.difference.estimate,
            "difference_low": span.difference.low,
            "difference_high": span.difference.high,
            "words": est.remedy.words(problem.response, problem.focus),
            "note": "; ".join(n for n in notes if n),
        })  # fmt: skip
    return pd.DataFrame(rows).set_index("key")


def _r2(comparison: Comparison, key: str) -> float:
    """Held-out share of the squared deviations of y from its mean (Kvalseth 1985 on its many forms)."""
    scores, y = comparison.scores[key], comparison.rows.y
    total = float(((y - y.mean()) ** 2).mean())
    return 1 - scores.rmse**2 / total if total > 0 else math.nan


def effects_table(fits: list[Fit], a: float, b: float, *, of: str) -> pd.DataFrame:
    """difference, ratio, span_slope and average_slope of every remedy from a to b, each with _low and _high."""
    rows = {}
    for fit in fits:
        found = fit.contrast(a, b, of=of)
        average = fit.slope(of=of)
        row: dict[str, object] = {}
        for name in ("difference", "ratio", "span_slope"):
            row[name], row[f"{name}_low"], row[f"{name}_high"] = found.loc[name, ["estimate", "low", "high"]]
        row["average_slope"], row["average_slope_low"], row["average_slope_high"] = average.iloc[0][
            ["estimate", "low", "high"]
        ]
        notes = dict.fromkeys([*found["note"], *average["note"]])
        row["note"] = "; ".join(n for n in notes if n)
        rows[fit.key] = row
    out = pd.DataFrame.from_dict(rows, orient="index")
    out.index.name = "key"
    return out
