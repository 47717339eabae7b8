"""The response and the focal predictor: found, guessed aloud, or refused with a formula that would do."""

from __future__ import annotations

import numpy as np
import pandas as pd
import pytest

from batten.errors import BattenError
from batten.frame.read import read

RNG = np.random.default_rng(2)
N = 50
DATA = pd.DataFrame(
    {
        "minutes": RNG.uniform(5, 60, N),
        "mass_kg": RNG.uniform(4, 61, N),
        "age": RNG.uniform(1, 9, N),
        "alloy": RNG.choice(["bronze", "steel"], N),
        "wall mm": RNG.uniform(3, 9, N),
        "flag": RNG.random(N) < 0.5,
        "comma": ["12,5", "3,1"] * 25,
        "poured": pd.date_range("2024-01-01", periods=N),
        "held": pd.to_timedelta(RNG.integers(1, 99, N), unit="h"),
    }
)


def test_the_first_plain_numeric_predictor_is_taken_and_the_others_are_named() -> None:
    guesses = {
        "minutes ~ alloy + mass_kg": "Focal predictor: mass_kg, the only plain numeric predictor.",
        "minutes ~ alloy + mass_kg*age": (
            "Focal predictor: mass_kg, the first plain numeric predictor; others it could be: age."
        ),
        "minutes ~ age:alloy + np.log(mass_kg)": (
            "Focal predictor: age, the first plain numeric predictor; written plain it could also be mass_kg."
        ),
        "minutes ~ C(alloy) + Q('wall mm')": "Focal predictor: wall mm, the only plain numeric predictor.",
    }
    for formula, said in guesses.items():
        assert read(formula, DATA).announcements[0] == said


def test_a_given_focal_predictor_is_not_announced() -> None:
    problem = read("minutes ~ mass_kg + age", DATA.drop(columns="poured"), focus="age")
    assert (problem.focus, problem.covariates, problem.announcements) == ("age", ("mass_kg",), ())


def test_covariates_are_in_order_of_appearance_and_named_once() -> None:
    problem = read("minutes ~ np.log(age) + alloy*mass_kg + Q('wall mm') + age:alloy", DATA, focus="mass_kg")
    assert problem.covariates == ("age", "alloy", "wall mm")


