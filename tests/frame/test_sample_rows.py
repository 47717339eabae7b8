"""Which rows are analysed, and what is said of the others."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import numpy as np
import pandas as pd
import pytest

from batten.errors import BattenError, InputError, UnknownNameError
from batten.frame.read import read


def frame() -> pd.DataFrame:
    rng = np.random.default_rng(11)
    made = pd.DataFrame(
        {
            "minutes": rng.uniform(5, 60, 40).round(1),
            "mass_kg": np.linspace(4, 61, 40).round(1),
            "alloy": np.tile(["steel", "bronze"], 20),
            "wall mm": rng.uniform(3, 9, 40).round(1),
        },
        index=[f"c{i:02d}" for i in range(40)],
    )
    made.loc["c03", "alloy"] = None
    made.loc["c05", "minutes"] = np.inf
    made.loc["c07", ["alloy", "mass_kg"]] = [None, np.nan]
    made.loc["c09", "wall mm"] = -1.0
    return made


FORMULA = 'minutes ~ mass_kg + alloy + np.log(Q("wall mm"))'


def test_rows_left_out_are_named_with_every_reason() -> None:
    problem = read(FORMULA, frame())
    expected = {
        "c03": "missing alloy",
        "c05": "infinite minutes",
        "c07": "missing mass_kg; missing alloy",
        "c09": "np.log(wall mm) is not a finite number",
    }
    assert problem.left_out["why"].to_dict() == expected
    assert list(problem.left_out.columns) == ["why"]
    assert list(problem.index) == [i for i in frame().index if i not in expected]
    assert problem.rows.count == 36
    assert problem.announcements[1] == (
        "4 of 40 rows are left out: 2 missing alloy, 1 infinite minutes, 1 missing mass_kg, "
        "1 np.log(wall mm) is not a finite number."
    )


def test_rows_not_chosen_say_so_and_nothing_more() -> None:
    problem = read(FORMULA, frame(), rows="mass_kg < 50 and alloy != 'tin'")
    assert problem.left_out.loc["c39", "why"] == "not in --rows mass_kg < 50 and alloy != 'tin'"
    assert problem.left_out.loc["c07", "why"] == "not in --rows mass_kg < 50 and alloy != 'tin'"
    assert problem.left_out.loc["c03", "why"] == "missing alloy"
    assert problem.rows.x.max() < 50
    assert problem.rows.count + len(problem.left_out) == 40


def test_the_choice_of_rows_reads_as_dataframe_query_does() -> None:
    data = frame().drop(index=["c05", "c09"])
    choices = [
        "mass_kg > 10",
        "`wall mm` < 5",
        "alloy == 'steel' or mass_kg > 30",
        "index > 'c10'",
        "alloy in ['steel']",
    ]
    for text in choices:
        expected = data.query(text, engine="python")[["minutes", "mass_kg", "alloy"]].dropna()
        assert list(read("minutes ~ mass_kg + C(alloy)", data, rows=text).index) == list(expected.index), text
    found = read("minutes ~ mass_kg", data, rows="mass_kg > @least", env={"least": 30})
    assert found.rows.x.min() > 30


def test_a_duplicate_index_does_not_mix_rows() -> None:
    data = frame()
    plain = read(FORMULA, data, rows="mass_kg < 50")
    doubled = data.set_axis(["same"] * 20 + ["other"] * 20)
    problem = read(FORMULA, doubled, rows="mass_kg < 50")
    for part in ("y", "x", "base", "modifier"):
        np.testing.assert_array_equal(getattr(problem.rows, part), getattr(plain.rows, part))
    assert list(problem.left_out["why"]) == list(plain.left_out["why"])
    assert set(problem.index) == {"same", "other"}


def test_an_index_of_several_levels_is_kept() -> None:
    data = frame()
    data.index = pd.MultiIndex.from_product([["a", "b"], range(20)], names=["half", "row"])
    problem = read(FORMULA, data)
    assert problem.left_out.index.names == ["half", "row"]
    assert problem.index[0] == ("a", 0)


def test_levels_of_rows_left_out_do_not_stay() -> None:
    data = frame()
    data["alloy"] = data["alloy"].astype(pd.CategoricalDtype(["tin", "steel", "lead", "bronze"]))
    data.iloc[5, 2] = "lead"  # the row whose minutes are infinite
    problem = read("minutes ~ mass_kg*alloy", data)
    assert problem.base_names == ("intercept", "alloy: bronze")
    assert problem.design.terms[0].factors[0].levels == ("steel", "bronze")


def test_the_users_frame_is_not_changed() -> None:
    data = frame()
    before = data.copy(deep=True)
    read(FORMULA, data, rows="mass_kg < 50", cluster="alloy", units={"mass_kg": "kg"}, at={"alloy": "steel"})
    pd.testing.assert_frame_equal(data, before)


def test_memory_is_shared_with_nothing_of_the_users() -> None:
    data = frame()
    problem = read("minutes ~ mass_kg", data)
    for values in (problem.rows.y, problem.rows.x):
        assert not np.shares_memory(values, data["minutes"].to_numpy())
        assert not np.shares_memory(values, data["mass_kg"].to_numpy())


REFUSED: dict[str, tuple[Callable[[], Any], str]] = {
    "an unknown name": (
        lambda: read(FORMULA, frame(), rows="mas_kg < 50"),
        "The choice of rows names `mas_kg`, which is no column.\nSeen: mas_kg < 50\nDid you mean 'mass_kg'?",
    ),
    "no comparison": (
        lambda: read(FORMULA, frame(), rows="mass_kg"),
        "The choice of rows must say yes or no for each row.\nSeen: mass_kg\n"
        "Compare with something: mass_kg < 50, or alloy == 'steel' (two equal signs).",
    ),
    "an assignment": (
        lambda: read(FORMULA, frame(), rows="alloy = 'steel'"),
        "The choice of rows must say yes or no for each row.\nSeen: alloy = 'steel'\n"
        "Compare with something: mass_kg < 50, or alloy == 'steel' (two equal signs).",
    ),
    "no row chosen": (
        lambda: read(FORMULA, frame(), rows="mass_kg > 1000"),
        "There are no rows to work with.\n"
        "Of 40 rows all are left out: 40 not in --rows mass_kg > 1000.\n"
        "Check the columns named in the formula, and the choice of rows.",
    ),
    "no row at all": (
        lambda: read(FORMULA, frame().iloc[:0]),
        "There are no rows to work with.\nThe data have no rows.\n"
        "Check the columns named in the formula, and the choice of rows.",
    ),
    "four rows": (
        lambda: read("minutes ~ mass_kg + alloy", frame().iloc[:5]),
        "There are too few rows.\n4 can be used (5 rows, left out: 1 missing alloy); at least 5 are needed.\nAdd rows.",
    ),
    "as many coefficients as rows": (
        lambda: read("minutes ~ mass_kg*alloy + np.log(Q('wall mm'))", frame().iloc[9:15]),
        "There are too few rows for this formula.\n"
        "5 can be used (6 rows, left out: 1 np.log(wall mm) is not a finite number), "
        "and the straight line alone has 5 coefficients.\n"
        "Add rows, or leave out covariates or groups.",
    ),
    "a constant response": (
        lambda: read("minutes ~ mass_kg", frame().assign(minutes=3.5)),
        "The response `minutes` does not vary.\nAll 39 rows hold 3.5.\nChoose another response.",
    ),
    "a constant focal predictor": (
        lambda: read("minutes ~ mass_kg", frame().assign(mass_kg=3)),
        "The focal predictor `mass_kg` does not vary.\nAll 39 rows hold 3.\n"
        "Choose another focal predictor, or rows where it varies.",
    ),
    "two columns of one name": (
        lambda: read("minutes ~ mass_kg", pd.concat([frame(), frame()[["mass_kg"]]], axis=1)),
        "Which column is `mass_kg`?\n2 columns of the data have that name.\n"
        "Rename them so that each name stands for one column.",
    ),
    "no table": (
        lambda: read("minutes ~ mass_kg", [1, 2, 3]),
        "The data must be a data frame, or a dict of columns.\nSeen: list.\n"
        "pandas, polars and Arrow tables can be read, and whatever narwhals reads.",
    ),
    "columns of different lengths": (
        lambda: read("y ~ x", {"y": [1, 2, 3], "x": [1, 2]}),
        "The columns of the data have different lengths.\nSeen: y 3, x 2.\nGive every column one value per row.",
    ),
    "a unit of nothing": (
        lambda: read(FORMULA, frame(), units={"mass": "kg"}),
        "There is no column `mass` to have a unit.\nDid you mean 'mass_kg'?",
    ),
}


@pytest.mark.parametrize("case", REFUSED)
def test_refusals_say_what_was_seen_and_what_to_do(case: str) -> None:
    made, message = REFUSED[case]
    with pytest.raises(BattenError) as caught:
        made()
    assert str(caught.value) == message


def test_a_choice_that_cannot_be_read_shows_it() -> None:
    with pytest.raises(InputError) as caught:
        read(FORMULA, frame(), rows="mass_kg <")
    assert caught.value.wrong.startswith("The choice of rows cannot be read: invalid syntax")
    assert caught.value.seen == "Seen: mass_kg <"
    assert caught.value.do == (
        "Write it as for DataFrame.query: mass_kg < 50 and alloy == 'steel'; names with spaces go in backticks."
    )
    assert not isinstance(caught.value, UnknownNameError)


def test_a_name_used_twice_is_refused_only_where_it_is_used() -> None:
    data = pd.concat([frame(), frame()[["wall mm"]]], axis=1)
    assert read("minutes ~ mass_kg", data).rows.count == 38


def test_frequency_weights_decide_what_too_few_means() -> None:
    data = frame().iloc[[0, 1, 2]].assign(count=[2, 2, 2])
    assert read("minutes ~ mass_kg", data, weights="count", weights_kind="frequency").rows.count == 6


def test_a_group_with_as_many_levels_as_rows_is_refused_before_memory_runs_out() -> None:
    n = 30_000
    data = pd.DataFrame({"y": np.arange(n) % 7, "x": np.arange(n), "casting": [f"c{i}" for i in range(n)]})
    with pytest.raises(InputError) as caught:
        read("y ~ x + casting", data)
    assert str(caught.value) == (
        "This formula has too many columns for so many rows.\n"
        "30000 rows by 30000 columns need 7 GB; most columns come from `casting`.\n"
        "Leave `casting` out of the formula; if its rows belong together, give it as cluster."
    )
