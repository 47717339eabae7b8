"""Messages of `examine` and of the examination it returns."""

from __future__ import annotations

from batten.errors import InputError, UnknownNameError, closest

__all__ = ["bad_number", "later", "one_of", "same_ends", "unknown_key"]


def one_of(option: str, seen: object, choices: tuple[str, ...]) -> InputError:
    """An option with a fixed set of words."""
    return InputError(f"{option} takes one of {', '.join(choices)}.", f"Seen: {seen!r}.", closest(str(seen), choices))


def bad_number(option: str, seen: object, wanted: str) -> InputError:
    """A number out of its range."""
    return InputError(f"{option} must be {wanted}.", f"Seen: {seen!r}.", f"Give {option} {wanted}.")


def same_ends(a: float, b: float, x: str, low: float, high: float) -> InputError:
    """A span that compares nothing."""
    return InputError(
        "The span needs two different values, the lower one first.", f"Seen: {a!r} and {b!r}.",
        f"{x} runs from {low:.6g} to {high:.6g} in these rows.",
    )  # fmt: skip


def unknown_key(key: str, tried: list[str], refused: tuple[str, str, str] | None) -> UnknownNameError:
    """A remedy that was not tried, or that was refused on these rows."""
    if refused is not None:
        return UnknownNameError(f"{key} cannot be used on these rows. {refused[0]}", refused[1], refused[2])
    return UnknownNameError(
        f"{key!r} was not tried on these rows.", f"{len(tried)} remedies were; list(exam) names them.",
        f"{closest(key, tried)} exam.with_remedy({key!r}) adds one.",
    )  # fmt: skip


def later(option: str, instead: str) -> InputError:
    """An option of the contract that this version does not answer yet."""
    return InputError(f"{option} is not offered in this version.", "Nothing was computed.", instead)
