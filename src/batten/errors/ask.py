"""Questions to one fit that cannot be answered as asked."""

from __future__ import annotations

from collections.abc import Mapping, Sequence

from batten.errors import InputError, UnknownNameError, closest

__all__ = ["cannot_hold", "not_a_covariate", "not_a_number", "not_groups"]


def not_a_number(what: str, given: object) -> InputError:
    return InputError(f"{what} must be a number.", f"It is {given!r}.", "Give one finite number.")


def not_a_covariate(column: str, covariates: Sequence[str]) -> UnknownNameError:
    """A column was named that the formula does not hold beside the focal predictor."""
    known = ", ".join(map(repr, covariates)) or "none"
    return UnknownNameError(
        f"{column!r} is no covariate of this formula.", f"Its covariates: {known}.", closest(column, list(covariates))
    )


def not_groups(column: str) -> InputError:
    """Effects by group were asked along a number."""
    return InputError(
        f"{column!r} is read as a number, not as groups.", "by tells the levels of a group apart.",
        f"Code it as groups: C({column}) in the formula; or ask fit.by_group({column!r}) for three of its values.",
    )  # fmt: skip


def cannot_hold(at: Mapping[str, object], note: str) -> InputError:
    """Covariates cannot be set to these values."""
    given = ", ".join(f"{name} = {value!r}" for name, value in at.items())
    return InputError("Rows with these covariate values cannot be made.", f"Asked: {given}. {note}".strip(),
                      "Give a level or a number that the rows have.")  # fmt: skip
