"""The whole default grid beside what an analyst writes by hand, in one process: times, ratios, peak memory.

    python tests/benchmarks/against_by_hand.py [ROWS ...]

By hand: 14 remedies of `y ~ x + C(g)` (g text with four levels) through statsmodels' formula interface, each fitted to
all rows and in ten folds, brought back by smearing. Beyond 100,000 rows only a single fit is timed beside ours.
Medians of REPEATS runs; quote ratios, since absolute times move with the machine.
"""

from __future__ import annotations

import resource
import statistics
import sys
import time
from collections.abc import Callable

import numpy as np
import pandas as pd
import statsmodels.formula.api as smf

import batten

REPEATS = 3
FOLDS = 10
IDENTITY: tuple[str, Callable[[np.ndarray], np.ndarray]] = ("y", lambda z: z)
LOG: tuple[str, Callable[[np.ndarray], np.ndarray]] = ("np.log(y)", np.exp)
ROOT: tuple[str, Callable[[np.ndarray], np.ndarray]] = ("np.sqrt(y)", np.square)
RIGHT = ("x", "np.log(x)", "np.sqrt(x)", "I(1 / x)", "x + I(x**2)")
BY_HAND = [(left, right) for left in (IDENTITY, LOG) for right in RIGHT] + [(ROOT, right) for right in RIGHT[:4]]


def frame(n: int) -> pd.DataFrame:
    """Multiplicative data with four groups."""
    rng = np.random.default_rng(0)
    x, g = rng.lognormal(2.5, 0.6, n), rng.integers(0, 4, n)
    y = np.exp(0.5 + 0.8 * np.log(x) + 0.1 * g + rng.normal(0, 0.25, n))
    return pd.DataFrame({"y": y, "x": x, "g": np.array(["north", "south", "east", "west"])[g]})


def by_hand(data: pd.DataFrame) -> None:
    """Fourteen remedies, each fitted to all rows and in ten folds, means brought back by smearing."""
    fold = np.random.default_rng(1).integers(0, FOLDS, len(data))
    for (left, back), right in BY_HAND:
        formula = f"{left} ~ {right} + C(g)"
        smf.ols(formula, data).fit()
        loss = 0.0
        for k in range(FOLDS):
            train, test = data[fold != k], data[fold == k]
            fit = smf.ols(formula, train).fit()
            eta, residual = fit.predict(test).to_numpy(), fit.resid.to_numpy()
            mean = back(eta) * np.exp(residual).mean() if left == LOG[0] else back(eta)
            if left == ROOT[0]:
                mean = eta**2 + (residual**2).mean()
            loss += float(((test["y"] - mean) ** 2).sum())


def seconds(run: Callable[[], object], repeats: int) -> float:
    """Median wall time of some runs, after one that is not counted."""
    run()
    times = []
    for _ in range(repeats):
        start = time.perf_counter()
        run()
        times.append(time.perf_counter() - start)
    return statistics.median(times)


def main(sizes: list[int]) -> None:
    print(
        f"{'rows':>9}  {'one formula fit':>15}  {'by hand, 14':>11}  {'whole grid':>10}  {'ratio':>6}  {'peak MB':>7}"
    )
    for n in sizes:
        data = frame(n)
        repeats = REPEATS if n < 100_000 else 1
        single = seconds(lambda d=data: smf.ols("y ~ x + C(g)", d).fit(), repeats)
        ours = seconds(lambda d=data: batten.examine("y ~ x + C(g)", d), repeats)
        hand = seconds(lambda d=data: by_hand(d), repeats) if n <= 100_000 else float("nan")
        peak = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024
        print(f"{n:>9,}  {single:>13.3f} s  {hand:>9.2f} s  {ours:>8.2f} s  {ours / hand:>6.2f}  {peak:>7.0f}")


if __name__ == "__main__":
    main([int(a) for a in sys.argv[1:]] or [1_000, 10_000, 100_000])
