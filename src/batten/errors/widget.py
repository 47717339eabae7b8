"""What is said about a value typed into the widget that cannot be used; the typed text stays where it is."""

from __future__ import annotations

from batten.errors import InputError

__all__ = ["no_remedy_named", "not_a_date", "not_a_number"]


def not_a_number(name: str, typed: str) -> InputError:
    """Text where a number is needed; `name` is the column."""
    if not typed.strip():
        return InputError(f"{name} needs a number.", "The field is empty.", "Type one, such as 12.5.")
    comma = typed.count(",") == 1 and "." not in typed
    do = f"Write {typed.replace(',', '.')} with a point." if comma else "Type one finite number, such as 12.5."
    return InputError(f"{name} needs a number.", f"Typed: {typed!r}.", do)


def not_a_date(name: str, typed: str) -> InputError:
    return InputError(f"{name} needs a date.", f"Typed: {typed!r}.", "Write it as 2024-03-31, or 2024-03-31 14:30.")


def no_remedy_named() -> InputError:
    return InputError(
        "No remedy is named.", "The field is empty.", "Choose one from the list, or type a key such as y ~ poly4 x."
    )
