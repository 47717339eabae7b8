"""The standing question in a script: the span effect, averaged over covariates, with the interval of the screen."""

from __future__ import annotations

from typing import Any

import pandas as pd

from batten.emit.functions import undo
from batten.emit.held import held_at
from batten.emit.parts import Parts
from batten.emit.text import WIDTH, comment, fstring, literal, said, wrapped

__all__ = ["span"]

#: slope of a link's mean in the linear predictor, from the mean
_LINK_SLOPES = {"loglink": "{}", "share": "{0} * (1 - {0})", "invlink": "-({}**2)"}


def span(parts: Parts) -> list[str]:
    """effect and half, the half width of its interval; only words where the question has no answer."""
    note = parts.numbers.span.note
    if note:
        return comment(f"No effect over the span: {said(note, 200)}.")
    if not parts.bounded:
        why = comment(f"Change of the mean over SPAN; {said(parts.numbers.span.difference.note, 200)}.")
        return [
            *why,
            *_ends(parts),
            *_function(parts),
            f"effect = difference({parts.parameters})",
            *_told(parts),
        ]
    how = _tested(parts) if parts.tested else _deleted(parts) if parts.deletes else _linearised(parts)
    return [*comment(_introduction(parts)), *_ends(parts), *how, *_told(parts)]


def _introduction(parts: Parts) -> str:
    over = "" if parts.single else ", averaged over the rows' own covariates"
    if parts.problem.profile is not None:
        over = ", at " + ", ".join(f"{said(name)} = {said(value)}" for name, value in parts.question.at.items())
    if parts.deletes:
        way = f"by leaving out each {'cluster' if parts.clustered else 'row'} in turn"
    elif parts.kind == "identity" and parts.steady and parts.robust:
        way = "that of the coefficients"
    else:
        unit = "cluster" if parts.clustered else "row"
        way = f"by each {unit}'s influence" if parts.robust else "for errors of one size"
    return f"Change of the mean over SPAN{over}; interval {way}."


def _ends(parts: Parts) -> list[str]:
    """Designs A and B at the two ends; one row is enough where all have the same covariates."""
    one = ".iloc[:1]" if parts.single else ""
    return wrapped(f"A, B = (design(used{one}.assign({held_at(parts, 'at', _asked(parts))})) for at in SPAN)")


def _asked(parts: Parts) -> dict[str, Any]:
    """Covariate values to hold, as their columns would store them."""
    return {name: _stored(value, parts.problem.design.read[name]) for name, value in parts.question.at.items()}


def _stored(value: Any, column: pd.Series[Any]) -> Any:
    if isinstance(value, str) and pd.api.types.is_bool_dtype(column.dtype):
        return value.lower() in ("true", "yes", "1")
    return value


# --- statsmodels' own -------------------------------------------------------------------------------------------------


def _tested(parts: Parts) -> list[str]:
    return [
        "change = fit.t_test((B - A).mean(axis=0))",
        f"effect, half = change.effect[0], {parts.t_name} * change.sd[0, 0]",
    ]


# --- leaving out rows -------------------------------------------------------------------------------------------------


def _deleted(parts: Parts) -> list[str]:
    units, loop = ("without", "zip(members, without, strict=True)") if parts.clustered else ("y", "enumerate(without)")
    half = f"{parts.t_name} * np.sqrt((len({units}) - 1) * np.var(EACH))"
    if parts.kind == "identity" and parts.steady:
        return ["gap = (B - A).mean(axis=0)", f"effect, half = gap @ b, {half.replace('EACH', 'without @ gap')}"]
    if parts.link:
        gap = f"{undo(parts, 'B @ b')} - {undo(parts, 'A @ b')}"
        each = gap.replace("@ b", "@ w")
        each = f"({each}).mean() for w in without" if parts.fixed else (
            f"np.delete({each}, i).mean() for i, w in {loop}")  # fmt: skip
        return [f"each = [{each}]", *wrapped(f"effect, half = ({gap}).mean(), {half.replace('EACH', 'each')}")]
    lines = [f"each = [difference(w, i) for i, w in {loop}]"]
    if parts.smooth:  # to first order
        lines.append("bias = [(difference(b + d / 1e3) - difference(b - d / 1e3)) * 500 for d in taken]")
        half = half.removesuffix(")") + " + np.sum(np.square(bias)))"
    own = parts.parameters
    return [*_function(parts), *lines, f"effect, half = difference({own}), {half.replace('EACH', 'each')}"]


def _function(parts: Parts) -> list[str]:
    """difference(b, i): the effect under coefficients b, averaged over the rows but row i."""
    return [
        f"def difference({parts.parameters}{', i=()' if parts.deletes else ''}):",
        *_difference(parts, deletes=parts.deletes),
    ]


def _difference(parts: Parts, *, deletes: bool) -> list[str]:
    by_error = "np.delete({}, i)" if deletes else "{}"
    by_row = "np.delete({}, i)" if deletes and not parts.fixed else "({})"
    if parts.kind == "identity":
        return [f"    return {by_row.format('(B - A) @ b')}.mean()"]
    if parts.kind == "exp":
        smear, gap = by_error.format("np.exp(z - X @ b)"), by_row.format("np.exp(B @ b) - np.exp(A @ b)")
        return [f"    return {smear}.mean() * {gap}.mean()"]
    if parts.link:
        gap = f"{undo(parts, 'B @ b')} - {undo(parts, 'A @ b')}"
        return [f"    return {by_row.format(gap)}.mean()"]
    e = "z + (p[-2] - LAMBDA) * slope - X @ p[:-2]" if parts.power else "z - X @ b"
    low, high = (f"mean({end} @ p[:-2], e, p[-2])" if parts.power else f"mean({end} @ b, e)" for end in "AB")
    return [f"    e = {by_error.format(e)}", f"    return {by_row.format(f'{high} - {low}')}.mean()"]


