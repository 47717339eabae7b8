"""Weights, clusters and exposure, and covariates held at asked values."""

from __future__ import annotations

from typing import Any

import numpy as np
import pandas as pd
import pytest

from batten.errors import BattenError
from batten.frame.read import read

RNG = np.random.default_rng(29)
N = 40
DATA = pd.DataFrame(
    {
        "y": RNG.normal(20, 3, N), "x": RNG.uniform(1, 9, N), "g": ["p", "q"] * (N // 2), "age": RNG.uniform(1, 5, N),
        "line": np.tile([1, 2, 3, 4], N // 4), "flag": RNG.random(N) < 0.5,
        "w": RNG.uniform(0.5, 2, N), "times": np.tile([0, 1, 2, 3], N // 4), "hours": RNG.uniform(1, 9, N),
        "plant": np.tile(["south 10", "south 2", "north 1", "north 3"], N // 4),
    },
    index=[f"r{i}" for i in range(N)],
)  # fmt: skip


def test_variance_weights_come_through() -> None:
    problem = read("y ~ x", DATA, weights="w", weights_kind="variance")
    np.testing.assert_allclose(problem.rows.weights, DATA["w"] / DATA["w"].mean(), rtol=1e-15)
    assert (problem.rows.count, problem.average_weight) == (N, DATA["w"].mean())
    said = "Weighted by w: errors, spreads and intervals for a new row are those of a row of average weight"
    assert any(text.startswith(said) for text in problem.announcements)


def test_frequency_weights_leave_out_rows_that_count_for_none() -> None:
    problem = read("y ~ x", DATA, weights="times", weights_kind="frequency")
    assert set(problem.left_out["why"]) == {"times is 0"}
    assert problem.rows.count == len(problem.index) == 60
    assert problem.rows.weights is None
    assert "30 stored rows stand for 60 (times)." in problem.announcements


def test_frequency_weights_stand_for_repeated_rows() -> None:
    repeated = DATA.loc[DATA.index.repeat(DATA["times"])]
    weighted = read("y ~ x + C(g)", DATA, weights="times", weights_kind="frequency")
    written = read("y ~ x + C(g)", repeated)
    for name in ("x", "y", "base", "modifier"):
        np.testing.assert_array_equal(getattr(weighted.rows, name), getattr(written.rows, name))
    assert list(weighted.index) == list(repeated.index)


def test_clusters_are_numbered_in_natural_order_whatever_the_order_of_rows() -> None:
    rows = read("y ~ x", DATA, cluster="plant").rows
    np.testing.assert_array_equal(rows.cluster, np.tile([3, 2, 0, 1], N // 4))
    again = read("y ~ x", DATA.iloc[::-1], cluster="plant").rows
    np.testing.assert_array_equal(again.cluster, np.asarray(rows.cluster)[::-1])
    whole = read("y ~ x", DATA.assign(plant=DATA["line"] * 100), cluster="plant").rows
    np.testing.assert_array_equal(whole.cluster, DATA["line"] - 1)


def test_with_an_exposure_the_response_is_a_rate_weighted_by_it() -> None:
    problem = read("y ~ x", DATA, exposure="hours", units={"y": "stops", "hours": "h"})
    np.testing.assert_array_equal(problem.rows.y, DATA["y"] / DATA["hours"])
    np.testing.assert_allclose(problem.rows.weights, DATA["hours"] / DATA["hours"].mean(), rtol=1e-15)
    assert (problem.response, problem.response_column) == ("y per hours", "y")
    assert problem.unit("y per hours") == "stops/h"


def test_rows_without_them_are_left_out_by_name() -> None:
    data = DATA.astype({"times": float, "plant": object})
    data.loc["r1", "w"], data.loc["r2", "plant"], data.loc["r3", "hours"], data.loc["r4", "hours"] = (
        np.nan, None, np.nan, np.inf,
    )  # fmt: skip
    problem = read("y ~ x", data, cluster="plant", exposure="hours")
    assert problem.left_out["why"].to_dict() == {
        "r2": "missing plant", "r3": "missing hours", "r4": "infinite hours",
    }  # fmt: skip
    assert problem.rows.count == len(np.asarray(problem.rows.cluster)) == len(np.asarray(problem.rows.weights)) == 37
    problem = read("y ~ x", data, weights="w", weights_kind="variance")
    assert problem.left_out["why"].to_dict() == {"r1": "missing w"}


REFUSED: dict[str, tuple[dict[str, Any], str]] = {
    "no kind": (
        {"weights": "w"},
        "What kind of weights are in `w`?\n"
        "Weights can say how precise a row is, or how many equal rows it stands for; the answers differ.\n"
        "Give weights_kind='variance' (variance = s2 / weight) or weights_kind='frequency' (counts of rows).",
    ),
    "survey": (
        {"weights": "w", "weights_kind": "survey"},
        "Survey weights are not supported.\n"
        "weights_kind='survey' asks for rows weighted by how they were sampled.\n"
        "Use software made for survey designs; weights of variance or frequency mean something else.",
    ),
    "an unknown kind": (
        {"weights": "w", "weights_kind": "frequencies"},
        "There is no kind of weights 'frequencies'.\nDid you mean 'frequency'?",
    ),
    "a kind alone": (
        {"weights_kind": "variance"},
        "A kind of weights is given, but no weights.\nweights_kind='variance'.\nName their column: weights='...'.",
    ),
    "an unknown column": (
        {"cluster": "plants"},
        "There is no column `plants` for cluster.\nDid you mean 'plant'?",
    ),
    "variance weights of zero": (
        {"weights": "times", "weights_kind": "variance"},
        "Variance weights must be above zero.\n10 of 40 values of `times` are not (lowest 0).\n"
        "Leave these rows out, or correct the weights.",
    ),
    "frequencies that are no counts": (
        {"weights": "half", "weights_kind": "frequency"},
        "Frequency weights must be whole numbers, zero or more.\n40 of 40 values of `half` are not (such as 0.5).\n"
        "Correct them; if they say how precise a row is, their kind is 'variance'.",
    ),
    "weights of text": (
        {"weights": "g", "weights_kind": "variance"},
        "The weights `g` is text that is not plainly numbers.\nAmong 40 rows: 'p', 'q'.\n"
        "Correct them or leave them missing: pd.to_numeric(data['g'], errors='coerce').",
    ),
    "one cluster": (
        {"cluster": "one"},
        "Clusters need at least two.\nAll rows have the same `one`: '7'.\n"
        "Leave the cluster out, or name another column.",
    ),
    "frequencies beyond memory": (
        {"weights": "many", "weights_kind": "frequency"},
        "The frequencies stand for too many rows.\n`many` adds up to 40,000,000; up to 20,000,000 rows can be written "
        "out.\nDivide the frequencies by a common factor, or use weights_kind='variance'.",
    ),
    "two things that weigh": (
        {"weights": "w", "weights_kind": "variance", "exposure": "hours"},
        "Weights of variance and an exposure cannot be given together.\n"
        "weights='w' and exposure='hours': an exposure already weighs the rows.\nLeave one of them out.",
    ),
    "an exposure of zero": (
        {"exposure": "times"},
        "An exposure must be above zero.\n10 of 40 values of `times` are not (lowest 0).\n"
        "Leave these rows out, or correct them.",
    ),
}  # fmt: skip


@pytest.mark.parametrize("case", REFUSED)
def test_refusals_say_what_was_seen_and_what_to_do(case: str) -> None:
    options, message = REFUSED[case]
    with pytest.raises(BattenError) as caught:
        read("y ~ x", DATA.assign(half=0.5, one=7, many=1_000_000), **options)
    assert str(caught.value) == message


# --- covariates held at asked values ----------------------------------------------------------------------------------

FORMULA = "y ~ x*g + np.log(age) + C(line) + flag + center(age)"


@pytest.mark.parametrize(
    ("asked", "column", "value"),
    [
        ({"g": "q"}, "g", "q"), ({"age": 2.5}, "age", 2.5), ({"age": "2.5"}, "age", 2.5), ({"line": 3}, "line", 3),
        ({"line": "3"}, "line", 3), ({"flag": True}, "flag", True), ({"flag": "yes"}, "flag", True),
        ({"flag": "False"}, "flag", False),
    ],
)  # fmt: skip
def test_held_covariates_replace_the_rows_own(asked: dict[str, Any], column: str, value: Any) -> None:
    problem = read(FORMULA, DATA, at=asked)
    expected = problem.new_rows(DATA.assign(**{column: value}))
    assert problem.profile is not None
    np.testing.assert_array_equal(problem.profile[0], expected.base)
    np.testing.assert_array_equal(problem.profile[1], expected.modifier)
    np.testing.assert_array_equal(problem.rows.base, read(FORMULA, DATA).rows.base)


def test_without_asking_there_is_no_profile() -> None:
    assert read(FORMULA, DATA).profile is None


AT_REFUSED: dict[str, tuple[dict[str, Any], str]] = {
    "an unknown level": (
        {"g": "zinc"},
        "These covariate values cannot be used.\nat g='zinc': unseen level 'zinc' of g.\n"
        "Choose values that the rows hold.",
    ),
    "no number": (
        {"age": "old"},
        "These covariate values cannot be used.\nat age='old': age 'old' is not a number.\n"
        "Choose values that the rows hold.",
    ),
    "no covariate": (
        {"ages": 3}, "There is no covariate `ages` to hold at a value.\nDid you mean 'age'?",
    ),
    "the focal predictor": (
        {"x": 3},
        "`x` is the focal predictor and cannot be held at a value.\nat holds covariates.\n"
        "Give the two values to compare as span.",
    ),
}  # fmt: skip


@pytest.mark.parametrize("case", AT_REFUSED)
def test_values_that_cannot_be_held_are_refused(case: str) -> None:
    asked, message = AT_REFUSED[case]
    with pytest.raises(BattenError) as caught:
        read(FORMULA, DATA, at=asked)
    assert str(caught.value) == message
