"""Messages of the comparison."""

from __future__ import annotations

from collections.abc import Mapping

from batten.errors import InputError, Refusal

__all__ = ["nothing_fits"]


def nothing_fits(refused: Mapping[str, Refusal]) -> InputError:
    """No remedy at all can be used on these rows."""
    first = next(iter(refused.items()), None)
    seen = f"{len(refused)} tried; {first[0]}: {first[1].wrong} {first[1].seen}" if first else "None were asked for."
    return InputError("No remedy can be fitted to these rows.", seen, first[1].instead if first else "Ask for some.")
