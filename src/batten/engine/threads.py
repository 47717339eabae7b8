"""One BLAS thread inside our own work.

The matrices here are tall and narrow or tiny: several threads on each of thousands of small products cost more than
they bring, and far more where other programs share the processors. A fixed number of threads also fixes the order of
additions, so printed digits do not depend on the number of processors.
"""

from __future__ import annotations

from collections.abc import Iterator
from contextlib import contextmanager
from functools import lru_cache

from threadpoolctl import ThreadpoolController

__all__ = ["one_thread"]


@lru_cache(maxsize=1)
def _controller() -> ThreadpoolController:
    # looking through the loaded libraries takes milliseconds, so it is done once
    return ThreadpoolController()


@contextmanager
def one_thread() -> Iterator[None]:
    """Hold BLAS to one thread until the block ends."""
    with _controller().limit(limits=1, user_api="blas"):
        yield