# --- to first order ---------------------------------------------------------------------------------------------------


def _linearised(parts: Parts) -> list[str]:
    """effect, its slopes in the coefficients (pull), and each row's own share in the averages."""
    if parts.kind == "identity" and parts.steady and parts.robust:
        squares = f"{parts.few}(((without - b) @ gap) ** 2).sum()"
        squares += " + ((taken @ gap) ** 2).sum()" if parts.smooth else ""
        half = f"{parts.t_name} * np.sqrt({squares})"
        together = f"effect, half = gap @ b, {half}"
        answer = [together] if len(together) <= WIDTH else ["effect = gap @ b", f"half = {half}"]
        return ["gap = (B - A).mean(axis=0)", *answer]
    lines, own = _slopes(parts)
    if parts.est.rows.cluster is not None and own:
        lines += _BY_CLUSTER
        own = [f"by_cluster({share})" for share in own]
    if parts.robust:
        few = "np.sqrt(1 - 1 / len(without)) * " if parts.clustered else ""
        total = " + ".join([f"{few}len(y) * ({parts.parameters} - without) @ pull", *own])
        half = "np.sqrt((influence**2).sum()) / len(y)"
        if parts.smooth:
            half = "np.sqrt((influence**2).sum() / len(y) ** 2 + ((taken @ pull) ** 2).sum())"
        return [*lines, *wrapped(f"influence = {total}"), f"half = {parts.t_name} * {half}"]
    if parts.power:
        spread = f"{parts.few}(((without - p) @ pull) ** 2).sum()"
    else:
        spread = "s2 * (np.linalg.solve(R.T, pull) ** 2).sum()" if parts.needs_s2 else "pull @ cov @ pull"
    if own:
        lines += wrapped(f"shares = [{', '.join(own)}]")
        lines.append("rest = sum((share**2).sum() for share in shares) / len(y) ** 2")
        spread += " + rest"
    known = [] if parts.power or parts.needs_s2 else ["cov = fit.cov_params().to_numpy()"]
    return [*lines, *known, *wrapped(f"half = {parts.t_name} * np.sqrt({spread})")]


#: shares of clusters, with the factor of few clusters
_BY_CLUSTER = [
    "def by_cluster(share):",
    "    sums = np.array([share[i].sum() for i in members])",
    "    return np.sqrt(len(sums) / (len(sums) - 1)) * sums",
]


def _slopes(parts: Parts) -> tuple[list[str], list[str]]:
    """Statements, and sources of the rows' own shares."""
    if parts.kind == "identity":
        lines = ["gap = (B - A) @ b", "effect, pull = gap.mean(), (B - A).mean(axis=0)"]
        return lines, [] if parts.steady else ["gap - effect"]
    if parts.link:
        low, high = (_LINK_SLOPES[parts.kind].format(end) for end in ("low", "high"))
        lines = [
            f"low, high = {undo(parts, 'A @ b')}, {undo(parts, 'B @ b')}",
            "effect = (high - low).mean()",
            f"pull = (({high}) @ B - ({low}) @ A) / len(A)",
        ]
        return lines, [] if parts.fixed else ["high - low - effect"]
    if parts.kind == "exp":
        lines = [
            "low, high = np.exp(A @ b), np.exp(B @ b)",
            "gap = (high - low).mean()",
            "effect, pull = smear * gap, smear * (high @ B - low @ A) / len(A) - gap * (np.exp(e) @ X) / len(y)",
        ]
        own = ["np.exp(e) * gap - effect"]
        return lines, own if parts.fixed else [*own, "smear * (high - low) - effect"]
    return _numeric_slopes(parts)


def _numeric_slopes(parts: Parts) -> tuple[list[str], list[str]]:
    b = parts.parameters
    moves = f"without - {b}" if parts.robust or parts.power else "np.linalg.solve(R, Q.T * e).T"
    lines = [
        *_function(parts),
        f"effect = difference({parts.parameters})",
        f"steps = 1e-4 * np.sqrt((({moves}) ** 2).sum(axis=0))",
        f"pull = np.array([difference({b} + d) - difference({b} - d) for d in np.diag(steps)]) / (2 * steps)",
        "low, high = (N @ b for N in (A, B))",
    ]
    own = ["mean(e, high) - mean(e, low) - effect"]
    return lines, own if parts.fixed else [*own, "mean(high, e) - mean(low, e) - effect"]


def _told(parts: Parts) -> list[str]:
    a, b = (f"{end:.6g}" for end in parts.question.span)
    unit, x_unit = parts.problem.unit(parts.problem.response), parts.problem.unit(parts.problem.focus)
    where = f"{parts.y}, mean at {parts.x} {b}{' ' + said(x_unit) if x_unit else ''} against {a}: "
    unit = f" {said(unit)}" if unit else ""
    if not parts.bounded:
        return _printed(where, ("effect:+.4g",), unit)
    low, high = ("effect - half:.4g",), ("effect + half:.4g",)
    return _printed(where, ("effect:+.4g",), f"{unit} ({parts.percent} ", low, " to ", high, ")")


def _printed(where: str, *numbers: str | tuple[str]) -> list[str]:
    """A print of one text, on two lines where names are long."""
    line = f"print({fstring(where, *numbers)})"
    return [line] if len(line) <= WIDTH else [f"print({literal(where)}", f"    {fstring(*numbers)})"]
