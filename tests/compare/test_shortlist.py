"""The first screen's remedies."""

from __future__ import annotations

from types import MappingProxyType

import numpy as np
import pytest

from batten.compare.grid import Comparison, compare
from batten.compare.shortlist import shortlist
from batten.engine.rows import Rows
from batten.families import parse
from batten.fit.question import Question

RNG = np.random.default_rng(4)
X = RNG.uniform(1, 12, 80)
Y = 10 * X / (3 + X) + RNG.normal(0, 0.3, 80) + 2
ROWS = Rows(Y, X, np.ones((80, 1)), np.ones((80, 1)))


def compared(*keys: str, **asked: object) -> Comparison:
    return compare(ROWS, tuple(parse(k) for k in keys), Question(span=(3.0, 9.0), **asked))  # type: ignore[arg-type]


MANY = compared(
    "log y ~ x", "y ~ log x", "y ~ poly2 x", "y ~ poly3 x", "y ~ spline4 x", "boxcox y ~ x", "y ~ level-hyp x"
)  # fmt: skip


def test_at_most_five_rows_begin_with_the_line_and_the_choice() -> None:
    found = shortlist(MANY)
    assert len(found) <= 5
    assert found[0] == ("straight line", "y ~ x")
    assert found[1][1] == MANY.choice.key
    assert found[1][0].startswith("choice")


def test_no_remedy_stands_twice_and_every_role_is_there() -> None:
    found = shortlist(MANY)
    keys = [key for _, key in found]
    assert len(set(keys)) == len(keys)
    roles = ", ".join(role for role, _ in found)
    assert set(roles.split(", ")) == {"straight line", "choice", "runner-up", "best readable", "best flexible"}


def test_the_best_of_each_kind_has_the_lowest_held_out_error_of_its_kind() -> None:
    roles = {role: key for joined, key in shortlist(MANY) for role in joined.split(", ")}
    error = {key: score.rmse for key, score in MANY.scores.items()}
    readable = [key for key in error if parse(key).readable]
    flexible = [key for key in error if not parse(key).shape.readable]
    assert roles["best readable"] == min(readable, key=error.__getitem__)
    assert roles["best flexible"] == min(flexible, key=error.__getitem__)
    assert "boxcox y ~ x" not in (roles["best readable"], roles["best flexible"])


def test_one_remedy_in_several_roles_stands_once_with_its_roles_joined() -> None:
    found = shortlist(compared("y ~ x"))
    assert found == [("straight line, choice, best readable", "y ~ x")]


@pytest.mark.parametrize("key", ["y ~ poly2 x", "y ~ poly3 x"])
def test_a_curve_that_turns_against_what_was_expected_is_not_the_best_of_its_kind(key: str) -> None:
    plain = compared(key)
    turned = Comparison(
        **{name: getattr(plain, name) for name in Comparison.__dataclass_fields__ if name != "turns"},
        turns=MappingProxyType({"y ~ x": "", key: "not rising between 10 and 12"}),
    )
    best = {role: k for joined, k in shortlist(turned) for role in joined.split(", ") if role.startswith("best")}
    assert key not in best.values()
