"""Scripts to run: invented frames, a remedy fitted to one of them, its script and the numbers it must reproduce."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
import pandas as pd
from runner import ENGINES, Ran, run_script

from batten.effects.span import round_span
from batten.emit.numbers import numbers
from batten.emit.script import script
from batten.families import parse
from batten.fit.estimate import Estimate
from batten.fit.fitting import estimate
from batten.fit.question import Question
from batten.frame.problem import Problem
from batten.frame.read import read

__all__ = ["Written", "agrees", "foundry", "write"]


def foundry(count: int = 90, seed: int = 3) -> pd.DataFrame:
    """Invented castings: minutes grow with mass, a share, and responses that level off, kink and grow to a ceiling."""
    rng = np.random.default_rng(seed)
    mass = rng.uniform(3, 60, count)
    alloy = rng.choice(["bronze", "grey iron", "steel"], count)
    depth, steel = rng.normal(10, 2, count), alloy == "steel"
    eta = 0.9 + 0.03 * mass + 0.2 * steel + 0.02 * depth + 0.12 * rng.standard_t(6, count)
    noise = rng.normal(size=count)
    return pd.DataFrame({
        "minutes": np.exp(eta), "mass_kg": mass, "alloy": alloy, "depth": depth,
        "scrap": 1 / (1 + np.exp(2 - eta + 0.3 * noise)),
        "levelled": 40 * mass / (12 + mass) + 2 * steel + noise,
        "kinked": 5 + 0.8 * np.maximum(mass - 25, 0) + 2 * steel + noise,
        "rooted": np.sqrt(50 + 10 * mass + 20 * steel + 5 * noise),
        "grown": 30 / (1 + np.exp(-0.15 * (mass - 30))) + 2 * steel + noise,
        "rate": 1 / (0.2 + 0.01 * mass + 0.02 * steel + 0.01 * rng.uniform(-1, 1, count)),
    })  # fmt: skip


@dataclass(frozen=True)
class Written:
    """A script with the fit it was written from. want (k,): what its `got` must be, at full precision."""

    source: str
    problem: Problem
    question: Question
    estimate: Estimate
    want: np.ndarray

    @property
    def lines(self) -> list[str]:
        return self.source.splitlines()


def write(
    key: str,
    formula: str,
    data: pd.DataFrame,
    *,
    focus: str | None = None,
    rows: str | None = None,
    at: Mapping[str, Any] | None = None,
    env: Mapping[str, Any] | None = None,
    units: Mapping[str, str] | None = None,
    frame_name: str = "castings",
    beside: Mapping[str, Any] | None = None,
    **asked: Any,
) -> Written:
    """Read, fit and write; the remedy must be usable on these rows. beside: weights, clusters, exposure."""
    problem = read(
        formula, data, focus=focus, rows=rows, at=at, env=env, units=units, frame_name=frame_name, **(beside or {})
    )
    est = estimate(problem.rows, parse(key))
    assert isinstance(est, Estimate), (key, formula, est)
    question = Question(span=asked.pop("span", round_span(problem.rows.x)), at=dict(at or {}), **asked)
    return Written(script(problem, question, est), problem, question, est, _want(problem, question, est))


def _want(problem: Problem, question: Question, est: Estimate) -> np.ndarray:
    shown = numbers(problem, question, est)
    span = shown.span.difference
    return np.concatenate([
        [shown.rows],
        [] if np.linalg.cond(est.factored.r) > 1e8 else np.column_stack([shown.coef, shown.error]).ravel(),
        [] if shown.edf is None else [shown.edf],
        [] if shown.smear is None else [shown.smear],
        [v for v in (span.estimate, (span.high - span.low) / 2) if np.isfinite(v)],
        shown.prediction,
    ])  # fmt: skip


def agrees(
    written: Written,
    data: pd.DataFrame,
    *,
    rtol: float = 0.0,
    after: str = "",
    engines: Sequence[str] = ENGINES,
    draw: bool = True,
) -> Ran:
    """Run the script under the formula engines; its numbers are the estimate's, and the frame is left alone.

    rtol: 0 for what the script's own arithmetic allows. draw: once, the picture too.
    """
    rtol = rtol or _digits(written.estimate)
    for i, engine in enumerate(engines):
        ran = run_script(written.source, {written.problem.frame_name: data}, engine, after=after, draw=draw and i == 0)
        assert not ran.error, f"{engine}\n{written.source}\n{ran.error}"
        assert not ran.changed, ran.changed
        np.testing.assert_allclose(ran.names["got"], written.want, rtol=rtol, err_msg=written.source)
    return ran


def _digits(est: Estimate) -> float:
    """Relative error of the script's numbers: rounding, and its numeric slopes, whose error is the square of a step."""
    if est.remedy.left.searched:
        return 1e-7  # second differences of the likelihood
    return 1e-8 if est.moving and not est.shape.corners else 1e-9  # central differences in the shape's constants
