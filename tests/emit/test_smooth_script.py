"""Scripts of smooth curves: every design, kind of error and number of rows gives the numbers of the fit."""

from __future__ import annotations

import numpy as np
import pandas as pd
import pytest
from cases import agrees, foundry, write

DESIGNS = {
    "alone": "minutes ~ mass_kg",
    "beside a factor": "minutes ~ mass_kg + C(alloy) + depth",
    "crossed with a factor": "minutes ~ mass_kg * C(alloy)",
    "within a factor": "minutes ~ C(alloy) + mass_kg:C(alloy) - 1",
    "crossed with a number": "minutes ~ mass_kg * depth",
    "through zero": "minutes ~ mass_kg + depth - 1",
}


@pytest.mark.parametrize(
    ("key", "design"),
    [
        ("y ~ smooth x", "crossed with a factor"), ("y ~ smooth x", "crossed with a number"),
        ("log y ~ smooth x", "beside a factor"), ("log y ~ smooth x", "within a factor"),
        ("sqrt y ~ smooth x", "through zero"), ("boxcox(0.3) y ~ smooth x", "alone"),
    ],
)  # fmt: skip
def test_every_design_and_scale(key: str, design: str) -> None:
    data = foundry()
    written = write(key, DESIGNS[design], data)
    assert max(map(len, written.lines)) <= 120
    assert len(written.lines) <= 85
    agrees(written, data)


@pytest.mark.parametrize("key", ["y ~ smooth x", "log y ~ smooth x", "boxcox(0.3) y ~ smooth x"])
def test_errors_of_one_size(key: str) -> None:
    data = foundry()
    agrees(write(key, DESIGNS["beside a factor"], data, errors="constant"), data, engines=("patsy",))


def test_few_rows_and_a_profile() -> None:
    data = foundry(30)
    written = write("log y ~ smooth x", "minutes ~ mass_kg + depth", data, at={"depth": 1.0})
    agrees(written, data, engines=("formulaic",))


@pytest.mark.parametrize("key", ["y ~ smooth x", "log y ~ smooth x"])
def test_many_rows(key: str) -> None:
    data = foundry(3_200)
    agrees(write(key, "minutes ~ mass_kg + C(alloy)", data), data, engines=("patsy",))


def test_a_curve_over_days() -> None:
    data = foundry().assign(day=lambda d: pd.Timestamp("2031-05-01") + pd.to_timedelta(np.round(d["mass_kg"]), "D"))
    agrees(write("y ~ smooth x", "minutes ~ day * C(alloy)", data, focus="day"), data, engines=("patsy",))


def test_a_curve_that_came_out_straight() -> None:
    """The penalty's rows are then some million times as long as the data's, which costs digits."""
    data = foundry().assign(minutes=lambda d: 3 + 0.5 * d["mass_kg"] + 0.1 * np.sin(40 * d["depth"]))
    written = write("y ~ smooth x", "minutes ~ mass_kg", data)
    assert written.estimate.roughness is not None
    assert written.estimate.roughness.end == "straight"
    agrees(written, data, rtol=1e-6, engines=("patsy",))
