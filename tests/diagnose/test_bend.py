"""The bend verdict: materiality in units of y, paired with its test."""

from __future__ import annotations

import numpy as np
import pytest

from batten.diagnose.bend import Bend, bend_of, flexible, knots_for
from batten.diagnose.trial import Trial, try_line
from batten.engine.rows import Rows
from batten.families import parse
from batten.fit.estimate import Estimate
from batten.fit.fitting import estimate


def trial(x: np.ndarray, y: np.ndarray, tolerance: float | None = None) -> Trial:
    rows = Rows(y, x, np.ones((len(x), 1)), np.ones((len(x), 1)))
    line = estimate(rows, parse("y ~ x"))
    assert isinstance(line, Estimate)
    reference = flexible(rows, tolerance=tolerance)
    return try_line(line, reference, bend_of(reference, line), x="mass", x_unit="kg", y_unit="min")


def test_many_rows_and_a_trivial_bend_are_too_small_to_matter_whatever_the_p() -> None:
    rng = np.random.default_rng(0)
    x = rng.uniform(0, 10, 50_000)
    got = trial(x, 5 + 2 * x + 0.004 * (x - 5) ** 2 + rng.normal(0, 1, 50_000))
    assert got.p < 0.001
    assert got.verdict == "too small to matter"
    assert got.gap_high < got.tolerance


def test_twenty_noisy_rows_cannot_tell() -> None:
    rng = np.random.default_rng(1)
    x = rng.uniform(0, 10, 20)
    assert trial(x, 5 + 2 * x + rng.normal(0, 3, 20)).verdict == "cannot tell with these rows"


def test_a_strong_bend_matters_and_says_where() -> None:
    rng = np.random.default_rng(2)
    x = rng.uniform(0, 10, 300)
    got = trial(x, (x - 5) ** 2 + rng.normal(0, 1, 300))
    assert got.verdict == "bends, and it matters"
    assert [s.side for s in got.stretches] == ["too low", "too high", "too low"]
    assert "too high by up to" in got.words
    assert " min" in got.words


def test_a_straight_truth_with_many_rows_is_straight_enough() -> None:
    rng = np.random.default_rng(3)
    x = rng.uniform(0, 10, 5_000)
    assert trial(x, 5 + 2 * x + rng.normal(0, 1, 5_000)).verdict == "straight enough"


def test_the_users_tolerance_decides_and_the_default_is_named() -> None:
    rng = np.random.default_rng(2)
    x = rng.uniform(0, 10, 300)
    y = (x - 5) ** 2 + rng.normal(0, 1, 300)
    assert trial(x, y, tolerance=100.0).verdict == "too small to matter"
    assert "our default; set yours" in trial(x, y).words
    assert "our default" not in trial(x, y, tolerance=100.0).words


def test_two_valued_predictors_cannot_bend() -> None:
    x = np.tile([0.0, 1.0], 20)
    got = trial(x, x + np.random.default_rng(0).normal(size=40))
    assert got.verdict == "cannot tell with these rows"
    assert "too few different values" in got.words


def test_the_simultaneous_band_holds_its_level_for_straight_truths() -> None:
    """A true gap of zero is inside the limits (lower limit 0) in at least about 95% of samples."""
    rng = np.random.default_rng(4)
    misses = 0
    for _ in range(200):
        x = rng.uniform(0, 10, 80)
        rows = Rows(1 + x + rng.normal(0, 1, 80), x, np.ones((80, 1)), np.ones((80, 1)))
        line = estimate(rows, parse("y ~ x"))
        assert isinstance(line, Estimate)
        bend = bend_of(flexible(rows, tolerance=1.0), line)
        assert bend is not None
        misses += bend.low > 0
    assert misses / 200 <= 0.09  # 0.05 with a Monte Carlo error of 0.015


@pytest.mark.parametrize(("n", "knots"), [(12, 3), (29, 3), (30, 4), (100, 4), (101, 5)])
def test_knots_depend_on_the_number_of_rows_alone(n: int, knots: int) -> None:
    assert knots_for(n) == knots


def test_the_band_from_part_of_the_rows_is_within_two_percent_of_the_whole(monkeypatch: pytest.MonkeyPatch) -> None:
    """Standard errors from 20,000 of 60,000 rows have a relative error near 1/sqrt(40,000), half a percent."""
    rng = np.random.default_rng(5)
    x = rng.lognormal(1, 0.5, 60_000)
    y = np.exp(0.3 * np.log(x) + rng.normal(0, 0.3, 60_000))
    rows = Rows(y, x, np.ones((60_000, 1)), np.ones((60_000, 1)))
    log = estimate(rows, parse("log y ~ log x"))
    assert isinstance(log, Estimate)
    some = bend_of(flexible(rows, tolerance=None), log)
    monkeypatch.setattr("batten.diagnose.bend.PART", 100_000)
    whole = bend_of(flexible(rows, tolerance=None), log)
    assert isinstance(some, Bend)
    assert isinstance(whole, Bend)
    np.testing.assert_array_equal(some.gap, whole.gap)
    np.testing.assert_allclose(some.error, whole.error, rtol=0.02)
