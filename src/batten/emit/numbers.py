"""The numbers a script must reproduce, from the same results as the screen."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from batten.effects.coefficients import coefficients
from batten.effects.contrast import SpanEffect, span_effect
from batten.engine.rows import Array, Ints
from batten.fit.estimate import Estimate
from batten.fit.predict import predict
from batten.fit.question import Question
from batten.frame.problem import Problem

__all__ = ["Numbers", "numbers"]


@dataclass(frozen=True, eq=False)
class Numbers:
    """rows: how many the fit uses. coef, error (k,): the shape's own columns and searched constants, with standard
    errors; empty where the focal predictor stands in interactions only. smear: factor from median to mean on the log
    scale, else None. edf: effective degrees of freedom of a penalised fit, whose coefficients are left out. span: the
    standing question's answer. prediction (4,): median, mean, low, high of one further row like the last of those used.
    """

    rows: int
    coef: Array
    error: Array
    smear: float | None
    edf: float | None
    span: SpanEffect
    prediction: Array


def numbers(problem: Problem, question: Question, est: Estimate) -> Numbers:
    """Everything asserted at the end of a script."""
    shown = coefficients(est, level=question.level, errors=question.errors)
    own = _own_columns(problem, est)
    base, modifier = problem.profile or (None, None)
    return Numbers(
        rows=est.n,
        coef=shown.estimate[own],
        error=shown.error[own],
        smear=float(np.exp(est.residual).mean()) if est.link is None and est.scale.closed == "exp" else None,
        edf=None if est.roughness is None else est.roughness.edf,
        span=span_effect(
            est, question.span, level=question.level, errors=question.errors, base=base, modifier=modifier
        ),
        prediction=_prediction(est, question, np.array([est.n - 1])),
    )


def _own_columns(problem: Problem, est: Estimate) -> Ints:
    """Positions of the shape's columns that stand alone, then of its searched constants."""
    total = len(est.coef)
    if est.roughness is not None:
        return np.arange(0)
    alone = [m for m, name in enumerate(problem.modifier_names) if not name]
    if not alone:
        return np.arange(total, total + est.moving)
    width = est.shape.columns(est.rows.x[:1], est.state, est.theta).shape[1]
    first = total - width * len(problem.modifier_names) + width * alone[0]
    return np.append(np.arange(first, first + width), np.arange(total, total + est.moving))


def _prediction(est: Estimate, question: Question, probe: Ints) -> Array:
    part = est.rows.take(probe)
    where = part.x, part.base, part.modifier
    median = predict(est, *where, of="median")
    mean = predict(est, *where, kind="new row", level=question.level, errors=question.errors)
    return np.concatenate([median.estimate, mean.estimate, mean.low, mean.high])
