"""Errors about the formula: it does not parse, or it asks for something that is not one response and one predictor."""

from __future__ import annotations

from collections.abc import Iterable

from batten.errors import InputError, UnknownNameError, closest

__all__ = [
    "FormulaError",
    "depends_on_other_rows",
    "focus_is_grouped",
    "focus_not_in_formula",
    "no_column_in",
    "no_expression",
    "no_numeric_predictor",
    "no_response",
    "no_right_side",
    "no_tilde",
    "not_worked_out",
    "quoted_name_needed",
    "read_as_attribute",
    "response_both_sides",
    "response_is_focus",
    "several_responses",
    "transformed_focus",
    "transformed_response",
    "unknown_column",
    "unknown_focus",
    "unknown_function",
    "unreadable",
    "wrong_length",
]


class FormulaError(InputError):
    """Text that is not a formula; `seen` holds the formula and, below it, carets under the place."""

    def one_line(self) -> str:
        """Without the carets, which point nowhere once the lines are joined."""
        return " ".join(" ".join(line.split()) for line in str(self).splitlines() if line.strip("^ "))


def unreadable(formula: str, start: int, end: int, *, why: str, do: str) -> FormulaError:
    """`why` completes "The formula cannot be read: ..."; carets stand under characters start..end of the formula."""
    carets = " " * start + "^" * max(end - start, 1)
    return FormulaError(f"The formula cannot be read: {why}.", f"{formula}\n{carets}", do)


def no_tilde(formula: str) -> InputError:
    return InputError(
        "A formula needs a response, a ~ and at least one predictor.",
        f"Seen: {formula}" if formula else "The formula is empty.",
        "Write it like this: minutes ~ mass_kg + C(alloy)",
    )


def no_response(formula: str) -> InputError:
    return InputError(
        "The formula has no response.", f"Nothing stands before the ~ in: {formula}", "Name one numeric column there."
    )


def no_right_side(formula: str) -> InputError:
    return InputError(
        "The formula has no predictor.",
        f"Only an intercept, or nothing, stands after the ~ in: {formula}",
        "Name the numeric column whose shape is in question, then covariates if there are any.",
    )


def several_responses(texts: Iterable[str]) -> InputError:
    return InputError(
        "One formula has one response.",
        "Before the ~ stand several: " + ", ".join(texts) + ".",
        "Keep one, and run the others as formulas of their own.",
    )


def transformed_response(text: str, instead: str) -> InputError:
    """`instead`: the untransformed formula, or "" when the text holds several columns."""
    do = (
        f"Write the response plain; its scales are among the remedies:\n{instead}"
        if instead
        else "Make it a column of the data frame first, and name that column."
    )
    return InputError("The response must be one numeric column, untransformed.", f"Before the ~ stands: {text}", do)


def transformed_focus(focus: str, texts: Iterable[str], instead: str) -> InputError:
    return InputError(
        f"The focal predictor `{focus}` must stand in the formula untransformed.",
        "It also stands in: " + ", ".join(texts),
        f"Write it plain; its shapes are among the remedies:\n{instead}",
    )


def unknown_column(name: str, columns: Iterable[object]) -> UnknownNameError:
    options = [str(c) for c in columns]
    return UnknownNameError(
        f"There is no column `{name}`.", f"The data have {len(options)} columns.", closest(name, options)
    )


def unknown_function(name: str, text: str) -> UnknownNameError:
    return UnknownNameError(
        f"`{name}` is not known here.",
        f"It is called in: {text}",
        "numpy is there as np (np.log, np.sqrt); define other functions where the formula is used.",
    )


def read_as_attribute(text: str) -> InputError:
    """A column called mass.kg beside a column, or a module, called mass."""
    return InputError(
        f"`{text}` could be a column, or an attribute of `{text.partition('.')[0]}`.",
        "Both names are there.",
        f"For the column write Q({text!r}).",
    )


def no_column_in(text: str, columns: Iterable[object]) -> UnknownNameError:
    """A factor that names no column: a variable of the notebook, a quoted text, a constant."""
    return UnknownNameError(
        f"`{text}` names no column of the data.",
        "Only columns can stand in a formula; other variables only inside functions of columns.",
        closest(text.strip("'\""), [str(c) for c in columns]),
    )


def no_expression(formula: str, start: int, end: int, *, column: str) -> FormulaError:
    """`column`: the column whose name this is, or ""."""
    text = formula[start:end]
    do = f"Write Q({column!r})." if column else "Join predictors with +; a name with spaces is written Q('its name')."
    return unreadable(formula, start, end, why=f"`{text}` is neither a column nor a Python expression", do=do)


def unknown_focus(name: str, options: Iterable[str]) -> UnknownNameError:
    return UnknownNameError(f"There is no column `{name}` to be the focal predictor.", "", closest(name, list(options)))


def focus_not_in_formula(name: str, options: Iterable[str]) -> InputError:
    return InputError(
        f"The focal predictor `{name}` does not stand in the formula.",
        "Numeric predictors in it: " + (", ".join(options) or "none") + ".",
        "Choose one of these, or add it to the formula.",
    )


def focus_is_grouped(name: str) -> InputError:
    return InputError(
        f"The focal predictor must be numeric, and `{name}` is a group here.",
        f"`{name}` holds text, yes/no or categories, or stands inside C().",
        "Choose a numeric column; the effect of a group needs no shape.",
    )


def no_numeric_predictor(kinds: Iterable[tuple[str, str]], instead: str) -> InputError:
    """kinds: (text as typed, what it is). instead: a formula with the focal predictor plain, or ""."""
    seen = ", ".join(f"{text} ({kind})" for text, kind in kinds)
    do = (
        f"Write it plain; its shapes are among the remedies:\n{instead}"
        if instead
        else "Add the numeric column whose shape is in question."
    )
    return InputError("No predictor is a plain numeric column.", f"After the ~ stand: {seen}.", do)


def response_both_sides(name: str) -> InputError:
    return InputError(
        f"The response `{name}` cannot explain itself.", f"`{name}` stands on both sides of the ~.", "Remove one."
    )


def response_is_focus(name: str) -> InputError:
    return InputError(
        "The response and the focal predictor are the same column.",
        f"Both are `{name}`.",
        "Name another focal predictor.",
    )


def quoted_name_needed(text: str) -> InputError:
    return InputError(
        "Q() needs the name of a column in quotation marks.",
        f"Seen: {text}",
        "Write it like this: Q('melt temperature')",
    )


def not_worked_out(text: str, why: str) -> InputError:
    return InputError(
        f"`{text}` cannot be worked out on these rows.",
        why,
        "Arithmetic stands inside I(), a power is **, and functions must be defined where the formula is used.",
    )


def wrong_length(text: str, got: int, rows: int) -> InputError:
    return InputError(
        f"`{text}` must give one value for each row.",
        f"It gives {got} for {rows} rows.",
        "Make it a column of the data frame first.",
    )


def depends_on_other_rows(text: str) -> InputError:
    return InputError(
        f"`{text}` gives a row another value when other rows are taken away.",
        "A mean, a rank or a cut into parts is worked out anew on every frame, so predictions would be wrong.",
        "Use center(), standardize() or bs(), which remember, or make it a column of the data frame first.",
    )
