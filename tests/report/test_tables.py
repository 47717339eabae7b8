"""Tables: cells are the examination's numbers, in plain words and units, as HTML and as text."""

from __future__ import annotations

import re

import numpy as np
import pandas as pd
import pytest
from situations import QUICK, examined, fan
from traced import known_numbers, untraced

import batten
from batten.compare.shortlist import shortlist
from batten.report import numerals
from batten.report.entries import entries
from batten.report.fit_tables import lookup_table
from batten.report.grid import Column, Grid, as_html, as_text
from batten.report.tables import full_grid, full_table, refused_grid, refused_table, shortlist_grid, shortlist_text


def test_the_first_table_has_the_shortlists_rows_in_its_order() -> None:
    exam = examined("fan", 40, *QUICK)
    grid = shortlist_grid(exam)
    assert [(row[0], row[2]) for row in grid.rows] == shortlist(exam.comparison)
    assert len(grid.rows) <= 5
    assert grid.marks.count("choice") == 1


def test_columns_are_named_in_words_with_units_and_what_they_are_about() -> None:
    heads = [c.head for c in shortlist_grid(examined("fan", 40, *QUICK)).columns]
    assert heads == [
        "role", "remedy", "key", "held-out error, min (mean)", "behind the lowest, min",
        "difference 10 to 25 kg, min (mean)", "left-over bend",
    ]  # fmt: skip


def test_the_whole_table_has_every_remedy_in_table_order_with_its_numbers() -> None:
    exam = examined("fan", 300, *QUICK)
    grid, table = full_grid(exam), exam.table()
    assert [row[1] for row in grid.rows] == list(table.index)
    best = table["rmse"].min()
    for row, (_, want) in zip(grid.rows, table.iterrows(), strict=True):
        step = max(best / 100, want["rmse"] / 20) / 10
        assert float(row[2].replace(",", "")) == pytest.approx(want["rmse"], abs=step)
        assert ("(tied)" in row[3]) == (bool(want["tied"]) and want["rmse_gap"] > 0)
    text = "\n".join(" ".join(row[2:7]) for row in grid.rows)
    assert untraced(text, known_numbers(exam, *table["parameters"])) == []


def test_what_cannot_be_used_is_listed_with_what_to_use_instead() -> None:
    exam = examined("fan", 40, *QUICK)
    grid = refused_grid(exam)
    assert [row[1] for row in grid.rows] == list(exam.refused.index)
    assert len(grid.rows) >= 1
    assert all(all(cell for cell in row) for row in grid.rows)
    assert [row[4] for row in grid.rows] == list(exam.refused["instead"])


def test_a_remedy_without_an_answer_says_so() -> None:
    exam = examined("plateau", 60, "y ~ x", "y ~ bins5 x", span=(1.0, 1.2))
    cells = {row[1]: row[4] for row in full_grid(exam).rows}
    assert cells["y ~ bins5 x"] == "no number"
    note = next(row[8] for row in full_grid(exam).rows if row[1] == "y ~ bins5 x")
    assert "grouping cannot answer" in note


def test_html_cells_are_escaped_and_rows_are_marked() -> None:
    grid = Grid((Column("<b>"), Column("n", "number")), (("<script>", "1 & 2"),), ("choice",))
    html = as_html(grid)
    assert "<script>" not in html
    assert '<th scope="col">&lt;b&gt;</th>' in html
    assert '<tr class="batten-choice"><th scope="row">&lt;script&gt;</th>' in html
    assert '<td class="batten-number">1 &amp; 2</td>' in html


def test_every_table_of_hostile_names_is_escaped() -> None:
    exam = examined("hostile", 60, *QUICK)
    for html in (full_table(exam), refused_table(exam)):
        assert "<img" not in html
        assert "<i>" not in html
        assert "_&lt;b&gt;cost" in html


