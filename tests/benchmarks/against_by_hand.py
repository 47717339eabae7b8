"""The whole default grid beside what an analyst writes by hand, in one process: times, ratios, peak memory.

    python tests/benchmarks/against_by_hand.py [ROWS ...]         # 1,000, 10,000 and 100,000 unless given
    python tests/benchmarks/against_by_hand.py --million          # and a million rows, beside one formula fit
    python tests/benchmarks/against_by_hand.py --growth           # rows from 10,000 on, covariates from 1 to 20
    python tests/benchmarks/against_by_hand.py --phases 100000    # where the time of one examination goes

By hand: 14 remedies of `y ~ x + C(g)` (g text with four levels) through statsmodels' formula interface, each fitted to
all rows and in ten folds, brought back by smearing. Beside it one formula fit, the same by formulaic, and least squares
on a ready array. Times are processor seconds of this process with one thread (`OMP_NUM_THREADS=1` is set here, and
batten's own second worker counts in full); medians of REPEATS runs up to 10,000 rows. Quote ratios, since absolute
times move with the machine. Peak memory is that of a child process that does nothing else, beyond what it held when the
data stood ready.
"""

from __future__ import annotations

import os

os.environ.setdefault("OMP_NUM_THREADS", "1")

import argparse
import statistics
import subprocess
import sys
import time
from collections.abc import Callable
from pathlib import Path

import numpy as np
import pandas as pd
import statsmodels.api as sm
import statsmodels.formula.api as smf
from formulaic import model_matrix

import batten

REPEATS = 3
FOLDS = 10
FORMULA = "y ~ x + C(g)"
IDENTITY: tuple[str, Callable[[np.ndarray], np.ndarray]] = ("y", lambda z: z)
LOG: tuple[str, Callable[[np.ndarray], np.ndarray]] = ("np.log(y)", np.exp)
ROOT: tuple[str, Callable[[np.ndarray], np.ndarray]] = ("np.sqrt(y)", np.square)
RIGHT = ("x", "np.log(x)", "np.sqrt(x)", "I(1 / x)", "x + I(x**2)")
BY_HAND = [(left, right) for left in (IDENTITY, LOG) for right in RIGHT] + [(ROOT, right) for right in RIGHT[:4]]


def frame(n: int, *, more: int = 0) -> pd.DataFrame:
    """Multiplicative data with four groups and some more covariates."""
    rng = np.random.default_rng(0)
    x, g = rng.lognormal(2.5, 0.6, n), rng.integers(0, 4, n)
    y = np.exp(0.5 + 0.8 * np.log(x) + 0.1 * g + rng.normal(0, 0.25, n))
    data = pd.DataFrame({"y": y, "x": x, "g": np.array(["north", "south", "east", "west"])[g]})
    return data.assign(**{f"c{k}": rng.normal(size=n).round(1) for k in range(more)})


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


def by_array(data: pd.DataFrame) -> Callable[[], object]:
    """Least squares on a design that stands ready."""
    groups = pd.get_dummies(data["g"], drop_first=True).to_numpy(dtype=float)
    x, y = np.column_stack([np.ones(len(data)), data["x"], groups]), data["y"].to_numpy()
    return lambda: sm.OLS(y, x).fit()


def by_formulaic(data: pd.DataFrame) -> None:
    y, x = model_matrix(FORMULA, data)
    sm.OLS(y, x).fit()


def seconds(run: Callable[[], object], repeats: int) -> float:
    """Median processor time of some runs, after one that is not counted unless runs are long."""
    if repeats > 1:
        run()
    times = []
    for _ in range(repeats):
        start = time.process_time()
        run()
        times.append(time.process_time() - start)
    return statistics.median(times)


def megabytes(line: str) -> float:
    """A line of this process's status on Linux: VmRSS, held now, or VmHWM, held at most."""
    status = Path("/proc/self/status").read_text()
    return int(status.split(f"{line}:")[1].split()[0]) / 1024


def peak_beyond_data(n: int) -> float:
    """MB that a child process takes at its peak to examine n rows, beyond what it held before."""
    # the resource module's peak outlives the start of a program, so the child reads its own
    code = (
        "import sys; sys.path.insert(0, sys.argv[2]); from against_by_hand import *;"
        "data = frame(int(sys.argv[1])); batten.examine(FORMULA, data[:200]);"
        "held = megabytes('VmRSS'); batten.examine(FORMULA, data); print(megabytes('VmHWM') - held)"
    )
    here = str(Path(__file__).parent)
    done = subprocess.run([sys.executable, "-c", code, str(n), here], capture_output=True, text=True, check=True)
    return float(done.stdout)


