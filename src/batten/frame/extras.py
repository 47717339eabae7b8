"""Weights, clusters and exposure: columns beside the formula that say what a row stands for.

With an exposure the response is analysed per unit of it, and its variance falls with the exposure: under the log link
these are the coefficients of a Poisson model with log exposure as offset, and every other remedy answers the same
question. Frequencies are written out as repeated rows.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass

import numpy as np

from batten.engine.rows import Array, Ints
from batten.errors import data as errors
from batten.frame.columns import Bools, Column, as_groups, as_numbers, check_numbers, look, word
from batten.frame.rownotes import Complaint
from batten.frame.slots import Slot
from batten.frame.tables import Table

__all__ = ["Beside", "Extras"]

_KINDS = ("variance", "frequency")
#: most rows that frequencies are written out to
MOST_ROWS = 20_000_000
_SURVEY = ("survey", "sampling", "probability", "design", "pweight", "pweights", "inverse probability")


@dataclass(frozen=True)
class Beside:
    """Names of the columns beside the formula, and the kind of the weights."""

    weights: str | None = None
    weights_kind: str | None = None
    cluster: str | None = None
    exposure: str | None = None

    @property
    def columns(self) -> dict[str, str]:
        """Option -> column, for those given."""
        given = {"weights": self.weights, "cluster": self.cluster, "exposure": self.exposure}
        return {option: name for option, name in given.items() if name is not None}

    def check_kind(self) -> None:
        kind = self.weights_kind
        if self.weights is None:
            if kind is not None:
                raise errors.kind_without_weights(kind)
        elif kind is None:
            raise errors.weights_kind_missing(self.weights)
        elif kind.lower() in _SURVEY:
            raise errors.survey_weights(kind)
        elif kind not in _KINDS:
            raise errors.unknown_weights_kind(kind, _KINDS)
        elif kind == "variance" and self.exposure is not None:
            raise errors.weights_and_exposure(self.weights, self.exposure)

    def check_numbers(self, columns: Mapping[str, Column]) -> None:
        """Weights and exposure must be numbers."""
        for option, name in self.columns.items():
            if option != "cluster":
                check_numbers(columns[name], option)

    def complaints(self, columns: Mapping[str, Column]) -> Iterator[Complaint]:
        """Rows in which one of the columns is missing or infinite, or the frequency is zero."""
        for option, name in self.columns.items():
            yield from Slot(name, "groups" if option == "cluster" else "numbers").complaints(columns[name])
        if self.weights is not None and self.weights_kind == "frequency":
            yield as_numbers(columns[self.weights]) == 0, f"{self.weights} is 0"

    def extras(self, columns: Mapping[str, Column], rows: Bools) -> Extras:
        """The values on the analysis rows, checked."""
        weights = None if self.weights is None else self._weights(columns[self.weights], rows)
        frequent = self.weights_kind == "frequency"
        return Extras(
            times=None if weights is None or not frequent else _times(self.weights or "", weights),
            weights=None if frequent else weights,
            cluster=None if self.cluster is None else _cluster(columns[self.cluster], rows),
            exposure=None if self.exposure is None else _exposure(columns[self.exposure], rows),
        )

    def of_further(self, table: Table, average: float) -> tuple[Array | None, Array | None]:
        """(weight over the average one, exposure) of further rows (k,), each None where its column is not there.

        Where a value is missing or not above zero it is NaN.
        """
        name = self.exposure or (self.weights if self.weights_kind == "variance" else None)
        if name is None or name not in table.counts:
            return None, None
        values = as_numbers(look(name, table.frame([name])[name]))
        values = np.where(values > 0, values, np.nan)
        return values / average, values if self.exposure is not None else None

    def _weights(self, column: Column, rows: Bools) -> Array:
        values = as_numbers(column)[rows]
        if self.weights_kind == "variance":
            bad = values <= 0
            if bad.any():
                raise errors.weights_not_positive(column.name, int(bad.sum()), len(values), float(values.min()))
        else:
            bad = (values < 0) | (values != np.round(values))
            if bad.any():
                raise errors.frequency_not_whole(column.name, int(bad.sum()), len(values), float(values[bad][0]))
        return values


@dataclass(frozen=True, eq=False)
class Extras:
    """times (how many equal rows each stands for), weights of variance, cluster codes 0..G-1, exposure, each (n,); None
    where not given."""

    times: Ints | None
    weights: Array | None
    cluster: Ints | None
    exposure: Array | None

    @property
    def average_weight(self) -> float:
        """Of the analysis rows; 1 without weights."""
        values = self.weights if self.exposure is None else self.exposure
        return 1.0 if values is None else float(np.average(values, weights=self.times))

    @property
    def relative_weight(self) -> Array | None:
        """Weights (n,) over their average: those of variance, or the exposure."""
        values = self.weights if self.exposure is None else self.exposure
        return None if values is None else values / self.average_weight

    @property
    def written_out(self) -> Ints:
        """Positions of the stored rows with repetition (sum of times,); asked only where there are times."""
        assert self.times is not None
        return np.repeat(np.arange(len(self.times)), self.times)


def _times(name: str, weights: Array) -> Ints:
    if weights.sum() > MOST_ROWS:
        raise errors.too_many_repeats(name, float(weights.sum()), MOST_ROWS)
    return weights.astype(np.intp)


def _cluster(column: Column, rows: Bools) -> Ints:
    codes, levels = as_groups(column, rows)
    if len(levels) < 2:
        raise errors.clusters_too_few(column.name, word(levels[0]))
    return codes


def _exposure(column: Column, rows: Bools) -> Array:
    values = as_numbers(column)[rows]
    bad = values <= 0
    if bad.any():
        raise errors.exposure_not_positive(column.name, int(bad.sum()), len(values), float(values.min()))
    return values
