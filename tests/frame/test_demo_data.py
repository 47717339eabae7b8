"""The demo data are what their script makes, and hold the truth their description states."""

from __future__ import annotations

import importlib.util
from pathlib import Path
from types import ModuleType

import numpy as np
import pandas as pd
import pytest
import statsmodels.formula.api as smf

from batten.errors import UnknownNameError
from batten.frame.read import read
from batten.frame.samples import sample


def script() -> ModuleType:
    path = Path(__file__).with_name("make_samples.py")
    spec = importlib.util.spec_from_file_location("make_samples", path)
    assert spec is not None
    assert spec.loader is not None
    module = importlib.util.module_from_spec(spec)
    spec.loader.exec_module(module)
    return module


def test_the_files_are_what_the_script_makes() -> None:
    made = script()
    for name, text in made.texts().items():
        assert (made.FOLDER / f"{name}.csv").read_text(encoding="utf-8") == text


@pytest.mark.parametrize(("name", "rows", "date"), [
    ("castings", 240, "poured on"), ("glasshouse", 180, "harvested"), ("pumps", 200, "logged at"),
])  # fmt: skip
def test_every_call_gives_a_fresh_frame(name: str, rows: int, date: str) -> None:
    frame = sample(name)
    assert len(frame) == rows
    assert pd.api.types.is_datetime64_any_dtype(frame[date])
    frame.iloc[:, -1] = 0
    assert sample(name).iloc[0, -1] != 0


def within(estimate: float, truth: float, error: float) -> bool:
    """Within three standard errors: the data are fixed, so this holds or not once and for all."""
    return abs(estimate - truth) < 3 * error


def test_castings_hold_their_truth() -> None:
    fit = smf.ols("np.log(minutes) ~ np.log(mass_kg) + alloy", sample("castings")).fit()
    truth = {
        "Intercept": 1.2,
        "np.log(mass_kg)": 0.5,
        "alloy[T.grey iron]": np.log(1.2),
        "alloy[T.steel]": np.log(1.55),
    }
    for name, value in truth.items():
        assert within(fit.params[name], value, fit.bse[name]), name
    assert fit.mse_resid**0.5 == pytest.approx(0.18, rel=0.1)  # its standard error is 5% at 235 rows


def test_glasshouse_holds_its_truth() -> None:
    frame = sample("glasshouse")
    frame["rise"] = 17 * (1 - np.exp(-frame["daily light"] / 9))
    fit = smf.ols("yield_kg ~ rise + cultivar + bed_age", frame).fit()
    truth = {"Intercept": 4, "rise": 1, "cultivar[T.striped]": 1.6, "cultivar[T.yellow]": -1.1, "bed_age": -0.4}
    for name, value in truth.items():
        assert within(fit.params[name], value, fit.bse[name]), name
    assert fit.mse_resid**0.5 == pytest.approx(1.2, rel=0.12)


def test_pumps_hold_their_truth() -> None:
    frame = sample("pumps")
    frame["bowl"] = (frame["flow"] - 74) ** 2
    fit = smf.ols("energy ~ bowl + flow + pump", frame).fit()
    truth = {"bowl": 0.00007, "flow": 0, "pump[T.north 2]": 0.02, "pump[T.south 1]": 0.05, "pump[T.south 2]": -0.015}
    for name, value in truth.items():
        assert within(fit.params[name], value, fit.bse[name]), name
    assert fit.mse_resid**0.5 == pytest.approx(0.016, rel=0.12)


def test_the_demo_data_can_be_read() -> None:
    castings = read("minutes ~ mass_kg + C(alloy)", sample("castings"))
    assert (castings.rows.count, len(castings.left_out)) == (235, 5)
    assert castings.announcements == (
        "Focal predictor: mass_kg, the only plain numeric predictor.",
        "5 of 240 rows are left out: 3 missing alloy, 1 missing minutes, 1 missing mass_kg.",
        "Values repeat in heat (60 in 235 rows): are rows that share one independent? "
        "If not, give that column as cluster.",
        "poured on: rows close in time can resemble each other; look at what is left in order of time.",
    )
    assert read('yield_kg ~ Q("daily light") + cultivar + bed_age', sample("glasshouse")).focus == "daily light"
    assert read("energy ~ flow*pump", sample("pumps")).rows.modifier.shape[1] == 4


def test_an_unknown_sample_is_asked_about() -> None:
    with pytest.raises(UnknownNameError) as caught:
        sample("casting")
    assert str(caught.value) == "There is no sample 'casting'.\nDid you mean 'castings'?"
