"""What a magic says when a line or a cell cannot be used as it stands."""

from __future__ import annotations

from collections.abc import Sequence

from batten.errors import BattenError, InputError, UnknownNameError, closest

__all__ = [
    "bad_keep", "bad_number", "bad_pair", "cannot_write", "extra_words", "given_twice", "missing_value",
    "no_examination", "no_file", "no_formula", "no_frame_name", "no_variable", "not_a_frame", "not_a_name",
    "not_a_page", "open_quote", "takes_no_value", "takes_nothing", "unknown_option", "unknown_subcommand",
]  # fmt: skip

_USAGE = "%%batten FRAME, then options; below it a formula, such as minutes ~ mass_kg + C(alloy). %%batten? lists them."
_QUOTES = 'Names and expressions with spaces go between quotes, such as --focus "daily light".'


# --- the line of %%batten ---------------------------------------------------------------------------------------------


def open_quote(line: str) -> InputError:
    return InputError("A quotation mark on the %%batten line is never closed.", f"Seen: {line.strip()}.", _QUOTES)


def no_frame_name(frames: Sequence[str]) -> InputError:
    return InputError("The name of a data frame is missing.", _here(frames), f"Usage: {_USAGE}")


def no_formula() -> InputError:
    return InputError("There is no formula below the %%batten line.", "", f"Usage: {_USAGE}")


def extra_words(words: Sequence[str]) -> InputError:
    """More than one word that belongs to no option."""
    formula = any("~" in word for word in words)
    return InputError(
        "Only the name of the data frame stands on the %%batten line beside the options.",
        f"Seen too: {' '.join(words)}.",
        "Write the formula on the lines below." if formula else _QUOTES,
    )


def unknown_option(name: str, options: Sequence[str]) -> UnknownNameError:
    near = closest(name, list(options))
    do = near if near.startswith("Did") else ""
    return UnknownNameError(f"There is no option {name}.", "", f"{do} %%batten? lists the options.".strip())


def given_twice(what: str) -> InputError:
    return InputError(f"{what} is given twice.", "", "Keep one of them.")


def missing_value(form: str, seen: Sequence[str]) -> InputError:
    """form: the option as it is written, "--span A B". seen: the values that are there."""
    written = " ".join((form.split()[0], *seen))
    return InputError(f"A value is missing: {form}.", f"Seen: {written}.", "Add it behind the option.")


def takes_no_value(name: str, value: str) -> InputError:
    return InputError(f"{name} takes no value.", f"Seen: {name}={value}.", f"Write just {name}.")


def bad_number(form: str, seen: str, *, whole: bool) -> InputError:
    what, such = ("a whole number", "10") if whole else ("a plain number", "2.5")
    return InputError(f"{form} takes {what}.", f"Seen: {seen}.", f"Write it like {such}.")


def bad_pair(form: str, seen: str) -> InputError:
    """A NAME=VALUE without its sign, its name or its value."""
    return InputError(
        f"{form} takes a column's name, the sign = and a value.", f"Seen: {seen}.",
        'Write them without spaces, or in quotes: "bed age=3".',
    )  # fmt: skip


def bad_keep(name: str, why: str) -> InputError:
    return InputError(f"--keep cannot bind the name {name}.", why, "Choose another name, such as exam.")


# --- the data frame ---------------------------------------------------------------------------------------------------


def not_a_name(text: str) -> InputError:
    """An expression where a variable should stand."""
    return InputError(
        "The data frame is given by the name of a variable.", f"Seen: {text}.",
        "Give it a name in a cell before this one; --rows chooses among its rows.",
    )  # fmt: skip


def no_variable(name: str, frames: Sequence[str], *, subcommands: Sequence[str]) -> UnknownNameError:
    if name in subcommands:
        do = f"With one percent sign, %batten {name} works on the last examination."
    else:
        do = _meant(name, frames)
    return UnknownNameError(f"There is no variable {name}.", _here(frames), do)


def not_a_frame(name: str, kind: str, frames: Sequence[str]) -> InputError:
    seen = f"It is {kind}. {_here(frames)}"
    return InputError(f"{name} is not a data frame.", seen, _meant(name, frames))


def _here(frames: Sequence[str]) -> str:
    return f"Data frames here: {', '.join(frames)}." if frames else "No data frame is defined yet."


def _meant(name: str, frames: Sequence[str]) -> str:
    near = closest(name, list(frames))
    if near.startswith("Did"):
        return near
    return "Name one of them." if frames else "For a first try: castings = batten.sample('castings')"


# --- %batten ----------------------------------------------------------------------------------------------------------


def no_examination() -> InputError:
    return InputError("There is no examination yet.", "", f"Run one first: {_USAGE}")


def unknown_subcommand(word: str, options: Sequence[str], *, is_frame: bool) -> BattenError:
    if is_frame:
        return InputError(
            f"%batten {word} does nothing with a data frame.", "One percent sign works on the last examination.",
            f"To examine it, begin a cell with two: %%batten {word}",
        )  # fmt: skip
    return UnknownNameError(f"There is no %batten {word}.", "", closest(word, list(options)))


def takes_nothing(word: str, rest: str) -> InputError:
    return InputError(f"%batten {word} takes nothing more.", f"Seen: {rest}.", f"Write just %batten {word}.")


def no_file() -> InputError:
    return InputError("%batten report needs the name of a file.", "", "Such as %batten report castings.html")


def not_a_page(file: str) -> InputError:
    """Only pages are written, so that a slip of the hand overwrites no data."""
    return InputError(
        "The report is a web page: its file's name ends in .html.", f"Seen: {file}.", "Nothing has been written."
    )


def cannot_write(file: str, why: str) -> InputError:
    return InputError(f"The report cannot be written to {file}.", f"{why}.", "Choose another place.")
