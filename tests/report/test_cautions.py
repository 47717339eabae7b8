"""Cautions: at most two, only where they apply, the gravest first."""

from __future__ import annotations

import numpy as np
import pandas as pd
import pytest
from situations import QUICK, Situation, bowl, examined, fan, plateau

import batten
from batten.report.cautions import cautions, choosing_note, left_out_words


def test_a_sound_answer_has_no_caution() -> None:
    assert cautions(examined("fan", 300, "y ~ x", "log y ~ log x")) == ()


def test_a_bend_that_is_left_comes_first() -> None:
    exam = examined("bowl", 40, *QUICK)
    first = cautions(exam, "y ~ x")[0]
    bend = exam.comparison.bends["y ~ x"]
    assert first.startswith(f"This curve still misses a flexible one by up to {bend.largest:.2f} mm/s")
    assert not any("flexible" in words for words in cautions(exam))


def test_an_end_of_the_span_outside_the_rows_is_named() -> None:
    exam = plateau(300).examine(span=(5.0, 40.0), only=["y ~ x", "y ~ log x"])
    found = [words for words in cautions(exam, "y ~ log x") if "outside the rows" in words]
    low, high = exam.problem.rows.x.min(), exam.problem.rows.x.max()
    assert found == [
        f"dose_ml of 40 ml lies outside the rows ({low:g} to {high:g} ml): there every curve is a guess, and its "
        "interval does not know it."
    ]


def test_few_rows_are_pointed_out() -> None:
    assert any(words.startswith("Only 20 rows") for words in cautions(plateau(20).examine(only=["y ~ x", "y ~ log x"])))
    exam = examined("fan", 40, *QUICK)
    assert any(words.startswith("40 rows for") for words in cautions(exam, "log y ~ spline4 x"))


def test_a_row_that_carries_the_correction_is_named_by_its_label() -> None:
    made = fan(60)
    frame = made.frame.set_axis([f"casting {i}" for i in range(60)])
    frame.loc["casting 7", "minutes"] = 400_000.0
    exam = Situation(made.formula, frame, made.focus, made.span, made.units).examine(only=["log y ~ log x"])
    found = [words for words in cautions(exam, "log y ~ log x") if "casting 7" in words]
    assert len(found) == 1
    assert "alone supplies" in found[0]
    assert "Read the median." in found[0]


def test_a_row_that_decides_its_own_fitted_value_is_named_with_its_leverage() -> None:
    exam = examined("fan", 40, *QUICK)
    fit = exam["y ~ poly2 x"]
    frame = fan(40).frame
    alloys = pd.get_dummies(frame["alloy"]).iloc[:, 1:]
    X = np.column_stack([np.ones(40), frame["mass_kg"], frame["mass_kg"] ** 2, alloys])
    h = np.diag(X @ np.linalg.pinv(X))
    row = int(h.argmax())
    assert h[row] > 0.5
    wanted = f"Row {row} (mass_kg {frame['mass_kg'][row]:g} kg) decides {100 * h[row]:.0f}% of its own fitted value"
    assert any(words.startswith(wanted) for words in cautions(exam, fit.key))


def test_rows_that_err_like_their_neighbours_are_pointed_out() -> None:
    rng = np.random.default_rng(2)
    x = rng.uniform(1, 9, 200)
    drift = np.cumsum(rng.normal(0, 0.4, 200))
    frame = pd.DataFrame({"x": x, "y": 3 + 2 * x + drift})
    exam = batten.examine("y ~ x", frame, only=["y ~ x"])
    assert any(words.startswith("Rows stored beside each other err alike") for words in cautions(exam))


def test_many_rows_left_out_are_counted_with_their_reasons() -> None:
    made = bowl(300)
    frame = made.frame.copy()
    frame.loc[:29, "air_c"] = np.nan
    frame.loc[30:34, "vibration"] = np.nan
    exam = batten.examine(made.formula, frame, focus="speed_rpm", only=["y ~ x", "y ~ poly2 x"])
    words = left_out_words(exam.problem)
    assert words == "35 of 300 rows were left out (30 missing air_c, 5 missing vibration)."
    assert any(caution.startswith(words) for caution in cautions(exam, "y ~ poly2 x"))
    assert left_out_words(examined("fan", 40, *QUICK).problem) == ""


def test_thin_ends_of_the_span_are_counted() -> None:
    exam = fan(300).examine(span=(10.0, 60.0), only=["y ~ x", "log y ~ log x"])
    above = int((exam.problem.rows.x >= 60).sum())
    assert 0 < above < 5
    assert any(f"{above} at or above 60 kg" in words for words in cautions(exam, "log y ~ log x"))


@pytest.mark.parametrize("key", ["y ~ x", "log y ~ log x", "y ~ bins5 x", "loglink y ~ x"])
def test_there_are_at_most_two_for_any_remedy(key: str) -> None:
    made = fan(20).examine(span=(1.0, 300.0), only=["y ~ x", "log y ~ log x", "y ~ bins5 x", "loglink y ~ x"])
    if key in made:
        assert len(cautions(made, key)) <= 2
    assert len(cautions(made)) == 2


def test_the_note_on_choosing_counts_what_was_tried() -> None:
    exam = examined("fan", 40, *QUICK)
    assert f"choosing among {exam.choice.tried}" in choosing_note(exam)
    assert "not yet counted" in choosing_note(exam)
    assert "pays nothing for choosing" in choosing_note(examined("fan", 40, *QUICK, planned="sqrt y ~ x"))
