"""Every kind of weights, with clusters and without, times every kind of remedy and design, as scripts.

`python tests/emit/matrix.py [KEY ...]` runs all of them under both formula engines and counts; the tests run a part.
"""

from __future__ import annotations

import itertools
import sys
import time
from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
import pandas as pd
from cases import Written, agrees, write
from runner import ENGINES

from batten.exam.fit import Fit

__all__ = ["BESIDE", "DESIGNS", "KEYS", "Combination", "combinations", "gives_its_numbers", "works"]

BESIDE: dict[str, dict[str, str]] = {
    "none": {},
    "variance": {"weights": "runs", "weights_kind": "variance"},
    "frequency": {"weights": "times", "weights_kind": "frequency"},
    "exposure": {"exposure": "hours"},
}

DESIGNS = {
    "alone": "{y} ~ mass",
    "beside a factor": "{y} ~ mass + C(alloy)",
    "crossed with a factor": "{y} ~ mass * C(alloy)",
}

#: remedy -> the response that suits it
KEYS = {
    "y ~ x": "grown", "y ~ poly2 x": "grown", "y ~ bins4 x": "grown", "y ~ hinge x": "kinked", "y ~ cut x": "kinked",
    "y ~ level-exp x": "levelled", "y ~ x^p": "levelled", "log y ~ log x": "grown", "log y ~ spline4 x": "grown",
    "sqrt y ~ x": "grown", "1/y ~ x": "falling", "boxcox y ~ x": "grown", "yeojohnson y ~ poly2 x": "grown",
    "boxcox y ~ hinge x": "kinked", "weighted y ~ x": "kinked", "weighted y ~ spline3 x": "kinked",
    "loglink y ~ x": "grown", "loglink-gamma y ~ spline3 x": "grown", "loglink-gaussian y ~ log x": "grown",
    "share y ~ x": "share", "invlink-gamma y ~ x": "falling", "loglink y ~ hinge x": "turned",
    "loglink y ~ hinge2 x": "turned", "loglink-gamma y ~ x^p": "turned", "loglink-gaussian y ~ fp2 x": "turned",
    "loglink y ~ cut x": "turned", "loglink-gamma y ~ fp1 x": "turned", "share y ~ hinge x": "share",
    "invlink-gamma y ~ hinge x": "inverse", "y ~ smooth x": "grown", "log y ~ smooth x": "grown",
}  # fmt: skip


def works(count: int = 130, seed: int = 4) -> pd.DataFrame:
    """Invented castings of thirteen works: responses that grow, kink, level off or turn; runs, counts and hours."""
    rng = np.random.default_rng(seed)
    mass, place = rng.uniform(3, 60, count), rng.integers(0, 13, count)
    alloy = rng.choice(["bronze", "steel"], count)
    runs, steel = rng.integers(1, 9, count), alloy == "steel"
    noise = rng.normal(0, 0.3, 13)[place] + rng.normal(0, 1.5, count) / np.sqrt(runs)
    above = np.maximum(mass - 25, 0)
    return pd.DataFrame({
        "mass": mass, "alloy": alloy, "place": np.array(list("abcdefghijklm"))[place], "runs": runs,
        "times": rng.integers(0, 4, count), "hours": rng.uniform(0.5, 6, count),
        "grown": np.exp(1 + 0.03 * mass + 0.2 * steel + 0.1 * noise),
        "kinked": 8 + 0.1 * mass + 0.8 * above + 2 * steel + (0.5 + 0.03 * mass) * noise,
        "levelled": 40 * mass / (12 + mass) + 2 * steel + noise,
        "turned": np.exp(
            1 + 0.08 * np.minimum(mass, 25) - 0.06 * np.maximum(mass - 42, 0) + 0.2 * steel + 0.05 * noise
        ),
        "share": 1 / (1 + np.exp(2.5 - 0.12 * above - 0.3 * steel - 0.2 * noise)),
        "inverse": 1 / (0.2 + 0.005 * mass + 0.01 * above + 0.05 * steel + 0.01 * np.clip(noise, -1, 1)),
        "falling": 1 / (0.2 + 0.01 * mass + 0.05 * steel + 0.02 * np.clip(noise, -1, 1)),
    })  # fmt: skip


