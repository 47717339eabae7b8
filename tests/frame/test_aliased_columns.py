"""Columns that repeat what others say are left out by name; what is left is of full rank and spans the same."""

from __future__ import annotations

import numpy as np
import pandas as pd
import pytest

from batten.frame.aliasing import repeats
from batten.frame.problem import Problem
from batten.frame.read import read

RNG = np.random.default_rng(23)
N = 90
X, Z = RNG.uniform(1, 9, N), RNG.uniform(2, 6, N)
DATA = pd.DataFrame(
    {
        "y": RNG.normal(20, 3, N), "x": X, "z": Z, "twice": 2 * Z + 1, "grams": 1000 * X, "kelvin": Z + 273.15,
        "sum": X + Z, "g": np.tile(["p", "q", "r"], N // 3),
        "sub": np.tile(["p1", "q1", "r1", "p2", "q2", "r2"], N // 6),
        "dose": np.tile([1.0, 2.0, 4.0], N // 3),
    }
)  # fmt: skip


def full(problem: Problem) -> np.ndarray:  # type: ignore[type-arg]
    return np.column_stack([problem.rows.base, problem.rows.x[:, None] * problem.rows.modifier])


CASES = {
    # formula -> (base names, modifier names, what is left out)
    "y ~ x + z + twice": (("intercept", "z"), ("",), ("twice",)),
    "y ~ x + z + kelvin + twice": (("intercept", "z"), ("",), ("kelvin", "twice")),
    # the focal predictor stays; its copy in other units goes
    "y ~ x + grams": (("intercept",), ("",), ("grams",)),
    "y ~ grams + x*g": (("intercept", "g: q", "g: r"), ("", "g q", "g r"), ("grams",)),
    "y ~ grams + x:g": (("intercept",), ("g p", "g q", "g r"), ("grams",)),
    "y ~ grams + x:z": (("intercept", "grams"), ("z",), ()),
    "y ~ x + z + sum": (("intercept", "z"), ("",), ("sum",)),
    "y ~ x + g + sub": (
        ("intercept", "g: q", "g: r", "sub: p2", "sub: q1", "sub: r1"), ("",), ("sub: q2", "sub: r2"),
    ),
    "y ~ dose + g": (("intercept", "g: q"), ("",), ("g: r",)),
    "y ~ 0 + x + g + sub": (
        ("g: p", "g: q", "g: r", "sub: p2", "sub: q1", "sub: r1"), ("",), ("sub: q2", "sub: r2"),
    ),
    # the focal predictor does not vary within a group: the level stays, the slope goes
    "y ~ dose*g": (("intercept", "g: q"), ("",), ("g: r", "dose : g q", "dose : g r")),
    "y ~ x*z + x:twice": (("intercept", "z"), ("", "z"), ("x : twice",)),
}  # fmt: skip


@pytest.mark.parametrize("formula", CASES)
def test_what_is_left_is_named_of_full_rank_and_spans_the_same(formula: str) -> None:
    focus = "dose" if "dose" in formula else "x"
    problem = read(formula, DATA, focus=focus)
    base, modifier, dropped = CASES[formula]
    assert (problem.base_names, problem.modifier_names) == (base, modifier)
    said = [text for text in problem.announcements if text.startswith("Left out because")]
    assert said == ([f"Left out because other columns say the same: {', '.join(dropped)}."] if dropped else [])
    kept = full(problem)
    assert np.linalg.matrix_rank(kept) == kept.shape[1]
    # every column of the formula lies in the span of what was kept
    everything = _everything(formula, focus)
    left = everything - kept @ np.linalg.lstsq(kept, everything, rcond=None)[0]
    # lstsq on columns of very different size
    assert np.abs(left).max() <= 1e-9 * np.abs(everything).max()


def _everything(formula: str, focus: str) -> np.ndarray:  # type: ignore[type-arg]
    import patsy

    return np.asarray(patsy.dmatrix(formula.partition("~")[2].replace("sum", "Q('sum')"), DATA))


@pytest.mark.parametrize("formula", CASES)
def test_terms_point_at_the_columns_that_are_left(formula: str) -> None:
    problem = read(formula, DATA, focus="dose" if "dose" in formula else "x")
    terms = problem.design.terms
    base = [j for term in terms if not term.has_focus for j in term.columns]
    modifier = [j for term in terms if term.has_focus for j in term.columns]
    assert sorted(base) == [j for j in range(len(problem.base_names)) if j != problem.rows.intercept]
    assert sorted(modifier) == list(range(len(problem.modifier_names)))
    assert tuple(d for term in terms for d in term.dropped if d) == CASES[formula][2]
    for term in terms:
        for factor in term.factors:
            alive = any(t.columns for t in terms if factor.text in [f.text for f in t.factors])
            assert factor.dropped is not alive


@pytest.mark.parametrize("formula", CASES)
def test_new_rows_have_the_columns_that_are_left(formula: str) -> None:
    problem = read(formula, DATA, focus="dose" if "dose" in formula else "x")
    np.testing.assert_array_equal(problem.new_rows(DATA).base, problem.rows.base)
    np.testing.assert_array_equal(problem.new_rows(DATA).modifier, problem.rows.modifier)


def test_a_cell_without_rows_is_left_out() -> None:
    data = DATA.assign(h=np.where(DATA["z"] > 4, "hi", "lo"))
    data = data[~((data["g"] == "r") & (data["h"] == "lo"))]
    problem = read("y ~ x + g*h", data, focus="x")
    assert problem.base_names == ("intercept", "g: q", "g: r", "h: lo", "g q : h lo")
    assert problem.announcements[0] == "Left out because no rows hold them: g r : h lo."
    assert problem.design.terms[2].dropped == ("g r : h lo",)


def test_covariates_that_are_nearly_but_not_quite_alike_are_kept() -> None:
    year = np.arange(N) + 1990.0
    problem = read("y ~ x + year + I(year**2) + I(year**3)", DATA.assign(year=year), focus="x")
    assert problem.base_names == ("intercept", "year", "year ** 2", "year ** 3")


def test_what_is_kept_does_not_hang_on_units() -> None:
    for factor in (1e-9, 1e9):
        columns = np.column_stack([np.ones(N), X, factor * Z, Z + 3, X - Z])
        assert repeats(columns) == [3, 4]
        assert repeats(np.column_stack([np.ones(N), factor * X, Z])) == []


def test_columns_of_zeros_repeat_nothing_and_say_nothing() -> None:
    assert repeats(np.column_stack([np.ones(N), np.zeros(N), Z])) == [1]
    assert repeats(np.empty((N, 0))) == []