REFUSED = {
    ("np.log(minutes) ~ mass_kg + alloy", None): (
        "The response must be one numeric column, untransformed.\nBefore the ~ stands: np.log(minutes)\n"
        "Write the response plain; its scales are among the remedies:\nminutes ~ mass_kg + alloy"
    ),
    ("minutes - 1 ~ mass_kg", None): (
        "The response must be one numeric column, untransformed.\nBefore the ~ stands: minutes - 1\n"
        "Write the response plain; its scales are among the remedies:\nminutes ~ mass_kg"
    ),
    ("np.log(minutes) ~ np.log(mass_kg)*C(alloy) - 1", None): (
        "The response must be one numeric column, untransformed.\nBefore the ~ stands: np.log(minutes)\n"
        "Write the response plain; its scales are among the remedies:\n"
        "minutes ~ 0 + mass_kg + C(alloy) + mass_kg:C(alloy)"
    ),
    ("I(minutes / age) ~ mass_kg", None): (
        "The response must be one numeric column, untransformed.\nBefore the ~ stands: I(minutes / age)\n"
        "Make it a column of the data frame first, and name that column."
    ),
    ("minutes + age ~ mass_kg", None): (
        "One formula has one response.\nBefore the ~ stand several: minutes, age.\n"
        "Keep one, and run the others as formulas of their own."
    ),
    ("minutes ~ np.log(mass_kg) + alloy", None): (
        "No predictor is a plain numeric column.\n"
        "After the ~ stand: np.log(mass_kg) (a function of numbers), alloy (text).\n"
        "Write it plain; its shapes are among the remedies:\nminutes ~ mass_kg + alloy"
    ),
    ("minutes ~ mass_kg + I(mass_kg**2) + alloy", None): (
        "The focal predictor `mass_kg` must stand in the formula untransformed.\n"
        "It also stands in: I(mass_kg ** 2)\n"
        "Write it plain; its shapes are among the remedies:\nminutes ~ mass_kg + alloy"
    ),
    ("minutes ~ bs(Q('wall mm'), df=4) + age", "wall mm"): (
        "The focal predictor `wall mm` must stand in the formula untransformed.\n"
        "It also stands in: bs(Q('wall mm'), df=4)\n"
        "Write it plain; its shapes are among the remedies:\nminutes ~ Q('wall mm') + age"
    ),
    ("minutes ~ mass_kg + alloy", "alloy"): (
        "The focal predictor must be numeric, and `alloy` is a group here.\n"
        "`alloy` holds text, yes/no or categories, or stands inside C().\n"
        "Choose a numeric column; the effect of a group needs no shape."
    ),
    ("minutes ~ C(mass_kg) + age", "mass_kg"): (
        "The focal predictor must be numeric, and `mass_kg` is a group here.\n"
        "`mass_kg` holds text, yes/no or categories, or stands inside C().\n"
        "Choose a numeric column; the effect of a group needs no shape."
    ),
    ("minutes ~ mass_kg + alloy", "age"): (
        "The focal predictor `age` does not stand in the formula.\nNumeric predictors in it: mass_kg.\n"
        "Choose one of these, or add it to the formula."
    ),
    ("minutes ~ mass_kg", "mass"): (
        "There is no column `mass` to be the focal predictor.\nDid you mean 'mass_kg'?"
    ),
    ("minutes ~ mass_kg", "minutes"): (
        "The focal predictor `minutes` does not stand in the formula.\nNumeric predictors in it: mass_kg.\n"
        "Choose one of these, or add it to the formula."
    ),
    ("minutes ~ alloy + flag", None): (
        "No predictor is a plain numeric column.\nAfter the ~ stand: alloy (text), flag (yes/no).\n"
        "Add the numeric column whose shape is in question."
    ),
    ("minutes ~ 1", None): (
        "The formula has no predictor.\nOnly an intercept, or nothing, stands after the ~ in: minutes ~ 1\n"
        "Name the numeric column whose shape is in question, then covariates if there are any."
    ),
    ("minutes ~ minutes", None): (
        "The response and the focal predictor are the same column.\nBoth are `minutes`.\nName another focal predictor."
    ),
    ("minutes ~ mass_kg + np.log(minutes)", None): (
        "The response `minutes` cannot explain itself.\n`minutes` stands on both sides of the ~.\nRemove one."
    ),
    ("minutes ~ comma", None): (
        "The predictor `comma` is text that is not plainly numbers.\nAmong 50 rows: '12,5', '3,1'.\n"
        "Say what the comma means: data['comma'].str.replace(',', '.').astype(float), or read with decimal=','."
    ),
    ("minutes ~ mass_kg + comma", None): (
        "Is `comma` a number or a group?\nMost of its values look like numbers, but not '12,5', '3,1'.\n"
        "Correct these or leave them missing; if it is a group, write C(comma)."
    ),
    ("minutes ~ mass_kg + held", None): (
        "The covariate `held` cannot be used as it is stored.\nIt holds: lengths of time.\n"
        "Make it a number (for lengths of time: .dt.total_seconds()), text or a category first."
    ),
    ("poured ~ mass_kg", None): (
        "The response `poured` holds dates.\n"
        "A date can be the focal predictor or a covariate (as days since the first), not this.\n"
        "Make it a number first, such as days since a start: (data['poured'] - start).dt.days"
    ),
    ("minutes ~ mass_kg + wall mm", None): (
        "The formula cannot be read: `wall mm` is neither a column nor a Python expression.\n"
        "minutes ~ mass_kg + wall mm\n                    ^^^^^^^\nWrite Q('wall mm')."
    ),
    ("minutes ~ mass_kg + age alloy", None): (
        "The formula cannot be read: `age alloy` is neither a column nor a Python expression.\n"
        "minutes ~ mass_kg + age alloy\n                    ^^^^^^^^^\n"
        "Join predictors with +; a name with spaces is written Q('its name')."
    ),
    ("minutes ~ mass_kg + I(age - np.mean(age))", None): (
        "`age - np.mean(age)` gives a row another value when other rows are taken away.\n"
        "A mean, a rank or a cut into parts is worked out anew on every frame, so predictions would be wrong.\n"
        "Use center(), standardize() or bs(), which remember, or make it a column of the data frame first."
    ),
    ("minutes ~ mass_kg + C(alloy, 'sum')", None): (
        "`C(alloy, 'sum')` cannot be worked out on these rows.\n"
        "AttributeError: 'str' object has no attribute 'code_with_intercept'\n"
        "Arithmetic stands inside I(), a power is **, and functions must be defined where the formula is used."
    ),
    ("minutes ~ mass_kg + C(alloy, 1, 2, 3)", None): (
        "`C(alloy, 1, 2, 3)` cannot be worked out on these rows.\n"
        "TypeError: C() takes from 1 to 3 positional arguments but 4 were given\n"
        "Arithmetic stands inside I(), a power is **, and functions must be defined where the formula is used."
    ),
    ("minutes ~ mass_kg + bs(age, df=2)", None): (
        "`bs(age, df=2)` cannot be worked out on these rows.\n"
        "ValueError: df=2 is too small for degree=3 and include_intercept=False; must be >= 3\n"
        "Arithmetic stands inside I(), a power is **, and functions must be defined where the formula is used."
    ),
    ("minutes ~ mass_kg + np.mean(age)", None): (
        "`np.mean(age)` must give one value for each row.\nIt gives 1 for 50 rows.\n"
        "Make it a column of the data frame first."
    ),
    ("minutes ~ mass_kg + C(alloy, Treatment('tin'))", None): (
        "`alloy` has no level 'tin' in these rows.\nChoose one of 'bronze', 'steel'."
    ),
}  # fmt: skip


