"""The few remedies that a first screen shows, and what each is there for."""

from __future__ import annotations

from batten.compare.grid import STRAIGHT, Comparison

__all__ = ["LINE", "shortlist"]

LINE, CHOICE, RUNNER_UP, READABLE, FLEXIBLE = "straight line", "choice", "runner-up", "best readable", "best flexible"


def shortlist(comparison: Comparison) -> list[tuple[str, str]]:
    """At most five (role, key): the line, the choice, the runner-up, the best readable and the best flexible remedy.

    Best is the lowest held-out error among remedies that do not turn against what was expected. Readable: a reader can
    be told in one sentence what it says; flexible: its shape follows the data (splines, smooths, high polynomials). A
    remedy with several roles stands once, its roles joined: "choice, best readable".
    """
    choice = comparison.choice
    wanted = [
        (LINE, STRAIGHT if STRAIGHT in comparison.estimates else None),
        (CHOICE, choice.key),
        (RUNNER_UP, choice.runner_up),
        (READABLE, _best(comparison, readable=True)),
        (FLEXIBLE, _best(comparison, readable=False)),
    ]
    roles: dict[str, list[str]] = {}
    for role, key in wanted:
        if key is not None:
            roles.setdefault(key, []).append(role)
    return [(", ".join(words), key) for key, words in roles.items()]


def _best(comparison: Comparison, *, readable: bool) -> str | None:
    """Lowest held-out error among the remedies a sentence can tell, or among those whose shape it cannot."""
    found = [
        key
        for key, est in comparison.estimates.items()
        if not comparison.turns[key] and (est.remedy.readable if readable else not est.shape.readable)
    ]
    return min(found, key=lambda key: comparison.scores[key].rmse, default=None)
