"""Columns may be called anything, also what the formula's own functions are called."""

from __future__ import annotations

import numpy as np
import pandas as pd
import pytest

from batten.frame.read import read

HOSTILE = [
    "C", "Q", "I", "np", "bs", "center", "log", "Intercept", "batten_x", "batten_1", "class", "lambda", "None", "id",
    "daily light", "it's", 'say "so"', "<b>bold</b>", "μέτρο", "µ", "质量", "{brace}", "$cost", "a.b", "a+b", "x:y",
    "sum", "1st", "`tick`", "back\\slash", "tab\there", " lead", "new\nline", "%", "~", "#no comment", "", "a" * 300,
    "T.b", "[0]",
]  # fmt: skip
RNG = np.random.default_rng(3)
N = 60
VALUES = {
    "y": RNG.normal(5, 1, N),
    "x": RNG.uniform(1, 9, N),
    "z": RNG.uniform(2, 6, N),
    "g": RNG.choice(["p", "q", "r"], N),
}
PLAIN = pd.DataFrame(VALUES)


def renamed(**names: str) -> pd.DataFrame:
    return PLAIN.rename(columns=names)


def check(formula: str, frame: pd.DataFrame, plain: str, *, focus: str) -> None:
    ours, theirs = read(formula, frame, focus=focus), read(plain, PLAIN, focus="x")
    for part in ("y", "x", "base", "modifier"):
        np.testing.assert_array_equal(getattr(ours.rows, part), getattr(theirs.rows, part))
    again = ours.new_rows(frame)
    np.testing.assert_array_equal(again.base, ours.rows.base)
    assert set(again.notes) == {""}


@pytest.mark.parametrize("name", HOSTILE)
def test_a_quoted_name_works_in_every_place(name: str) -> None:
    q = f"Q({name!r})"
    check(f"y ~ {q}*C(g) + np.log(z)", renamed(x=name), "y ~ x*C(g) + np.log(z)", focus=name)
    check(f"y ~ x*C({q}) + center(z)", renamed(g=name), "y ~ x*C(g) + center(z)", focus="x")
    check(f"y ~ x + np.log({q}) + bs({q}, df=4) + I({q} * 2):g", renamed(z=name),
          "y ~ x + np.log(z) + bs(z, df=4) + I(z * 2):g", focus="x")  # fmt: skip
    check(f"{q} ~ x + g", renamed(y=name), "y ~ x + g", focus="x")


@pytest.mark.parametrize("name", [n for n in HOSTILE if n.isidentifier() and n != "None"])
def test_a_bare_name_works_where_it_is_one(name: str) -> None:
    check(f"y ~ {name}*C(g) + z", renamed(x=name), "y ~ x*C(g) + z", focus=name)
    check(f"y ~ x + C(g) + {name}", renamed(z=name), "y ~ x + C(g) + z", focus="x")
    if name not in ("class", "lambda"):  # Python's own words cannot stand inside a function
        check(f"y ~ x + C(g) + np.log({name})", renamed(z=name), "y ~ x + C(g) + np.log(z)", focus="x")


def test_all_of_them_at_once() -> None:
    names = {"y": "Q", "x": "np", "z": "I", "g": "C"}
    check("Q ~ np*C(C) + I(I > 4) + np.log(I) + Q('I')", renamed(**names),
          "y ~ x*C(g) + I(z > 4) + np.log(z) + z", focus="np")  # fmt: skip


def test_labels_show_the_users_names_and_nothing_of_ours() -> None:
    frame = renamed(x="daily light", z="<b>z</b>", g="$g")
    problem = read('y ~ Q("daily light")*C(Q("$g")) + np.log(Q("<b>z</b>")) + Q("<b>z</b>"):C(Q("$g"))', frame)
    assert (problem.focus, problem.covariates) == ("daily light", ("$g", "<b>z</b>"))
    assert problem.modifier_names == ("", "$g q", "$g r")
    assert problem.base_names[:4] == ("intercept", "$g: q", "$g: r", "np.log(<b>z</b>)")
    assert problem.base_names[4:] == ("<b>z</b> : $g p", "<b>z</b> : $g q", "<b>z</b> : $g r")


def test_variables_of_the_notebook_do_not_hide_the_grammar() -> None:
    env = {"C": 3, "I": "a variable", "Q": None, "center": 1.5, "x": "not the column", "z": np.zeros(N)}
    problem = read("y ~ x + C(g) + I(z * 2) + center(Q('z')):C(g)", PLAIN, env=env, focus="x")
    np.testing.assert_array_equal(problem.rows.base[:, 3], 2 * VALUES["z"])


def test_columns_whose_names_are_no_text_are_left_alone() -> None:
    frame = pd.concat([PLAIN, pd.DataFrame(RNG.normal(size=(N, 2)), columns=[0, ("a", 1)])], axis=1)
    assert read("y ~ x + z", frame).covariates == ("z",)


def test_levels_may_be_anything_too() -> None:
    odd = ["<i>", "T.b]", "it's", "", " ", "a:b", "ß", "0", "nan"]
    frame = PLAIN.assign(g=pd.Series(odd * 7).iloc[:N].to_numpy())
    problem = read("y ~ x*C(g)", frame)
    # blank text is missing; the rest are levels
    assert set(problem.left_out["why"]) == {"missing g"}
    group = problem.design.terms[0].factors[0]
    assert sorted(group.levels) == sorted(set(odd) - {"", " "})
    assert problem.base_names[1:] == tuple(f"g: {level}" for level in group.levels[1:])
