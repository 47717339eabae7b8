"""What there is to say about single rows: why one is left out, or cannot be predicted, or lies outside the data."""

from __future__ import annotations

from collections import Counter
from collections.abc import Callable
from typing import Any

import numpy as np
import numpy.typing as npt
import pandas as pd

from batten.frame.columns import Bools

__all__ = ["Complaint", "RowNotes"]

#: rows (n,) with something to say, and the words: one text for all, or a function of the row's position
Complaint = tuple[Bools, str | Callable[[int], str]]


class RowNotes:
    """Collects complaints. bad (n,): rows that cannot be used. texts (n,): what is said of each row, "" if nothing."""

    def __init__(self, count: int) -> None:
        self.bad: Bools = np.zeros(count, dtype=bool)
        self.texts: npt.NDArray[np.object_] = np.full(count, "", dtype=object)
        self._counts: Counter[str] = Counter()

    def add(self, complaint: Complaint, *, fatal: bool = True) -> None:
        rows, words = complaint
        places = np.flatnonzero(rows)
        if isinstance(words, str):
            fresh = places[self.texts[places] == ""]
            self._counts[words] += len(fresh)
            self.texts[fresh] = words
            places = np.setdiff1d(places, fresh, assume_unique=True)
        for i in places:
            said = words if isinstance(words, str) else words(int(i))
            if said not in self.texts[i].split("; "):  # a column may be used in two ways
                self._counts[said] += 1
                self.texts[i] = f"{self.texts[i]}; {said}" if self.texts[i] else said
        if fatal:
            self.bad |= rows

    def summary(self, most: int = 6) -> str:
        """ "3 missing alloy, 1 infinite minutes", the most frequent first."""
        told = [f"{count} {words}" for words, count in self._counts.most_common() if count]
        return ", ".join(told[:most]) + (f" and {len(told) - most} other reasons" if len(told) > most else "")

    def left_out(self, index: pd.Index[Any]) -> pd.DataFrame:
        """One row per bad row, under the frame's own index: column "why"."""
        return pd.DataFrame({"why": self.texts[self.bad]}, index=index[self.bad], dtype=object)
