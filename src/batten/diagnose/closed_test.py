"""Closed test of fractional polynomials: is there any effect, is it curved, does it take two powers?"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy import stats

from batten.diagnose.tests_of_shape import PERFECT

__all__ = ["ClosedTest", "Step", "closed_test"]


@dataclass(frozen=True)
class Step:
    """One comparison with the fit of two powers. fall: of the deviance n log RSS; statistic: F on df."""

    fall: float
    statistic: float
    df: tuple[int, int]
    p: float


@dataclass(frozen=True)
class ClosedTest:
    """no_effect, straight, one_power: two powers against no predictor, the straight line, and the best single power.

    verdict: the first of "no effect", "straight" and "one power" that is not rejected, else "two powers".
    """

    no_effect: Step
    straight: Step
    one_power: Step
    verdict: str


def closed_test(
    *, none: float, straight: float, one_power: float, two_powers: float, n: int, others: int, level: float = 0.05
) -> ClosedTest | None:
    """From the four residual sums of squares, n rows and the number of other columns, the constant among them.

    Each is compared with two powers in turn, and the first that is not rejected stands (Royston and Altman 1994;
    Royston and Sauerbrei 2008), so the overall level is about `level`. F with (exp(fall / n) - 1) nu / k on (k, nu)
    degrees of freedom, k = 4, 3, 2 (a power counts as a constant), nu = n - others - 4. None where nu is below 1 or two
    powers fit perfectly.
    """
    nu = n - others - 4
    if nu < 1 or two_powers <= PERFECT * none:
        return None
    steps = {}
    for name, rss, k in (("no effect", none, 4), ("straight", straight, 3), ("one power", one_power, 2)):
        more = max(rss / two_powers - 1, 0.0)
        f = more * nu / k
        steps[name] = Step(n * float(np.log1p(more)), f, (k, nu), float(stats.f.sf(f, k, nu)))
    verdict = next((name for name, step in steps.items() if step.p >= level), "two powers")
    return ClosedTest(steps["no effect"], steps["straight"], steps["one power"], verdict)
