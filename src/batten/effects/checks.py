"""What can be checked about one fit: left-over shape, scale, spread, dependence, and the rows it leans on.

Each check has a size a reader can weigh, beside p. Tests are made on the fit's own scale (weighted for links), robust
where the question's errors are; sizes are brought back to units of y at the middle of the fitted values. The left-over
bend is the one test fixed beforehand; with so many others, one in twenty fires by chance.
"""

from __future__ import annotations

from batten.effects.check import CHANCE, Check, working
from batten.effects.checks_of_line import checks_of_line
from batten.effects.checks_of_rows import checks_of_rows
from batten.effects.checks_of_scale import checks_of_scale
from batten.effects.checks_of_shape import checks_of_shape
from batten.effects.checks_of_spread import checks_of_spread
from batten.effects.tell import Names
from batten.fit.estimate import Estimate

__all__ = ["Check", "checks"]


def checks(
    est: Estimate,
    names: Names,
    span: tuple[float, float],
    *,
    errors: str = "robust",
    labels: tuple[str, ...] = (),
    tolerance: float | None = None,
    unnamed: tuple[str, ...] = (),
    every: bool = True,
) -> tuple[Check, ...]:
    """All checks that can be made on this fit; one that cannot is left out.

    labels: names of the columns without the focal predictor. tolerance: smallest bend that matters, units of y.
    unnamed: searched constants that the data do not settle. every: also the tests that ask a question again in
    another way.
    """
    work = working(est)
    rows = [c for c in checks_of_rows(est, work, names, span=span, labels=labels, unnamed=unnamed) if c is not None]
    bent = any(c.name == "bent covariate" and c.p < CHANCE for c in rows)
    found = [
        *checks_of_shape(est, work, names, errors=errors, every=every),
        *checks_of_line(est, names, tolerance=tolerance, bent=bent, every=every),
        *checks_of_scale(est, work, names, span=span, errors=errors, every=every),
        *checks_of_spread(est, work, names, every=every),
        *rows,
    ]
    return tuple(check for check in found if check is not None)
