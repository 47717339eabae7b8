"""The table's rows as renderers read them: one typed entry per remedy, numbers straight from `exam.table()`."""

from __future__ import annotations

import math
from collections.abc import Iterable
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

from batten.compare.choose import Gap, gaps
from batten.report import numerals

if TYPE_CHECKING:
    from batten.exam.examination import Examination

__all__ = ["Entry", "Refused", "entries", "lowest", "refused", "standings"]


@dataclass(frozen=True)
class Entry:
    """One remedy: errors, gap and difference in units of y."""

    key: str
    rmse: float
    gap: float
    tied: bool
    within_10: float
    leftover: str
    parameters: float
    difference: float
    low: float
    high: float
    note: str

    @property
    def defined(self) -> bool:
        """Whether the difference over the span has a number."""
        return math.isfinite(self.difference)

    def difference_words(self, unit: str = "") -> str:
        """The difference with its interval, in words."""
        return numerals.difference(self.difference, self.low, self.high, unit)


@dataclass(frozen=True)
class Refused:
    """A remedy that cannot be used on these rows, and what to use instead."""

    key: str
    wrong: str
    seen: str
    instead: str


def entries(exam: Examination, keys: Iterable[str] | None = None) -> dict[str, Entry]:
    """Every remedy by key, or those asked for, in table order."""
    table = exam.table(keys)
    out = {}
    for key, row in zip(table.index, table.to_dict("records"), strict=True):
        out[str(key)] = _entry(str(key), {str(name): value for name, value in row.items()})
    return out


def _entry(key: str, row: dict[str, Any]) -> Entry:
    return Entry(
        key=key, rmse=float(row["rmse"]), gap=float(row["rmse_gap"]), tied=bool(row["tied"]),
        within_10=float(row["within_10"]), leftover=str(row["leftover"]), parameters=float(row["parameters"]),
        difference=float(row["difference"]), low=float(row["difference_low"]), high=float(row["difference_high"]),
        note=str(row["note"]),
    )  # fmt: skip


def lowest(exam: Examination) -> float:
    """The lowest held-out error, which sets the digits of all."""
    return exam.comparison.scores[exam.choice.best].rmse


def standings(exam: Examination) -> dict[str, Gap]:
    """How far each remedy's held-out error lies behind the lowest, and whether it is tied with it."""
    return gaps(exam.comparison.candidates, exam.comparison.splits.k)


def refused(exam: Examination) -> list[Refused]:
    """The remedies that cannot be used."""
    table = exam.refused.reset_index().to_dict("records")
    return [Refused(str(r["key"]), str(r["wrong"]), str(r["seen"]), str(r["instead"])) for r in table]
