"""An interruption at any moment leaves nothing behind: no threads, no half-made state, the same answers afterwards."""

from __future__ import annotations

import signal
import threading
import time
from collections.abc import Callable

import numpy as np
import pandas as pd
import pytest

import batten
from batten.engine.threads import MANY_ROWS

FORMULA = "y ~ x + C(g)"
ONLY = ["ladder", "hinges", "links", "smooth"]


def frame(n: int) -> pd.DataFrame:
    rng = np.random.default_rng(3)
    x, g = rng.lognormal(2, 0.6, n), rng.integers(0, 3, n)
    y = np.exp(0.5 + 0.8 * np.log(x) + 0.1 * g + rng.normal(0, 0.25, n))
    return pd.DataFrame({"y": y, "x": x, "g": np.array(["low", "middle", "high"])[g]})


def numbers(data: pd.DataFrame) -> pd.DataFrame:
    exam = batten.examine(FORMULA, data, only=ONLY)
    return exam.table()[["rmse", "rmse_gap", "mae", "parameters", "difference", "difference_low", "difference_high"]]


def stops_at(step: int) -> Callable[[int, int, str], None]:
    told = iter(range(step + 1))

    def progress(done: int, total: int, label: str) -> None:
        if next(told) == step:
            raise KeyboardInterrupt

    return progress


@pytest.mark.parametrize("n", [150, MANY_ROWS + 500])
def test_an_interruption_from_the_progress_callback_leaves_nothing_behind(n: int) -> None:
    data = frame(n)
    before, threads, kept = numbers(data), threading.active_count(), data.copy()
    for step in (0, 3):
        with pytest.raises(KeyboardInterrupt):
            batten.examine(FORMULA, data, only=ONLY, progress=stops_at(step))
        assert threading.active_count() == threads
    pd.testing.assert_frame_equal(numbers(data), before, check_exact=True)
    pd.testing.assert_frame_equal(data, kept, check_exact=True)


@pytest.mark.parametrize("n", [400, MANY_ROWS + 500])
def test_an_interruption_by_a_signal_leaves_nothing_behind(n: int) -> None:
    """A timer raises KeyboardInterrupt wherever the work stands, as a notebook's stop button does."""
    data = frame(n)
    start = time.perf_counter()
    before, threads = numbers(data), threading.active_count()
    whole = time.perf_counter() - start

    def stop(*_: object) -> None:
        raise KeyboardInterrupt

    old = signal.signal(signal.SIGALRM, stop)
    stopped = 0
    try:
        for share in (0.02, 0.1, 0.3):
            signal.setitimer(signal.ITIMER_REAL, share * whole)
            try:
                batten.examine(FORMULA, data, only=ONLY)
            except KeyboardInterrupt:
                stopped += 1
            finally:
                signal.setitimer(signal.ITIMER_REAL, 0)
            assert threading.active_count() == threads
    finally:
        signal.signal(signal.SIGALRM, old)
    assert stopped
    pd.testing.assert_frame_equal(numbers(data), before, check_exact=True)


def test_one_worker_and_two_give_the_same_digits(monkeypatch: pytest.MonkeyPatch) -> None:
    data = frame(MANY_ROWS + 500)
    monkeypatch.setattr("batten.engine.threads.os.cpu_count", lambda: 1)
    alone = numbers(data)
    monkeypatch.setattr("batten.engine.threads.os.cpu_count", lambda: 2)
    pd.testing.assert_frame_equal(numbers(data), alone, check_exact=True)
