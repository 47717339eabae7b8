"""Questions to one fit that cannot be answered as asked."""

from __future__ import annotations

from collections.abc import Mapping, Sequence

from batten.errors import InputError, UnknownNameError, closest

__all__ = ["cannot_hold", "not_a_covariate", "not_a_number"]


def not_a_number(what: str, given: object) -> InputError:
    return InputError(f"{what} must be a number.", f"It is {given!r}.", "Give one finite number.")


def not_a_covariate(column: str, covariates: Sequence[str]) -> UnknownNameError:
    """A column was named that the formula does not hold beside the focal predictor."""
    known = ", ".join(map(repr, covariates)) or "none"
    return UnknownNameError(
        f"{column!r} is no covariate of this formula.", f"Its covariates: {known}.", closest(column, list(covariates))
    )


def cannot_hold(at: Mapping[str, object], note: str) -> InputError:
    """Covariates cannot be set to these values."""
    given = ", ".join(f"{name} = {value!r}" for name, value in at.items())
    return InputError("Rows with these covariate values cannot be made.", f"Asked: {given}. {note}".strip(),
                      "Give a level or a number that the rows have.")  # fmt: skip
