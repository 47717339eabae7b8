"""What a smooth curve says: its degrees of freedom in a sentence, among the constants, in reports."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pandas as pd
import pytest

import batten
from batten.effects.checks import checks
from batten.effects.constants import learned_constants
from batten.effects.numbers import counted
from batten.effects.own_shapes import OwnShapes, own_shapes
from batten.effects.sentences import sentences
from batten.effects.smoothing import curve_freedom, smoothing_sentence
from batten.effects.summary import summary
from batten.effects.tell import Names
from batten.effects.turn import turning_point
from batten.engine.rows import Rows
from batten.families import parse
from batten.fit.estimate import Estimate
from batten.fit.fitting import estimate

NAMES = Names("minutes", "mass", "min", "kg", covariates=True)


def rows(n: int = 120, noise: float = 0.4) -> Rows:
    rng = np.random.default_rng(5)
    x, g = rng.uniform(0, 10, n), (rng.random(n) < 0.5).astype(float)
    y = 6 + 3 * np.sin(x / 2.2) + g + rng.normal(0, noise, n)
    return Rows(y, x, np.column_stack([np.ones(n), g]), np.ones((n, 1)))


def fit(data: Rows) -> Estimate:
    done = estimate(data, parse("y ~ smooth x"))
    assert isinstance(done, Estimate)
    return done


def test_the_sentence_tells_degrees_of_freedom_beside_a_straight_lines() -> None:
    est = fit(rows())
    told = smoothing_sentence(est, NAMES)
    freedom, lines = curve_freedom(est)
    # the hat matrix's trace less the intercept and the covariate
    assert freedom == pytest.approx(est.leverage.sum() - 2, rel=1e-9)
    assert lines == 1
    assert told.text.startswith(
        f"The smooth curve in mass takes about {freedom:.1f} degrees of freedom, where a straight line takes 1;"
    )
    assert told.numbers["freedom"] == freedom
    assert told in sentences(est, NAMES, (2.0, 6.0))


def test_curves_of_groups_are_counted_together() -> None:
    data = rows()
    est = fit(replace(data, modifier=data.base))
    text = smoothing_sentence(est, NAMES).text
    assert curve_freedom(est)[1] == 2
    assert "degrees of freedom in all, where straight lines take 2" in text


def test_a_curve_that_came_out_straight_says_so() -> None:
    data = rows()
    straight = fit(replace(data, y=2 + 0.5 * data.x))
    assert "came out straight" in smoothing_sentence(straight, NAMES).text


def test_degrees_of_freedom_stand_among_the_constants_without_an_interval() -> None:
    est = fit(rows())
    found = {c.name: c for c in learned_constants(est, x="mass", y="minutes")}
    freedom = found["degrees of freedom of the curve"]
    assert freedom.estimate == curve_freedom(est)[0]
    assert np.isnan(freedom.low)
    assert "a straight line takes 1" in freedom.note
    knots = found["number of knots"]
    assert knots.estimate == len(est.state)
    assert knots.note.startswith(f"from {est.state[0]:.6g} to {est.state[-1]:.6g}; where the curve in mass may bend")


def test_the_top_of_a_smooth_curve_is_found_with_its_set() -> None:
    """sin(x / 2.2) has its top at 1.1 pi = 3.456."""
    found = turning_point(fit(rows(400)), unit="kg")
    near = [piece for piece in found.pieces if piece[0] < 3.456 < piece[1]]
    assert len(near) == 1
    assert near[0][0] < found.estimates[0] < near[0][1]


def test_checks_that_a_penalised_curve_takes() -> None:
    """Its own knots hold the reference spline's bends, so no test of the shape along x is made beside it."""
    names = {c.name for c in checks(fit(rows()), NAMES, (2.0, 6.0))}
    assert names & {"left-over bend", "repeated rows", "rows in turn", "middle rows"} == set()
    assert {"spread", "neighbouring rows", "leverage", "loudest row"} <= names


def test_no_overall_test_and_effective_constants_in_the_summary() -> None:
    est = fit(rows())
    found = {entry.name: entry for entry in summary(est, NAMES)}
    assert np.isnan(found["overall F"].value)
    assert "penalty" in found["overall F"].note
    assert found["parameters"].value == est.parameters
    assert "effective" in found["parameters"].note
    assert counted(est.parameters) == f"{est.parameters:.1f}"
    assert counted(12) == "12"


def test_groups_are_tested_under_a_spline_that_nothing_holds_back() -> None:
    data = rows()
    g = data.base[:, 1]
    found = own_shapes(fit(data), {"a": 1 - g, "b": g}, (2.0, 6.0), of="mean", level=0.95, errors="robust")
    assert isinstance(found, OwnShapes)
    # the spline with five knots has four columns in either group
    assert found.df[0] == 4
    assert 0 < found.p < 1


def test_the_default_grid_offers_smooth_curves_of_y_and_its_log() -> None:
    rng = np.random.default_rng(2)
    x = rng.uniform(1, 9, 60)
    data = pd.DataFrame({"mass": x, "minutes": np.exp(1 + 0.3 * np.sin(x) + 0.1 * rng.normal(size=60))})
    exam = batten.examine("minutes ~ mass", data, only=["smooth", "y ~ spline4 x"])
    assert {"y ~ smooth x", "log y ~ smooth x"} <= set(exam)
    fit = exam["log y ~ smooth x"]
    table = exam.table().loc["log y ~ smooth x"]
    assert table["parameters"] == pytest.approx(fit.estimate.roughness.edf + 1)
    assert table["words"] == "log of minutes on smooth curve in mass"
    assert "restricted likelihood (Patterson and Thompson 1971; Wood 2011)" in exam.write_up("log y ~ smooth x")
    assert "what smoothing may have taken away (Nychka 1988)" in exam.write_up("log y ~ smooth x")
