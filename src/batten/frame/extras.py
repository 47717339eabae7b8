"""Weights, clusters and exposure: columns beside the formula that say what a row stands for."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass

import numpy as np

from batten.engine.rows import Array, Ints
from batten.errors import data as errors
from batten.frame.columns import Bools, Column, as_groups, as_numbers, check_numbers, word
from batten.frame.rownotes import Complaint
from batten.frame.slots import Slot

__all__ = ["Beside", "Extras"]

_KINDS = ("variance", "frequency")
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
        return Extras(
            weights=None if self.weights is None else self._weights(columns[self.weights], rows),
            cluster=None if self.cluster is None else _cluster(columns[self.cluster], rows),
            offset=None if self.exposure is None else _log_exposure(columns[self.exposure], rows),
        )

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
    """weights (n,), cluster codes 0..G-1 (n,), offset = log exposure (n,); None where not given."""

    weights: Array | None
    cluster: Ints | None
    offset: Array | None


def _cluster(column: Column, rows: Bools) -> Ints:
    codes, levels = as_groups(column, rows)
    if len(levels) < 2:
        raise errors.clusters_too_few(column.name, word(levels[0]))
    return codes


def _log_exposure(column: Column, rows: Bools) -> Array:
    values = as_numbers(column)[rows]
    bad = values <= 0
    if bad.any():
        raise errors.exposure_not_positive(column.name, int(bad.sum()), len(values), float(values.min()))
    return np.log(values)
