"""Formulas as text: comments, lines, and what is said, with carets, when they cannot be read."""

from __future__ import annotations

import pickle

import pytest

from batten.errors import InputError
from batten.errors.formula import FormulaError
from batten.frame.formula import parse


def test_comments_and_line_breaks_go_but_quoted_names_stay() -> None:
    text = """minutes ~ mass_kg   # what we may change
        + C(alloy) \\
        + Q("wall # mm")  # not a comment inside the quotation marks
    """
    formula = parse(text)
    assert formula.text == 'minutes ~ mass_kg + C(alloy) + Q("wall # mm")'
    assert formula.terms == ((), ("mass_kg",), ("C(alloy)",), ('Q("wall # mm")',))


def test_the_grammar_is_patsys() -> None:
    assert parse("y ~ x*g - 1").terms == (("x",), ("g",), ("x", "g"))
    assert parse("y ~ 0 + g/x").terms == (("g",), ("g", "x"))
    assert parse("y ~ (a + b)**2 - a:b").terms == ((), ("a",), ("b",))
    assert parse("y ~ x + np.log(z, where=z > 0)").terms == ((), ("x",), ("np.log(z, where=z > 0)",))


def test_a_bare_power_of_one_column_is_noted() -> None:
    assert parse("y ~ x + x**2 + (a + b)**2").powers == ("x**2",)


CARETS = {
    "y ~ log(price": ("this bracket is never closed", "       ^", "Close it, or remove it."),
    "y ~ x + [z": ("this bracket is never closed", "        ^", "Close it, or remove it."),
    "y ~ x) + z": ("this bracket was never opened", "     ^", "Open it, or remove it."),
    "y ~ f(x]": ("this bracket was never opened", "       ^", "Open it, or remove it."),
    "y ~ Q('a": ("this quotation mark is never closed", "      ^", "Close it, or remove it."),
    "y ~ x +": ("nothing follows this sign", "      ^", "Add what should follow, or remove the sign."),
    "y + ~ x": ("nothing follows this sign", "  ^", "Add what should follow, or remove the sign."),
    "y ~ x * * z": (
        "no column stands before this sign", "        ^", "Add the column that is missing, or remove the sign.",
    ),
    "y ~ (x) z": ("no sign joins this to what stands before it", "        ^", "Join predictors with +."),
    "y ~ x ~ z": ("a formula has one ~", "      ^", "Join predictors with +."),
    "y ~ 1/x": ("a bare 1 can be added or removed, not combined", "    ^", "Arithmetic goes inside I(): I(1/z)."),
    "y ~ x + 2*z": ("a bare number other than 0 and 1 is no term", "        ^", "Arithmetic goes inside I(): I(2*z)."),
    "y ~ x**0.5": ("a bare power must be a whole number", "       ^^^", "Arithmetic goes inside I(): I(z**0.5)."),
    "y ~ x + z^2": (
        "this sign has no meaning in a formula", "         ^", "A power is I(z**2), an interaction a:b or a*b.",
    ),
    "y ~ x | g": ("this sign has no meaning in a formula", "      ^", "A power is I(z**2), an interaction a:b or a*b."),
    "y ~ `wall mm`": (
        "this sign has no meaning in a formula", "    ^", 'A column with an unusual name is written Q("its name").',
    ),
    "y ~ mass$kg": (
        "this sign has no meaning in a formula", "        ^", 'A column with an unusual name is written Q("its name").',
    ),
    "y ~ -x": ("a minus takes away a term or the intercept", "    ^^", "Arithmetic goes inside I(): I(-z)."),
}  # fmt: skip


@pytest.mark.parametrize("text", CARETS)
def test_carets_stand_under_the_place(text: str) -> None:
    why, carets, do = CARETS[text]
    with pytest.raises(FormulaError) as caught:
        parse(text)
    assert str(caught.value) == f"The formula cannot be read: {why}.\n{text}\n{carets}\n{do}"


def test_carets_are_right_after_comments_and_lines_are_gone() -> None:
    with pytest.raises(FormulaError) as caught:
        parse("y ~ x  # first\n  + f(z")
    assert caught.value.seen == "y ~ x + f(z\n         ^"


def test_on_one_line_the_carets_are_left_out() -> None:
    with pytest.raises(FormulaError) as caught:
        parse("y ~ log(price")
    expected = "The formula cannot be read: this bracket is never closed. y ~ log(price Close it, or remove it."
    assert caught.value.one_line() == expected
    assert str(pickle.loads(pickle.dumps(caught.value))) == str(caught.value)


def test_what_is_missing_is_named() -> None:
    messages = {
        "": (
            "A formula needs a response, a ~ and at least one predictor.\nThe formula is empty.\n"
            "Write it like this: minutes ~ mass_kg + C(alloy)"
        ),
        "minutes = mass_kg": (
            "A formula needs a response, a ~ and at least one predictor.\nSeen: minutes = mass_kg\n"
            "Write it like this: minutes ~ mass_kg + C(alloy)"
        ),
        "~ x": ("The formula has no response.\nNothing stands before the ~ in: ~ x\nName one numeric column there."),
        "y ~  # nothing": (
            "The formula has no predictor.\nOnly an intercept, or nothing, stands after the ~ in: y ~\n"
            "Name the numeric column whose shape is in question, then covariates if there are any."
        ),
    }
    for text, message in messages.items():
        with pytest.raises(InputError) as caught:
            parse(text)
        assert str(caught.value) == message


def test_a_formula_can_be_written_anew_with_factors_renamed_or_left_out() -> None:
    formula = parse("y ~ x + I(x**2) + g*z - 1")
    assert formula.rewritten("y", {"I(x ** 2)": "x", "z": None}) == "y ~ 0 + x + g"
