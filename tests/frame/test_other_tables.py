"""polars, Arrow and dicts of columns give what pandas gives, to the last bit and the last word."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import narwhals as nw
import numpy as np
import pandas as pd
import polars as pl
import pytest

from batten.errors import InputError
from batten.frame.read import read

RNG = np.random.default_rng(31)
N = 60
PANDAS = pd.DataFrame(
    {
        "y": RNG.normal(20, 3, N), "x": RNG.integers(1, 90, N), "z": RNG.uniform(2, 6, N),
        "g": RNG.choice(["ash", "beech", "cedar"], N), "flag": RNG.random(N) < 0.5,
        "day": pd.date_range("2024-01-01", periods=N), "heat id": [f"H{i // 4}" for i in range(N)],
        "unused": [[i] for i in range(N)],
    }
)  # fmt: skip
PANDAS["g"] = PANDAS["g"].astype(object)
PANDAS.loc[3, "g"] = None
PANDAS.loc[5, "z"] = np.nan
FORMULA = "y ~ x*g + np.log(z) + flag + day"

POLARS = pl.DataFrame({
    name: [None if v is None or v is pd.NaT or (isinstance(v, float) and np.isnan(v)) else v for v in PANDAS[name]]
    for name in PANDAS
})  # fmt: skip
TABLES: dict[str, Callable[[], Any]] = {
    "polars": lambda: POLARS,
    "lazy polars": lambda: POLARS.lazy(),
    "polars categories": lambda: POLARS.with_columns(pl.col("g").cast(pl.Enum(["ash", "beech", "cedar"]))),
    "Arrow": lambda: POLARS.to_arrow(),
    "Arrow-backed pandas": lambda: PANDAS.drop(columns="unused").convert_dtypes(dtype_backend="pyarrow"),
    "dict of arrays": lambda: {name: PANDAS[name].to_numpy() for name in PANDAS},
    "dict of lists": lambda: {name: list(PANDAS[name]) for name in PANDAS},
    "dict of columns with other labels": lambda: {
        name: PANDAS[name].set_axis(np.roll(np.arange(N), i)) for i, name in enumerate(PANDAS)
    },
}


@pytest.mark.parametrize("name", TABLES)
def test_every_table_gives_the_same_problem(name: str) -> None:
    for options in ({}, {"rows": "x < 70 and g != 'ash'", "cluster": "heat id"}):
        ours, theirs = read(FORMULA, TABLES[name](), **options), read(FORMULA, PANDAS, **options)
        for part in ("y", "x", "base", "modifier", "cluster"):
            np.testing.assert_array_equal(getattr(ours.rows, part), getattr(theirs.rows, part))
        assert (ours.base_names, ours.modifier_names) == (theirs.base_names, theirs.modifier_names)
        assert list(ours.left_out["why"]) == list(theirs.left_out["why"])
        assert list(ours.index) == list(theirs.index)
        said = [text for text in ours.announcements if not text.startswith("Read as numbers")]
        assert said == list(theirs.announcements)


@pytest.mark.parametrize("name", TABLES)
def test_every_table_can_be_predicted_for(name: str) -> None:
    problem = read(FORMULA, PANDAS)
    ours, theirs = problem.new_rows(TABLES[name]()), problem.new_rows(PANDAS)
    np.testing.assert_array_equal(ours.base, theirs.base)
    np.testing.assert_array_equal(ours.modifier, theirs.modifier)
    assert ours.notes == theirs.notes


def test_only_the_columns_in_use_are_fetched_whole(monkeypatch: pytest.MonkeyPatch) -> None:
    fetched: set[str] = set()
    original = nw.DataFrame.to_pandas

    def watched(self: nw.DataFrame[Any]) -> pd.DataFrame:
        if len(self) == N:
            fetched.update(self.columns)
        return original(self)

    monkeypatch.setattr(nw.DataFrame, "to_pandas", watched)
    read("y ~ x + C(g)", POLARS)
    # "heat id" is counted for the question about dependence
    assert fetched == {"y", "x", "g", "heat id"}


def test_a_table_without_rows_or_that_is_none_is_refused() -> None:
    with pytest.raises(InputError) as caught:
        read("y ~ x", POLARS.head(0))
    assert caught.value.seen == "The data have no rows."
    for thing in (None, "castings", 3, np.zeros((3, 2))):
        with pytest.raises(InputError) as caught:
            read("y ~ x", thing)
        assert caught.value.wrong == "The data must be a data frame, or a dict of columns."


def test_one_row_as_a_dict_of_single_values_can_be_predicted_for() -> None:
    problem = read("y ~ x + g", PANDAS)
    new = problem.new_rows({"x": 20, "g": "cedar"})
    np.testing.assert_array_equal(new.x, [20])
    np.testing.assert_array_equal(new.base, [[1, 0, 1]])