@dataclass(frozen=True)
class Combination:
    """key: remedy. kind: of weights, one of BESIDE. clustered: whether places are clusters. design: one of DESIGNS."""

    key: str
    kind: str
    clustered: bool
    design: str

    def __str__(self) -> str:
        return f"{self.key}, {self.kind}{', clusters' if self.clustered else ''}, {self.design}"

    @property
    def options(self) -> dict[str, str]:
        return {**BESIDE[self.kind], **({"cluster": "place"} if self.clustered else {})}

    def frame(self) -> pd.DataFrame:
        """Where there is an exposure, the response's column holds amounts, and the analysis is of the rate."""
        data, y = works(), KEYS[self.key]
        return data.assign(**{y: data[y] * data["hours"]}) if self.kind == "exposure" else data

    def write(self, **asked: Any) -> Written:
        return write(
            self.key, DESIGNS[self.design].format(y=KEYS[self.key]), self.frame(), focus="mass",
            frame_name="works", beside=self.options, **asked,
        )  # fmt: skip


def combinations() -> Iterator[Combination]:
    """All that can be asked: curves bring their own level, which stands alone or beside covariates."""
    for key, kind, clustered, design in itertools.product(KEYS, BESIDE, (False, True), DESIGNS):
        if not ("level" in key and design.startswith("crossed")):
            yield Combination(key, kind, clustered, design)


#: further rows, without the columns beside the formula: those of a row of average weight in a new cluster
FURTHER = 'further = predict(works.drop(columns=["runs", "times", "hours", "place"]).iloc[::23])'


def gives_its_numbers(one: Combination, *, engines: Sequence[str] = ENGINES) -> Written:
    """The script's asserts hold, and its further rows are those of `fit.predict`."""
    written, data = one.write(), one.frame()
    # eight digits stand in the script; a numeric slope at a corner or across a power keeps seven
    ran = agrees(written, data, after=FURTHER, engines=engines)
    fit = Fit(written.problem, written.question, written.estimate)
    new = data.drop(columns=["runs", "times", "hours", "place"]).iloc[::23]
    mean, median = fit.predict(new, interval="new row"), fit.predict(new, of="median")
    shown = {"median": median["estimate"], "mean": mean["estimate"], "low": mean["low"], "high": mean["high"]}
    np.testing.assert_allclose(ran.names["further"], pd.DataFrame(shown), rtol=1e-7, err_msg=str(one))
    return written


def _whole(keys: Sequence[str]) -> int:
    """Run everything, or all of some remedies; counts, lengths and what went wrong on the screen."""
    begun, refused, wrong = time.perf_counter(), 0, 0
    lengths: dict[tuple[str, bool], list[int]] = {}
    for one in combinations():
        if keys and one.key not in keys:
            continue
        try:
            lengths.setdefault((one.kind, one.clustered), []).append(len(gives_its_numbers(one).lines))
        except AssertionError as error:
            gone = "Refusal(" in str(error)
            refused, wrong = refused + gone, wrong + (not gone)
            print(f"{'refused' if gone else 'WRONG'}: {one}: {str(error)[-400 if gone else -1500 :]}", flush=True)
    for (kind, clustered), found in lengths.items():
        print(f"{kind}{' with clusters' if clustered else ''}: {min(found)} to {max(found)} lines, "
              f"middle {int(np.median(found))}, {sum(n > 60 for n in found)} of {len(found)} above 60")  # fmt: skip
    print(f"{len(ENGINES) * sum(map(len, lengths.values()))} scripts run, {refused} remedies refused, {wrong} wrong, "
          f"{time.perf_counter() - begun:.0f} s")  # fmt: skip
    return int(bool(wrong))


if __name__ == "__main__":
    sys.exit(_whole(sys.argv[1:]))
