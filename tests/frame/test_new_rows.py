"""Further rows are coded with what the analysis rows taught; rows that cannot be predicted say why."""

from __future__ import annotations

import copy
import pickle

import numpy as np
import pandas as pd
import patsy
import pytest

from batten.errors import UnknownNameError
from batten.frame.read import read

rng = np.random.default_rng(7)
TRAIN = pd.DataFrame(
    {
        "y": rng.normal(10, 2, 120),
        "x": rng.uniform(1, 9, 120).round(2),
        "z": rng.uniform(2, 6, 120).round(2),
        "g": rng.choice(["ash", "beech", "cedar"], 120),
        "line": rng.integers(1, 4, 120),
    }
)
NEW = pd.DataFrame(
    {"x": [2.0, 5.0, 8.0], "z": [3.0, 4.0, 5.5], "g": ["cedar", "ash", "beech"], "line": [3, 1, 2]}, index=[10, 10, 7]
)

FORMULAS = [
    "y ~ x", "y ~ x*g", "y ~ x + center(z)", "y ~ x*standardize(z) + g", "y ~ x + bs(z, df=5)",
    "y ~ x:C(line) + np.log(z)", "y ~ x + C(g, Sum):z", "y ~ 0 + x + C(np.round(z) > 4)*g", "y ~ x + cr(z, df=4) - 1",
    "y ~ x + te(cr(z, 3), cr(line, 3)) - 1", "y ~ x + bs(center(z), df=4)", "y ~ x + I(z * line)",
]  # fmt: skip


@pytest.mark.parametrize("formula", FORMULAS)
def test_new_rows_equal_patsys(formula: str) -> None:
    problem = read(formula, TRAIN, focus="x")
    new = problem.new_rows(NEW)
    info = patsy.dmatrix(formula.partition("~")[2], TRAIN).design_info
    theirs = np.asarray(patsy.build_design_matrices([info], NEW)[0])
    with_x = np.array([any(part == "x" for part in name.split(":")) for name in info.column_names])
    np.testing.assert_allclose(new.base, theirs[:, ~with_x], rtol=1e-12, atol=1e-14)
    np.testing.assert_allclose(new.x[:, None] * new.modifier, theirs[:, with_x], rtol=1e-12)
    assert new.notes == ("", "", "")
    assert list(new.index) == [10, 10, 7]


@pytest.mark.parametrize("formula", FORMULAS)
def test_the_analysis_rows_themselves_are_coded_as_they_were(formula: str) -> None:
    problem = read(formula, TRAIN, focus="x")
    for frame in (TRAIN, problem.design.used(problem.index)):
        new = problem.new_rows(frame)
        np.testing.assert_array_equal(new.x, problem.rows.x)
        np.testing.assert_array_equal(new.base, problem.rows.base)
        np.testing.assert_array_equal(new.modifier, problem.rows.modifier)


@pytest.mark.parametrize("formula", FORMULAS)
def test_a_problem_survives_pickling_and_copying(formula: str) -> None:
    problem = read(formula, TRAIN, focus="x")
    for again in (pickle.loads(pickle.dumps(problem)), copy.deepcopy(problem)):
        np.testing.assert_array_equal(again.new_rows(NEW).base, problem.new_rows(NEW).base)
        np.testing.assert_array_equal(again.rows.base, problem.rows.base)
        assert again.announcements == problem.announcements


def test_one_row_alone_is_coded_as_among_others() -> None:
    problem = read("y ~ x*g + center(z) + bs(z, df=4)", TRAIN, focus="x")
    together = problem.new_rows(NEW)
    for i in range(3):
        alone = problem.new_rows(NEW.iloc[[i]])
        np.testing.assert_array_equal(alone.base[0], together.base[i])
        np.testing.assert_array_equal(alone.modifier[0], together.modifier[i])