def test_text_columns_line_up_and_numbers_stand_right() -> None:
    grid = Grid(
        (Column("remedy", "words"), Column("held-out error, min", "number")),
        (("log of minutes on log of mass_kg", "1.25"), ("質量", "12.50")), ("", ""),
    )  # fmt: skip
    lines = as_text(grid, width=40).splitlines()
    assert lines[-1].endswith(" 12.50")
    assert {len(line) for line in lines if line.endswith(("5", "min"))} == {len(lines[0])}
    # a wide letter takes two columns of a terminal
    assert len(lines[-1]) == len(lines[0]) - 2


def test_words_break_onto_further_lines_and_numbers_do_not() -> None:
    columns = Column("remedy", "words"), Column("n", "number")
    grid = Grid(columns, (("one two three four five six", "123,456.78"),), ("",))
    text = as_text(grid, width=26)
    assert "123,456.78" in text
    assert max(map(len, text.splitlines())) <= 26
    assert " ".join(word for word in text.split() if word.isalpha()) == "remedy n one two three four five six"


def test_the_terminals_table_goes_by_keys() -> None:
    text = shortlist_text(examined("bowl", 40, *QUICK))
    assert "y ~ poly2 x" in text
    assert "quadratic" not in text


def test_entries_are_the_tables_rows() -> None:
    exam = examined("fan", 40, *QUICK)
    table = exam.table()
    for key, entry in entries(exam).items():
        row = table.loc[key]
        same = [entry.rmse, entry.gap, entry.difference, entry.low, entry.high]
        np.testing.assert_array_equal(
            same, row[["rmse", "rmse_gap", "difference", "difference_low", "difference_high"]].to_numpy(float)
        )


@pytest.mark.parametrize(
    ("value", "lowest", "text"),
    [(20.8774, 20.8774, "20.88"), (21.065, 20.8774, "21.07"), (447635.1, 20.9, "448,000"), (0.43, 0.4295, "0.4300"),
     (0.0, 0.0, "0")],
)  # fmt: skip
def test_errors_share_the_digits_of_the_lowest(value: float, lowest: float, text: str) -> None:
    assert numerals.error(value, lowest) == text


def test_a_difference_has_its_sign_its_unit_and_its_interval() -> None:
    assert numerals.difference(54.46, 51.5, 57.4, "min") == "+54.5 min (51.5 to 57.4)"
    assert numerals.difference(-3.214, -5.04, -1.391, "min") == "-3.2 min (-5.0 to -1.4)"
    assert numerals.difference(3.21, float("nan"), float("nan")) == "+3.21 (no interval)"
    assert numerals.difference(float("nan"), float("nan"), float("nan")) == "not defined"


def test_rows_asked_for_by_themselves_are_those_of_the_whole_table() -> None:
    whole, fresh = examined("fan", 40, *QUICK), fan(40).examine(only=list(QUICK))
    keys = ["log y ~ log x", "y~x"]
    some = fresh.table(keys)
    assert list(some.index) == [key for key in whole if key in ("y ~ x", "log y ~ log x")]
    pd.testing.assert_frame_equal(some, whole.table().loc[some.index])
    with pytest.raises(batten.BattenError):
        fresh.table(["y ~ log10 x"])


def test_values_to_look_up_are_the_fits_own_by_group_too() -> None:
    exam = fan(60).examine(only=["y ~ x", "log y ~ log x"], by="alloy", folds=4, repeats=1)
    fit = exam["log y ~ log x"]
    html = lookup_table(fit, exam.question.by)
    rows = [re.findall(r"<t[hd][^>]*>([^<]*)</t[hd]>", row) for row in html.split("<tr>")[2:]]
    wanted = fit.lookup(by="alloy")
    # the last digit printed is at most a twentieth of a tenth of the middle value
    half = float(wanted[["mean", "median", "low", "high"]].stack().median()) / 400
    assert [(group, float(x)) for group, x, *_ in rows] == list(wanted.index)
    for (_, _, *cells), (_, want) in zip(rows, wanted.iterrows(), strict=True):
        for text, value in zip(cells, want[["mean", "median", "low", "high"]], strict=True):
            assert float(text.replace(",", "")) == pytest.approx(value, abs=half)
    assert "where 95% of new rows are expected" in html