def sizes(rows: list[int]) -> None:
    """Ours beside the peers, size by size."""
    print(
        f"{'rows':>9} {'array':>8} {'formulaic':>10} {'formula':>8} {'by hand':>8} {'ours':>8} {'to hand':>8}", end=""
    )
    print(f" {'fits':>6} {'peak MB':>8}")
    for n in rows:
        data, repeats = frame(n), REPEATS if n <= 10_000 else 1
        array, formulaic = seconds(by_array(data), 3), seconds(lambda d=data: by_formulaic(d), 3)
        single = seconds(lambda d=data: smf.ols(FORMULA, d).fit(), 3)
        hand = seconds(lambda d=data: by_hand(d), repeats) if n <= 100_000 else float("nan")
        ours = seconds(lambda d=data: batten.examine(FORMULA, d), repeats)
        print(f"{n:>9,} {array:>7.3f}s {formulaic:>9.3f}s {single:>7.3f}s {hand:>7.2f}s {ours:>7.2f}s", end="")
        print(f" {ours / hand:>8.2f} {ours / single:>6.0f} {peak_beyond_data(n):>8.0f}", flush=True)


def growth(rows: list[int]) -> None:
    """How time and memory grow with rows, and with covariates at 10,000 rows."""
    for n in rows:
        print(f"{n:>9,} rows: {seconds(lambda n=n: batten.examine(FORMULA, frame(n)), 1):7.2f}s", end="")
        print(f" {peak_beyond_data(n):8.0f} MB", flush=True)
    for more in (1, 5, 10, 20):
        formula = " + ".join([FORMULA, *(f"c{k}" for k in range(more))])
        data = frame(10_000, more=more)
        print(
            f"{more:>4} more covariates: {seconds(lambda f=formula, d=data: batten.examine(f, d), 1):7.2f}s", flush=True
        )


def phases(n: int) -> None:
    """Processor time of the parts of one examination, one worker, and of the first screen after it."""
    from batten.compare import grid, heldout
    from batten.compare.shortlist import shortlist
    from batten.exam import examination

    spent: dict[str, float] = {}

    def timed(owner: object, name: str, label: str) -> None:
        plain = getattr(owner, name)

        def run(*args: object, **more: object) -> object:
            start = time.process_time()
            try:
                return plain(*args, **more)
            finally:
                spent[label] = spent.get(label, 0.0) + time.process_time() - start

        setattr(owner, name, run)

    grid.side_by_side = lambda tasks, **_: [task() for task in tasks]  # type: ignore[assignment]
    for owner, name, label in (
        (grid, "deal", "folds"), (grid, "flexible", "reference curve"), (grid, "estimate", "fits"),
        (grid, "held_out", "held-out pass"), (heldout, "score_alike", "  ladder, held out"),
        (heldout, "_score_link", "  links, held out"), (heldout, "_score_spread", "  weighted, held out"),
        (heldout, "_score_smooth", "  smooths, held out"), (heldout, "_fitted_group", "  own knots, held out"),
        (grid, "bend_of", "bends"), (grid, "choose", "choice"), (examination, "compare", "all but the frame"),
    ):  # fmt: skip
        timed(owner, name, label)
    data = frame(n)
    start = time.process_time()
    exam = batten.examine(FORMULA, data)
    whole = time.process_time() - start
    start = time.process_time()
    exam.table([key for _, key in shortlist(exam.comparison)])
    spent["first screen's table and spans"] = time.process_time() - start
    spent["frame"] = whole - spent["all but the frame"]
    for label, used in spent.items():
        print(f"{label:<32} {used:8.2f}s {used / whole:6.0%}")
    print(f"{'examine':<32} {whole:8.2f}s")


def main() -> None:
    given = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    given.add_argument("rows", nargs="*", type=int, default=[1_000, 10_000, 100_000])
    given.add_argument("--million", action="store_true")
    given.add_argument("--growth", action="store_true")
    given.add_argument("--phases", type=int, metavar="ROWS")
    asked = given.parse_args()
    if asked.phases:
        phases(asked.phases)
    elif asked.growth:
        growth([10_000, 100_000, 1_000_000])
    else:
        sizes([*asked.rows, *([1_000_000] if asked.million else [])])


if __name__ == "__main__":
    main()
