"""Whether the answer hangs on the unit of y, as a number (Chen and Roth 2024; Aihounton and Henningsen 2021)."""

from __future__ import annotations

import numpy as np
import pandas as pd
import pytest
from data import A_X, A_Y, fitted, rows_of

import batten
from batten.effects.contrast import span_effect
from batten.effects.tell import Names
from batten.effects.units import unit_change

COUNTS = np.array([0.0, 0, 1, 0, 3, 2, 5, 9, 8, 14])
C = rows_of(np.arange(1.0, 11), COUNTS)
CENTS = rows_of(np.arange(1.0, 11), 100 * COUNTS)
NAMES = Names("cost", "load", "euro", "t")


@pytest.mark.parametrize(
    ("key", "slope", "slope_in_cents"),
    [("log1p y ~ x", 0.320532, 0.855718), ("asinh y ~ x", 0.400360, 0.935664)],
)
def test_slopes_move_with_the_unit_where_y_has_zeros(key, slope, slope_in_cents):
    """Slopes on the fitting scale, y as it is and times 100; computed apart."""
    assert fitted(key, C).coef[1] == pytest.approx(slope, rel=1e-5)
    assert fitted(key, CENTS).coef[1] == pytest.approx(slope_in_cents, rel=1e-5)


@pytest.mark.parametrize("key", ["log1p y ~ x", "asinh y ~ x", "yeojohnson y ~ x", "yeojohnson(0.5) y ~ x"])
def test_the_number_is_the_span_effect_of_the_refit_in_cents(key):
    found = unit_change(fitted(key, C), (3.0, 8.0))
    first, other = (span_effect(fitted(key, rows), (3.0, 8.0)) for rows in (C, CENTS))
    assert found.difference == pytest.approx(first.difference.estimate, rel=1e-12)
    assert found.difference_other == pytest.approx(other.difference.estimate / 100, rel=1e-12)
    ends = other.at_a.estimate, other.at_b.estimate
    if min(ends) > 0:
        assert found.ratio_other == pytest.approx(ends[1] / ends[0], rel=1e-12)
    assert found.change == pytest.approx(found.difference_other - found.difference, rel=1e-12)
    assert abs(found.change) > 0.01
    assert found.zeros


@pytest.mark.parametrize("key", ["y ~ x", "log y ~ x", "sqrt y ~ x", "boxcox y ~ x", "loglink y ~ x"])
def test_scales_that_take_any_unit_have_no_such_test(key):
    assert unit_change(fitted(key, rows_of(A_X, A_Y)), (5.0, 10.0)) is None


def test_far_above_the_unit_the_logs_agree():
    """log(1 + y) of thousands is log y but for a thousandth."""
    found = unit_change(fitted("log1p y ~ x", rows_of(A_X, 1000 * A_Y)), (5.0, 10.0))
    assert found.ratio_other == pytest.approx(found.ratio, rel=1e-3)
    assert not found.zeros


def test_no_span_no_number():
    assert unit_change(fitted("log1p y ~ bins2 x", rows_of(A_X, A_Y)), (2.0, 3.0)) is None


def test_it_stands_in_the_sentences_and_the_checks_and_no_percent_does():
    frame = pd.DataFrame({"load": np.arange(1.0, 11), "cost": COUNTS})
    exam = batten.examine(
        "cost ~ load", frame, only=["log1p y ~ x", "asinh y ~ x", "yeojohnson y ~ x", "log1p y ~ hinge x"], repeats=1,
        units={"cost": "euro", "load": "t"}, folds=5,
    )  # fmt: skip
    for key in [key for key in exam if key != "y ~ x"]:
        fit = exam[key]
        last = fit.sentences()[-1]
        assert last.kind == "unit"
        assert last.text.startswith("With cost in hundredths of euro the difference over the span would be ")
        assert last.text.endswith("; cost holds zeros or negatives, so nothing relative can be read off this scale.")
        check = fit.checks().loc["unit of y"]
        assert check["size"] == pytest.approx(last.numbers["difference_other"] - last.numbers["difference"], rel=1e-12)
        assert check["reading"] == last.text[0].lower() + last.text[1:-1]
        assert not any("%" in s.text.replace("95% interval", "") for s in fit.sentences())
    assert "unit of y" in exam["log1p y ~ x"].checks(every=False).index


def test_a_remedy_that_cannot_be_fitted_in_the_other_unit_says_why():
    below = unit_change(fitted("log1p y ~ x", rows_of(A_X, A_Y - 2.9)), (5.0, 10.0))
    assert below.why == "The log of 1 + y needs a response above -1"
    assert below.sentence(NAMES).text == (
        "With cost in hundredths of euro this remedy cannot be fitted: The log of 1 + y needs a response above -1."
    )
