"""Weights in a script, given or learned from how the errors spread, and clusters."""

from __future__ import annotations

import math

from batten.emit.covariates import read_numbers
from batten.emit.parts import Parts
from batten.emit.text import docstring, literal, noted, number, said, wrapped

__all__ = [
    "Constant", "beside_lines", "clusters_left_out", "data_lines", "learned_fit", "root_function", "root_of", "settled",
    "spread_constants",
]  # fmt: skip

Constant = tuple[str, str, str]


def spread_constants(parts: Parts) -> list[Constant]:
    """The average weight, and what was learned of the spread."""
    return [*_average(parts), *_learned(parts)]


def _average(parts: Parts) -> list[Constant]:
    if not parts.weigher:
        return []
    meaning = f"average of {said(parts.weigher)}: errors and intervals of further rows are those of such a row"
    return [("AVERAGE", number(parts.problem.average_weight), meaning)]


def _learned(parts: Parts) -> list[Constant]:
    spread = parts.est.spread
    if spread is None:
        return []
    if not spread.positive:
        return [
            ("SPREAD", number(spread.power), "the log of the errors' SD grows by this for each SIZE of the plain fit"),
            ("SIZE", number(spread.unit), f"SD of {parts.y}"),
            ("TYPICAL", number(spread.centre * spread.unit), "plain fitted value of a row of average weight"),
        ]
    return [
        ("SPREAD", number(spread.power), "the errors' SD goes with this power of the plain fit's value; estimated"),
        ("LEAST", number(spread.unit), "plain fitted values below this count as this"),
        ("TYPICAL", number(math.exp(spread.centre)), "plain fitted value of a row of average weight"),
    ]


def root_function(parts: Parts) -> list[list[str]]:
    """root(): the square root of a row's weight, from the fitted value of plain least squares."""
    spread = parts.est.spread
    if spread is None:
        return []
    source = "(np.maximum(value, LEAST) / TYPICAL) ** -SPREAD"
    if not spread.positive:
        source = "np.exp(-SPREAD * (value - TYPICAL) / SIZE)"
    text = "Root of the weight of a row with this value of the plain fit: its errors count by their inverse SD."
    return [["def root(value):", *docstring(text), f"    return {source}"]]


def learned_fit(parts: Parts) -> list[str]:
    """plain and fit."""
    given, plain = ("v**2 * ", "smf.wls(MODEL, rows, weights=v**2)") if parts.weigher else ("", "smf.ols(MODEL, rows)")
    fit = 'fit(method="qr")' if parts.uneven else "fit()"
    return [
        f"plain = {plain}.{fit}  # its fitted values say how errors spread",
        f"fit = smf.wls(MODEL, rows, weights={given}root(plain.fittedvalues) ** 2).{fit}",
    ]


def settled(parts: Parts) -> list[str]:
    """A check that SPREAD has the largest likelihood, whose slope is then zero (Harvey 1976)."""
    if parts.est.spread is None:
        return []
    slope = "(e**2 / np.mean(e**2) - 1) @ np.log(root(plain.fittedvalues))"
    return wrapped(f'assert abs({slope}) < 1e-6 * len(y), "another SPREAD is likelier"')


def root_of(design: str) -> str:
    """Source of the roots of the weights of further rows."""
    return f"root({design} @ plain.params.to_numpy())"


# --- columns beside the formula ---------------------------------------------------------------------------------------


def data_lines(parts: Parts, chosen: str) -> list[str]:
    """The frame without rows that a column beside the formula leaves out, each as often as it counts; or nothing."""
    beside = parts.problem.beside
    steps = f".query({literal(chosen)})" if chosen else ""
    if beside.columns:
        steps += f".dropna(subset={literal(list(beside.columns.values()))})"
    lines = wrapped(f"data = {parts.frame}{steps}") if steps else []
    for option, name in beside.columns.items():
        lines += _known(parts, option, name)
    if parts.problem.times is not None:
        times = f"pd.to_numeric(data[{literal(beside.weights)}]).astype(int)"
        lines += wrapped(f"data = data.iloc[np.repeat(np.arange(len(data)), {times})]")
    return lines


def _known(parts: Parts, option: str, name: str) -> list[str]:
    """Leaves out blank text and infinite numbers too, which dropna() keeps, where the analysis left out some rows."""
    why, column = parts.problem.left_out["why"].astype(str), f"data[{literal(name)}]"
    if not any(why.str.contains(f"{word} {name}", regex=False).any() for word in ("missing", "infinite")):
        return []
    if option == "cluster":
        return wrapped(f'data = data[{column}.astype(str).str.strip() != ""]')
    return wrapped(f"data = data[np.isfinite({read_numbers(name, 'data', text=True)})]")


def beside_lines(parts: Parts) -> list[str]:
    """v, the roots of the rows' weights; cluster and members, which rows belong together."""
    lines = []
    if parts.weigher:
        values = f"pd.to_numeric(used[{literal(parts.weigher)}]).to_numpy(float)"
        lines += wrapped(f"v = np.sqrt({values} / AVERAGE)  # roots of the weights")
    if parts.grouped:
        codes = f"cluster = pd.factorize(used[{literal(parts.problem.beside.cluster)}])[0]"
        lines += noted(codes, "each row's cluster")
        members = "members = [np.flatnonzero(cluster == g) for g in range(cluster.max() + 1)]"
        lines += noted(members, "rows of each cluster")
    return lines


def clusters_left_out(score: str) -> list[str]:
    """lost: what each cluster takes away from the coefficients of Q."""
    cross = "np.linalg.pinv(np.eye(len(R)) - Q[i].T @ Q[i], rcond=1e-8)"
    lost = f"lost = np.array([{cross} @ Q[i].T @ {score}[i] for i in members])"
    return ["# what each cluster adds to the coefficients on Q (Bell and McCaffrey 2002)", *wrapped(lost)]
