"""The comparison as a whole: what must not move it, ties, the aims, what was planned."""

from __future__ import annotations

import pickle

import numpy as np
import pytest

from batten.compare.choose import gaps
from batten.compare.grid import Comparison, compare, extend
from batten.engine.rows import Rows
from batten.families import Remedy, default_grid, parse
from batten.fit.question import Question

SMALL = tuple(
    parse(k)
    for k in (
        "y ~ log x", "log y ~ x", "log y ~ log x", "y ~ poly2 x", "boxcox y ~ x", "y ~ spline4 x", "y ~ hinge x",
        "loglink y ~ log x",
    )
)  # fmt: skip


def multiplicative(n: int = 150, seed: int = 0) -> Rows:
    rng = np.random.default_rng(seed)
    x = rng.lognormal(2, 0.6, n)
    y = np.exp(0.7 + 0.9 * np.log(x) + rng.normal(0, 0.2, n))
    return Rows(y, x, np.ones((n, 1)), np.ones((n, 1)))


def run(rows: Rows, remedies: tuple[Remedy, ...] = SMALL, **more: object) -> Comparison:
    return compare(rows, remedies, Question(span=(5.0, 12.0), **more))  # type: ignore[arg-type]


def test_row_order_changes_nothing() -> None:
    rows = multiplicative()
    order = np.random.default_rng(5).permutation(150)
    plain, shuffled = run(rows), run(rows.take(order))
    assert plain.choice.key == shuffled.choice.key
    assert list(plain.estimates) == list(shuffled.estimates)
    for key in plain.scores:
        assert plain.scores[key].rmse == pytest.approx(shuffled.scores[key].rmse, rel=1e-9)


@pytest.mark.parametrize(("a", "b"), [(1000.0, 1.0), (1.0, 0.001), (2.54, 60.0)])
def test_multiplied_units_change_neither_order_nor_choice(a: float, b: float) -> None:
    rows = multiplicative()
    plain = run(rows)
    scaled = run(Rows(rows.y * a, rows.x * b, rows.base, rows.modifier))
    assert plain.choice.key == scaled.choice.key
    assert plain.choice.tied == scaled.choice.tied
    for key in plain.scores:
        assert scaled.scores[key].rmse == pytest.approx(a * plain.scores[key].rmse, rel=1e-6)


def test_the_straight_line_is_always_there() -> None:
    assert "y ~ x" in run(multiplicative(), (parse("log y ~ x"),)).estimates


def test_the_best_has_no_gap_and_gaps_are_in_units_of_y() -> None:
    done = run(multiplicative())
    gap = gaps(done.candidates, done.splits.k)
    assert gap[done.choice.best].size == 0
    worst = max(done.scores, key=lambda k: done.scores[k].rmse)
    assert gap[worst].size == pytest.approx(done.scores[worst].rmse - done.scores[done.choice.best].rmse)


def test_a_straight_truth_chooses_the_straight_line() -> None:
    rng = np.random.default_rng(1)
    x = rng.uniform(2, 9, 200)
    rows = Rows(3 + 2 * x + rng.normal(0, 1, 200), x, np.ones((200, 1)), np.ones((200, 1)))
    for aim in ("effect", "prediction"):
        assert run(rows, aim=aim).choice.key == "y ~ x"


def test_a_planned_remedy_is_chosen_and_says_so() -> None:
    choice = run(multiplicative(), planned="y ~ poly2 x").choice
    assert choice.key == "y ~ poly2 x"
    assert "Planned in advance" in choice.reasons[0]


def test_the_effect_aim_sets_aside_a_bend_that_matters() -> None:
    rng = np.random.default_rng(3)
    x = rng.uniform(-3, 3, 400)
    rows = Rows(10 + x**2 + rng.normal(0, 0.5, 400), x + 5, np.ones((400, 1)), np.ones((400, 1)))
    done = run(rows)
    bend = done.bends["y ~ x"]
    assert bend is not None
    assert bend.verdict == "matters"
    assert done.choice.key != "y ~ x"
    assert any("leave a bend that matters" in r for r in done.choice.reasons)


def test_an_expected_direction_drops_curves_that_turn() -> None:
    rng = np.random.default_rng(3)
    x = rng.uniform(0, 6, 200)
    rows = Rows(5 + 4 * x / (x + 1) + rng.normal(0, 0.4, 200), x + 0.5, np.ones((200, 1)), np.ones((200, 1)))
    done = run(rows, expect="rising")
    assert done.turns["y ~ poly2 x"].startswith("not rising between")
    assert done.choice.key != "y ~ poly2 x"


def test_one_more_remedy_keeps_rows_and_folds() -> None:
    done = run(multiplicative())
    more = extend(done, parse("y ~ poly4 x"))
    assert more.splits is done.splits
    assert set(more.estimates) == {*done.estimates, "y ~ poly4 x"}
    for key in done.scores:
        assert more.scores[key].rmse == done.scores[key].rmse


def test_nothing_is_refused_without_three_parts() -> None:
    rows = multiplicative()
    done = run(rows, default_grid(rows.y, rows.x, zero_is_arbitrary=False))
    assert done.refused
    for refusal in done.refused.values():
        assert refusal.wrong
        assert refusal.seen
        assert refusal.instead


def test_an_error_many_times_the_best_is_never_a_tie() -> None:
    """One far row makes both the gap and its standard error huge; the corrected rule alone would call that tied."""
    rows = multiplicative(300)
    done = run(rows, (parse("log y ~ x^2"), parse("log y ~ log x")))
    assert done.scores["log y ~ x^2"].rmse > 2 * done.scores[done.choice.best].rmse
    assert "log y ~ x^2" not in done.choice.tied


def test_a_comparison_pickles() -> None:
    done = run(multiplicative(60))
    again = pickle.loads(pickle.dumps(done))
    assert again.choice == done.choice
    assert list(again.estimates) == list(done.estimates)


def test_progress_is_reported_to_the_end() -> None:
    seen: list[tuple[int, int, str]] = []
    compare(multiplicative(60), SMALL, Question(span=(5.0, 12.0)), progress=lambda *a: seen.append(a))
    assert seen[-1][0] == seen[-1][1]
    assert [s[0] for s in seen] == sorted(s[0] for s in seen)


@pytest.mark.parametrize(("power", "wanted"), [(1, "y ~ x"), (2, "y ~ poly2 x")])
def test_an_exact_curve_is_found_whatever_the_rounding(power: int, wanted: str) -> None:
    x = np.random.default_rng(0).uniform(1, 9, 120)
    rows = Rows(3 + 2 * x**power, x, np.ones((120, 1)), np.ones((120, 1)))
    done = run(rows, (parse("y ~ poly2 x"), parse("y ~ spline5 x"), parse("y ~ poly3 x"), parse("log y ~ x")))
    assert done.choice.key == wanted
