"""One BLAS thread inside our own work.

The matrices here are tall and narrow or tiny: several threads on each of thousands of small products cost more than
they bring, and far more where other programs share the processors. A fixed number of threads also fixes the order of
additions, so printed digits do not depend on the number of processors.
"""

from __future__ import annotations

import os
from collections.abc import Callable, Iterator
from concurrent.futures import ThreadPoolExecutor
from contextlib import contextmanager
from functools import lru_cache
from typing import TypeVar

from threadpoolctl import ThreadpoolController

T = TypeVar("T")

__all__ = ["one_thread", "side_by_side"]

#: rows from which the arithmetic of one task outweighs the interpreter's lock
MANY_ROWS = 20_000


@lru_cache(maxsize=1)
def _controller() -> ThreadpoolController:
    # looking through the loaded libraries takes milliseconds, so it is done once
    return ThreadpoolController()


@contextmanager
def one_thread() -> Iterator[None]:
    """Hold BLAS to one thread until the block ends."""
    with _controller().limit(limits=1, user_api="blas"):
        yield


def side_by_side(tasks: list[Callable[[], T]], *, rows: int, before: Callable[[int], None] | None = None) -> list[T]:
    """Results of independent tasks, in their order; with many rows on two processors, where there are two.

    Each task does its own additions in its own order, so the results do not depend on the number of processors.
    before(i) is called on the calling thread before the result of task i is waited for.
    """
    workers = min(2, os.cpu_count() or 1, len(tasks))
    if rows < MANY_ROWS or workers < 2:
        return [_told(i, before, task) for i, task in enumerate(tasks)]
    with ThreadPoolExecutor(workers) as pool:
        waiting = [pool.submit(task) for task in tasks]
        try:
            return [_told(i, before, done.result) for i, done in enumerate(waiting)]
        except BaseException:  # an interrupt must not wait for tasks that have not begun
            pool.shutdown(wait=True, cancel_futures=True)
            raise


def _told(place: int, before: Callable[[int], None] | None, result: Callable[[], T]) -> T:
    if before is not None:
        before(place)
    return result()
