"""Which rows a refused remedy cannot take, by the labels of the user's frame."""

from __future__ import annotations

import pandas as pd

import batten


def test_a_refused_remedy_names_the_rows_it_cannot_take() -> None:
    frame = pd.DataFrame(
        {"x": [0.0, 1, 2, 3, 4, 5, 6, 7, 8, 9], "y": [0.0, 2, -1, 4, 6, 5, 7, 8, 9, 11]}, index=list("abcdefghij")
    )
    only = ["log y ~ x", "sqrt y ~ log x", "y ~ log x", "loglink y ~ x", "share y ~ x", "1/y ~ x", "y ~ poly10 x"]
    refused = batten.examine("y ~ x", frame, only=only, repeats=1, folds=5).refused
    assert refused.loc["log y ~ x", "rows"] == ("a", "c")
    assert refused.loc["sqrt y ~ log x", "rows"] == ("a", "c")  # one for its y, one for its x
    assert refused.loc["y ~ log x", "rows"] == ("a",)
    assert refused.loc["loglink y ~ x", "rows"] == ("c",)
    assert refused.loc["1/y ~ x", "rows"] == ("a", "c")
    assert refused.loc["share y ~ x", "rows"] == tuple("bcdefghij")
    assert refused.loc["y ~ poly10 x", "rows"] == ()  # too few rows, none at fault


def test_rows_left_out_for_missing_values_do_not_shift_the_labels() -> None:
    frame = pd.DataFrame({"x": [1.0, None, 2, 3, 4, 5, 6, 7], "y": [1.0, 5, 2, 0, 4, 6, 5, 8]})
    refused = batten.examine("y ~ x", frame, only=["log y ~ x"], repeats=1, folds=3).refused
    assert refused.loc["log y ~ x", "rows"] == (3,)
