"""What a penalised curve learned: how many degrees of freedom it took, in words and among the constants."""

from __future__ import annotations

from batten.effects.tell import Names, Sentence, Told
from batten.fit.estimate import Estimate

__all__ = ["curve_freedom", "freedom_note", "smoothing_sentence"]


def curve_freedom(est: Estimate) -> tuple[float, int]:
    """Effective degrees of freedom of the curve (of all curves of an interaction), and those straight lines take."""
    assert est.roughness is not None
    return est.roughness.edf - est.rows.base.shape[1], est.rows.modifier.shape[1]


def freedom_note(est: Estimate) -> str:
    """Where the number comes from."""
    lines = curve_freedom(est)[1]
    straight = "a straight line takes 1" if lines == 1 else f"straight lines take {lines}, one weight for all curves"
    return f"{straight}; chosen by restricted likelihood (REML), no interval"


def smoothing_sentence(est: Estimate, names: Names) -> Sentence:
    """How far the curve goes from a straight line."""
    assert est.roughness is not None
    told, (used, lines) = Told(names), curve_freedom(est)
    chosen = "how much it may bend was chosen by these rows' own likelihood"
    straight = told.place("straight", float(lines))
    if est.roughness.end == "straight":
        return told.sentence("curve", f"The smooth curve in {names.x} came out straight: {chosen}.")
    about = told.number("freedom", used, width=2.0)
    if est.roughness.end == "free":
        chosen = f"{chosen}, and it bends as freely as its knots allow"
    if lines == 1:
        text = f"The smooth curve in {names.x} takes about {about} degrees of freedom, where a straight line takes "
        return told.sentence("curve", f"{text}{straight}; {chosen}.")
    text = f"The smooth curves in {names.x} take about {about} degrees of freedom in all, where straight lines take "
    return told.sentence("curve", f"{text}{straight}; {chosen.replace('it', 'they')}, one measure for all.")
