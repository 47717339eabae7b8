"""Errors about remedy keys: what was typed, what was seen, what to type instead."""

from __future__ import annotations

from collections.abc import Sequence

from batten.errors import InputError, UnknownNameError, closest

__all__ = ["curve_needs_plain_response", "key_form", "unknown_part", "unknown_remedy", "wrong_numbers"]

_FORM = "In a key, y stands for the response and x for the focal predictor: 'log y ~ x', 'y ~ poly2 x'."


def key_form(text: str) -> InputError:
    """The text has no two sides."""
    return InputError("A remedy's key has two sides with one '~' between them.", f"Seen: {text!r}.", _FORM)


def unknown_part(text: str, part: str, *, side: str, options: Sequence[str]) -> UnknownNameError:
    """One side of a key names no family. `side` is "response" or "predictor"."""
    return UnknownNameError(
        f"{part!r} is not a known form of the {side} in a remedy's key.",
        f"Seen: {text!r}.",
        f"{closest(part, list(options))} {_FORM}",
    )


def unknown_remedy(name: str, options: Sequence[str]) -> UnknownNameError:
    """A name for `only` that is neither a family nor a key."""
    return UnknownNameError(
        f"{name!r} is neither a family of remedies nor a remedy's key.",
        "Families: " + ", ".join(options) + ".",
        f"{closest(name, list(options))} {_FORM}",
    )


def wrong_numbers(seen: str, needs: str, *, instead: str) -> InputError:
    """The numbers of a key do not make a member: "spline(5, 10)" has too few knots."""
    return InputError(needs, f"Seen: {seen!r}.", instead)


def curve_needs_plain_response(left: str, right: str) -> InputError:
    """A known curve under a transformed response or a link."""
    return InputError(
        "A known curve stands on the response as it is.",
        f"Seen: '{left} ~ {right}'.",
        f"Write 'y ~ {right}', or keep '{left}' with another shape, such as '{left} ~ log x'.",
    )