@pytest.mark.parametrize(("formula", "focus"), list(REFUSED))
def test_refusals_say_what_was_seen_and_what_to_do(formula: str, focus: str | None) -> None:
    with pytest.raises(BattenError) as caught:
        read(formula, DATA, focus=focus)
    assert str(caught.value) == REFUSED[formula, focus]


@pytest.mark.parametrize(
    "formula", ["np.log(minutes) ~ np.log(mass_kg)*C(alloy) - 1", "minutes ~ mass_kg + I(mass_kg**2)"]
)
def test_the_formula_offered_instead_works(formula: str) -> None:
    with pytest.raises(BattenError) as caught:
        read(formula, DATA)
    assert read(caught.value.do.splitlines()[-1], DATA).focus == "mass_kg"


def test_what_an_expression_says_when_it_fails_is_passed_on() -> None:
    with pytest.raises(BattenError) as caught:
        read("minutes ~ mass_kg + np.log(alloy)", DATA)
    assert caught.value.wrong == "`np.log(alloy)` cannot be worked out on these rows."
    assert "batten_" not in str(caught.value)


@pytest.mark.parametrize(
    "text",
    ["age / age.max()", "age / np.max(age)", "age - age.iloc[0]", "age - age.iloc[-1]", "np.cumsum(age)", "age.rank()",
     "age.diff().fillna(0)", "age - age.groupby(alloy).transform('mean')", "C(pd.cut(age, 3))", "C(pd.qcut(age, 4))"],
)  # fmt: skip
def test_what_hangs_on_other_rows_is_refused_however_it_hangs(text: str) -> None:
    with pytest.raises(BattenError) as caught:
        read(f"minutes ~ mass_kg + {text if text.startswith('C(') else f'I({text})'}", DATA, env={"pd": pd})
    assert caught.value.wrong.endswith("gives a row another value when other rows are taken away.")


def test_what_an_expression_gives_back_wrongly_is_told_in_the_users_names() -> None:
    for text in ("pd.get_dummies(alloy)", "np.ones((50, 2, 2)) * np.asarray(age)[:, None, None]"):
        with pytest.raises(BattenError) as caught:
            read(f"minutes ~ mass_kg + I({text})", DATA, env={"pd": pd})
        assert caught.value.wrong == f"`I({text})` cannot be worked out on these rows."
        assert "batten_" not in str(caught.value)


def test_yes_and_no_can_be_response_or_focal_predictor_when_asked() -> None:
    problem = read("flag ~ mass_kg", DATA)
    np.testing.assert_array_equal(problem.rows.y, DATA["flag"].astype(float))
    assert problem.announcements[1] == "flag is yes/no: read as 1 and 0, so its mean is the share of yes."
    problem = read("minutes ~ flag + alloy", DATA.drop(columns="poured"), focus="flag")
    np.testing.assert_array_equal(problem.rows.x, DATA["flag"].astype(float))
    assert problem.announcements == (
        "flag is yes/no: read as 1 and 0.",
        "flag takes only two values: it has a difference, but no shape.",
    )
    assert problem.new_rows(pd.DataFrame({"flag": [True], "alloy": ["steel"]})).x[0] == 1
