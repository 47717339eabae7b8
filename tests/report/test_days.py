"""Dates on axes: ticks stand at round dates, and their labels say the date they stand at (pandas reads them back)."""

from __future__ import annotations

from datetime import datetime

import numpy as np
import pandas as pd
import pytest

import batten
from batten.report import figures
from batten.report.days import counted_from, day_of, day_ticks
from batten.report.fit_tables import lookup_table

START = datetime(2025, 3, 10)


@pytest.mark.parametrize(
    ("low", "high"), [(0.1, 0.9), (-1.5, 3), (0, 12), (3, 61), (0, 200), (0, 700), (-400, 5000), (0, 80_000)]
)
def test_labels_are_the_dates_that_their_ticks_stand_at(low: float, high: float) -> None:
    places, labels = day_ticks(START, low, high, most=6)
    assert 2 <= len(places) <= 7
    assert (np.diff(places) > 0).all()
    assert low <= places[0]
    assert places[-1] <= high
    for place, label in zip(places, labels, strict=True):
        # a label of hours leaves the year out, one of years the month
        read = pd.Timestamp(label if len(label) > 4 else f"{label}-01-01")
        stands = pd.Timestamp(START) + pd.Timedelta(days=float(place)).round("s")
        assert (read.month, read.day, read.hour, read.minute) == (stands.month, stands.day, stands.hour, stands.minute)
        assert str(stands.year) in label or ":" in label


def test_weeks_begin_on_mondays_and_months_on_their_first() -> None:
    weeks, _ = day_ticks(START, 3, 33, most=6)
    assert {(pd.Timestamp(START) + pd.Timedelta(days=float(place))).day_name() for place in weeks} == {"Monday"}
    months, _ = day_ticks(START, 0, 400, most=6)
    assert {(pd.Timestamp(START) + pd.Timedelta(days=float(place))).day for place in months} == {1}


def test_a_place_is_told_as_a_date_with_its_time_of_day_where_it_has_one() -> None:
    assert day_of(START, 21) == "2025-03-31"
    assert day_of(START, 21.5) == "2025-03-31 12:00"
    assert day_of(START, -10 + 1e-9) == "2025-02-28"


def test_an_axis_of_dates_is_labelled_with_dates() -> None:
    rng = np.random.default_rng(2)
    day = pd.Timestamp("2025-01-15") + pd.to_timedelta(rng.integers(0, 300, 60), unit="D")
    sill = 20 + 0.05 * (day - day.min()).days + rng.normal(0, 1, 60)
    frame = pd.DataFrame({"mm": sill, "read on": day})
    exam = batten.examine("mm ~ Q('read on')", frame, only=["y ~ x", "y ~ poly2 x"], folds=4, repeats=1)
    assert counted_from(exam.problem) == frame["read on"].min()
    for made in (figures.line_against_choice(exam), figures.fit_figure(exam.chosen), figures.left_figure(exam.chosen)):
        words = [text.get_text() for text in made.axes[0].texts]
        assert {"Mar 2025", "Sep 2025"} <= set(words)
    table = lookup_table(exam.chosen)
    assert '<th scope="col" class="batten-number">read on</th>' in table
    assert f">{day_of(frame['read on'].min(), exam.lookup().index[1])}</th>" in table
    assert counted_from(batten.examine("mm ~ x", frame.assign(x=np.arange(60.0)), only="y ~ x").problem) is None
