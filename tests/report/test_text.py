"""The examination as plain text: every number traced, every line within the width, words for what is missing."""

from __future__ import annotations

import pytest
from situations import QUICK, examined
from traced import known_numbers, untraced

from batten.report.text import headline, text_summary
from batten.report.words import choice_words, otherwise, trial_words, verdict

CASES = [("fan", 40), ("fan", 300), ("plateau", 40), ("bowl", 40)]


@pytest.mark.parametrize(("name", "n"), CASES)
def test_every_number_in_the_text_is_a_result_at_the_printed_digits(name: str, n: int) -> None:
    exam = examined(name, n, *QUICK)
    assert untraced(text_summary(exam), known_numbers(exam)) == []


def test_a_number_that_is_no_result_would_be_found() -> None:
    exam = examined("fan", 40, *QUICK)
    known = known_numbers(exam)
    best = float(exam.table()["rmse"].min())
    assert untraced(f"error {best:.2f} min over the central 90% of 40 rows, y ~ spline5 x", known) == []
    assert untraced(f"error {best * 1.013:.3f} min", known) == [f"{best * 1.013:.3f}"]
    assert untraced("44,444 rows", known) == ["44,444"]


@pytest.mark.parametrize(("name", "n"), CASES)
def test_the_headline_is_one_line_with_the_verdict_and_the_choice(name: str, n: int) -> None:
    exam = examined(name, n, *QUICK)
    line = headline(exam)
    assert "\n" not in line
    assert line.startswith(verdict(exam))
    assert exam.chosen.words in line
    assert untraced(line, known_numbers(exam)) == []


def test_the_verdict_is_not_said_twice() -> None:
    exam = examined("bowl", 40, *QUICK)
    assert exam.straight.words.startswith("The straight line bends, and it matters: over")
    assert trial_words(exam).startswith("Over the central 90%")
    assert text_summary(exam).count("it matters") == 1


def test_the_text_keeps_to_its_width() -> None:
    for name, n in CASES:
        lines = text_summary(examined(name, n, *QUICK), width=100).splitlines()
        assert max(map(len, lines)) <= 104  # a table of numbers may need a little more


def test_hostile_names_stay_on_their_line_as_they_are() -> None:
    exam = examined("hostile", 60, *QUICK)
    flat = " ".join(text_summary(exam).split())
    assert '_<b>cost</b> & "fuss" $\\bad{$ of every single casting' in flat
    assert "\n" not in headline(exam)


def test_the_span_sentence_and_its_conditions_stand_together() -> None:
    flat = " ".join(text_summary(examined("fan", 40, *QUICK)).split())
    assert "Rows with mass_kg of 25 kg against rows with mass_kg of 10 kg, covariates alike: the mean of" in flat
    assert "A difference between rows, not proof of cause. The interval is as if this remedy had been fixed" in flat


def test_runner_up_reasons_and_other_yardsticks_are_printed() -> None:
    exam = examined("fan", 300, *QUICK)
    text = " ".join(text_summary(exam).split())
    assert choice_words(exam) in text
    assert all(reason in text for reason in exam.choice.reasons)
    for _, key in exam.choice.otherwise:
        assert key in otherwise(exam)
    assert f"{len(exam.refused)} rem" in text


def test_a_planned_remedy_is_called_planned() -> None:
    exam = examined("fan", 40, *QUICK, planned="sqrt y ~ x")
    assert "Planned: square root of minutes on mass_kg." in headline(exam)
    assert "was planned in advance" in text_summary(exam)


def test_no_word_claims_a_cause_or_significance() -> None:
    for name, n in CASES:
        words = text_summary(examined(name, n, *QUICK)).lower()
        for claim in ("significan", "causes", "leads to", "due to", "increases", "decreases", "impact"):
            assert claim not in words
