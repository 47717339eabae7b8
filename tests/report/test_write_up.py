"""Methods and results as text."""

from __future__ import annotations

import re

import pytest
from situations import QUICK, examined
from traced import known_numbers, untraced

from batten import __version__
from batten.report.how import how_computed
from batten.report.write_up import write_up


@pytest.mark.parametrize(("name", "n"), [("fan", 40), ("fan", 300), ("plateau", 40), ("bowl", 40)])
@pytest.mark.parametrize("key", ["y ~ x", "log y ~ log x", "loglink y ~ x", "y ~ poly2 x"])
def test_every_number_of_the_results_is_a_result(name: str, n: int, key: str) -> None:
    exam = examined(name, n, *QUICK)
    if key not in exam:
        pytest.skip("not usable on these rows")
    fit = exam[key]
    methods, results = write_up(exam, key).split("\n\n")
    more = [*fit.coefficients.to_numpy(float).ravel(), fit.sigma, fit.df_residual, fit.parameters, fit.aicc, 0.001]
    more += [number for sentence in fit.sentences() for number in sentence.numbers.values()] + [exam.straight.p]
    assert untraced(results, known_numbers(exam, *more)) == []
    assert f"n = {n}" in methods


def test_choosing_is_said_not_to_be_counted_unless_the_remedy_was_planned() -> None:
    chosen = examined("fan", 40, *QUICK)
    words = write_up(chosen, chosen.choice.key)
    assert f"choosing among {chosen.choice.tried} is not counted" in words
    planned = examined("fan", 40, *QUICK, planned="sqrt y ~ x")
    words = write_up(planned, "sqrt y ~ x")
    assert "planned in advance" in words
    assert "No choosing enters the intervals." in words
    assert "is not counted" not in words


def test_methods_are_named_with_their_sources_as_they_were_used() -> None:
    exam = examined("fan", 40, *QUICK)
    log, line, link = (write_up(exam, key) for key in ("log y ~ log x", "y ~ x", "loglink y ~ x"))
    assert "smearing (Duan 1983; factor 1.0" in log
    assert "jackknife" in log
    assert "HC3; MacKinnon and White 1985" in line
    assert "smearing" not in line
    assert "model is one of the mean itself" in link
    for words in (log, line, link):
        assert "Nadeau and Bengio 2003" in words
        assert "Harrell 2015" in words
    constant = examined("fan", 40, *QUICK, errors="constant")
    assert "errors taken to spread evenly" in write_up(constant, "y ~ x")


def test_a_remedy_that_was_not_chosen_is_not_called_the_choice() -> None:
    exam = examined("bowl", 40, *QUICK)
    assert f"the rule stated here would choose {exam.choice.key}" in write_up(exam, "y ~ x")


def test_software_and_rows_are_stated() -> None:
    exam = examined("fan", 40, *QUICK)
    for words in (write_up(exam, "y ~ x"), " ".join(how_computed(exam))):
        assert f"batten {__version__}" in words
        assert re.search(r"Python 3\.\d+", words)
        assert "minutes ~ mass_kg + C(alloy)" in words


def test_the_examination_writes_up_its_choice() -> None:
    exam = examined("bowl", 40, *QUICK)
    assert exam.write_up() == write_up(exam, exam.choice.key)
    assert exam.write_up("y ~ x") != exam.write_up()


def test_a_p_value_never_stands_without_a_size() -> None:
    for words in how_computed(examined("bowl", 40, *QUICK)):
        if "p =" in words or "p <" in words:
            assert re.search(r"F\(\d+, \d+\) = [\d.]+, p", words)