def test_rows_that_cannot_be_predicted_are_nan_and_say_why() -> None:
    train = TRAIN.assign(flag=TRAIN["z"] > 4)
    problem = read("y ~ x + g + np.log(z) + flag", train, focus="x")
    frame = pd.DataFrame(
        {
            "x": [5.0, 5.0, np.nan, np.inf, 20.0, 5.0, "five", 5.0],
            "g": ["ash", "zinc", "ash", "ash", "ash", None, "ash", "ash"],
            "z": [3.0, 3.0, 3.0, 3.0, 3.0, np.nan, 3.0, -1.0],
            "flag": [True, False, True, True, False, True, True, None],
        },
        index=list("abcdefgh"),
    )
    new = problem.new_rows(frame)
    low, high = f"{TRAIN['x'].min():g}", f"{TRAIN['x'].max():g}"
    assert (TRAIN["z"].min(), TRAIN["z"].max()) == (2.13, 5.99)
    assert new.notes == (
        "",
        "unseen level 'zinc' of g",
        "missing x",
        "infinite x",
        f"outside the data: x 20 is beyond {low} to {high}",
        "missing g; missing z",
        "x 'five' is not a number",
        "missing flag; outside the data: z -1 is beyond 2.13 to 5.99",
    )
    bad = np.array([False, True, True, True, False, True, True, True])
    for part in (new.x[:, None], new.base, new.modifier):
        np.testing.assert_array_equal(np.isnan(part).all(axis=1), bad)
        assert np.isfinite(part[~bad]).all()


def test_an_expression_that_fails_in_some_rows_fails_only_there() -> None:
    problem = read("y ~ x + bs(z, df=4) + np.log(z)", TRAIN, focus="x")
    new = problem.new_rows(pd.DataFrame({"x": [2.0, 3.0, 4.0, 5.0], "z": [3.0, 99.0, 4.0, -2.0]}))
    assert new.notes == (
        "",
        "bs(z, df=4) cannot be worked out; outside the data: z 99 is beyond 2.13 to 5.99",
        "",
        "bs(z, df=4) cannot be worked out; np.log(z) cannot be worked out; "
        "outside the data: z -2 is beyond 2.13 to 5.99",
    )
    single = problem.new_rows(pd.DataFrame({"x": [4.0], "z": [4.0]}))
    np.testing.assert_array_equal(new.base[2], single.base[0])


def test_text_that_is_plainly_a_number_is_read_as_one() -> None:
    problem = read("y ~ x + z", TRAIN, focus="x")
    np.testing.assert_array_equal(problem.new_rows(NEW.astype({"x": str, "z": str})).base, problem.new_rows(NEW).base)


def test_levels_match_whatever_type_stores_them() -> None:
    problem = read("y ~ x + g + C(line)", TRAIN, focus="x")
    plain = problem.new_rows(NEW)
    stored = NEW.astype({"g": pd.CategoricalDtype(["cedar", "oak", "ash", "beech"]), "line": "Float64"})
    np.testing.assert_array_equal(problem.new_rows(stored).base, plain.base)


def test_missing_columns_are_named() -> None:
    problem = read("y ~ x + np.log(z) + g", TRAIN, focus="x")
    with pytest.raises(UnknownNameError) as caught:
        problem.new_rows(NEW.rename(columns={"z": "zz"}))
    assert str(caught.value) == ("The rows to predict have no column `z`.\nThe formula uses it.\nDid you mean 'zz'?")
    with pytest.raises(UnknownNameError) as caught:
        problem.new_rows(NEW[["x"]])
    assert str(caught.value) == ("The rows to predict have no column `z`, `g`.\nThe formula uses them.\nAdd them.")


def test_no_rows_give_no_rows() -> None:
    problem = read("y ~ x*g + bs(z, df=4)", TRAIN, focus="x")
    new = problem.new_rows(NEW.iloc[:0])
    assert (new.x.shape, new.base.shape, new.modifier.shape) == ((0,), (0, problem.rows.base.shape[1]), (0, 3))
    assert new.notes == ()


def test_later_edits_of_the_users_frame_reach_nothing() -> None:
    frame = TRAIN.copy()
    problem = read("y ~ x + g + np.log(z)", frame, focus="x")
    before = (
        problem.rows.y.copy(),
        problem.rows.x.copy(),
        problem.rows.base.copy(),
        problem.design.used(problem.index),
    )
    frame[["y", "x", "z"]] = 0.0
    frame["g"] = "gone"
    for name, old in zip(("y", "x", "base"), before[:3], strict=True):
        np.testing.assert_array_equal(getattr(problem.rows, name), old)
    pd.testing.assert_frame_equal(problem.design.used(problem.index), before[3])


def test_a_function_of_the_users_is_remembered() -> None:
    problem = read("y ~ x + above(z, limit)", TRAIN, focus="x", env={"above": above, "limit": 4.0})
    assert problem.base_names == ("intercept", "above(z, limit)")
    again = pickle.loads(pickle.dumps(problem))
    np.testing.assert_array_equal(again.new_rows(NEW).base[:, 1], [0.0, 0.0, 1.5])


def above(values: pd.Series, limit: float) -> pd.Series:
    return (values - limit).clip(lower=0)
