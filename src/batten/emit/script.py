"""A standalone script of one remedy: fits, predicts, answers the standing question, and checks itself."""

from __future__ import annotations

import sys

import numpy as np

from batten.effects.numbers import counted
from batten.emit.fitting import fitting
from batten.emit.functions import functions
from batten.emit.held import held_at
from batten.emit.parts import Parts, read_parts
from batten.emit.renaming import without_names
from batten.emit.smoothing import smooth_constants
from batten.emit.span import span
from batten.emit.text import PLACE, WIDTH, comment, constant, literal, number, rounded, said, wrapped
from batten.emit.weights import settled, spread_constants
from batten.fit.estimate import Estimate
from batten.fit.question import Question
from batten.frame.problem import Problem

__all__ = ["script"]

_FIXED = "as if this remedy had been fixed in advance"


def script(problem: Problem, question: Question, estimate: Estimate) -> str:
    """Source that runs on numpy, pandas, statsmodels and matplotlib where a data frame of the user's name exists.

    It ends with asserts against the numbers on the screen, so a script that runs through gives the same answer.
    """
    parts = read_parts(problem, question, estimate)
    sections = [
        _header(parts) + _imports(parts),
        _constants(parts),
        functions(parts),
        fitting(parts) + span(parts),
        [] if parts.covariates.unwritten else _picture(parts),
        _checks(parts),
    ]
    text = "\n\n".join("\n".join(lines) for lines in sections if lines) + "\n"
    return _named(text, parts)


def _header(parts: Parts) -> list[str]:
    p, remedy = parts.problem, parts.est.remedy
    words = remedy.words(parts.y, parts.x)
    kind = "robust (HC3)" if parts.robust else "of one size for all rows"
    kind = f"by clusters of {said(parts.problem.beside.cluster)} (CR3)" if parts.clustered and parts.robust else kind
    kind += f", rows weighted by {said(parts.weigher)}" if parts.weigher else ""
    kind += "" if parts.question.planned == remedy.key or _uses_t(parts) else f", {_FIXED}"
    lines = [
        f'{said(p.formula, 200)}, remedy "{remedy.key}": {words}.',
        f"`{parts.frame}` (pandas): {_rows_words(parts)} Errors: {kind}.",
    ]
    for label in parts.covariates.unwritten:
        lines.append(f"{label} learns from the rows it is given, so this script predicts no further rows.")
    if parts.covariates.external:
        lines.append(f"Needs {', '.join(parts.covariates.external)} as defined where the formula was written.")
    return comment(" ".join(lines))


def _rows_words(parts: Parts) -> str:
    p = parts.problem
    left = p.left_out["why"].astype(str)
    total = p.stored + len(left)
    often = "" if p.times is None else f", each as often as {said(p.beside.weights)} says ({parts.est.n} in all)"
    if not len(left):
        return f"all {total} rows used{often}."
    counts = left.value_counts()
    told = ", ".join(f"{count} {said(why)}" for why, count in counts.head(3).items())
    more = f" and {len(counts) - 3} other reasons" if len(counts) > 3 else ""
    return f"{p.stored} of {total} rows used{often}; left out: {told}{more}."


def _imports(parts: Parts) -> list[str]:
    plain = ["import numpy as np", "import pandas as pd"]
    plain += ["import statsmodels.formula.api as smf"]
    plain += ["import warnings"] if parts.kind == "invlink" else []
    plain += [line for line in parts.covariates.imports if line.startswith("import ")]
    merged: dict[str, list[str]] = {}
    own = ["from statsmodels.genmod import families"] if parts.link else []
    own += ["from scipy.special import expit"] if parts.kind == "share" else []
    own += ["from statsmodels.tools.numdiff import approx_fprime_cs, approx_hess_cs"] if parts.power else []
    for line in [*parts.covariates.imports, *own]:
        if line.startswith("from "):
            _, module, _, names = line.split(maxsplit=3)
            merged.setdefault(module, []).append(names)
    named = [f"from {module} import {', '.join(sorted(names))}" for module, names in sorted(merged.items())]
    plain.sort(key=lambda line: line.split()[1])
    python = [line for line in plain if line.split()[1] in sys.stdlib_module_names]
    return [*python, *[""] * bool(python), *(line for line in plain if line not in python), *named]


def _constants(parts: Parts) -> list[str]:
    a, b = parts.question.span
    unit = parts.problem.unit(parts.problem.focus)
    own = *parts.shape.constants, *parts.left.constants, *spread_constants(parts), *parts.covariates.constants
    lines = [line for one in own for line in constant(*one)]
    lines += smooth_constants(parts) if parts.smooth else []
    if not parts.numbers.span.note:
        meaning = f"the question: rows at {parts.x} {b:.6g}{' ' + said(unit) if unit else ''} against rows at {a:.6g}"
        lines += constant("SPAN", f"({number(a)}, {number(b)})", meaning)
    meaning = f"t quantile for {parts.percent} on {counted(parts.est.df_error)} degrees of freedom"
    meaning += "" if parts.question.planned == parts.est.remedy.key else f", {_FIXED}"
    if _uses_t(parts):
        lines += constant(parts.t_name, number(parts.t_quantile), meaning)
    if not parts.ordered and parts.row_t_name != parts.t_name:
        meaning = f"for further rows, on {counted(parts.est.df_residual)} degrees of freedom"
        lines += constant(parts.row_t_name, number(parts.row_t_quantile), meaning)
    return [*lines, *_model(parts)]


def _uses_t(parts: Parts) -> bool:
    return parts.bounded or not parts.ordered


def _model(parts: Parts) -> list[str]:
    c = parts.covariates
    columns = ("x", "{BENDS}") if parts.smooth else parts.columns
    shape = columns[0] if len(columns) == 1 else f"({' + '.join(columns)})"
    crossed = [m for m in c.modifiers if m]
    if c.modifiers == ["", *crossed] and len(crossed) == 1 and crossed[0] in c.terms:
        terms = [f"{shape} * {crossed[0]}", *(t for t in c.terms if t != crossed[0])]
    else:
        terms = [f"{shape}:{m}" if m else " + ".join(columns) for m in c.modifiers] + c.terms
    right = " + ".join([*(() if c.intercept else ("0",)), *terms])
    return _long_string("MODEL", f"{parts.response} ~ {right}", "f" * parts.smooth)


def _long_string(name: str, text: str, mark: str) -> list[str]:
    """A string constant, over several lines where it must. mark: "f" where it holds fields."""
    if len(f"{name} = {mark}{literal(text)}") <= WIDTH:
        return [f"{name} = {mark}{literal(text)}"]
    pieces, line = [], ""
    for word in text.split(" "):
        if len(line) + len(word) > 105:
            pieces.append(line)
            line = ""
        line += f"{word} "
    pieces.append(line.rstrip())
    return [f"{name} = (", *(f"    {mark}{literal(piece)}" for piece in pieces), ")"]


# --- picture ----------------------------------------------------------------------------------------------------------


def _picture(parts: Parts) -> list[str]:
    p = parts.problem
    every = max(1, parts.est.n // 10_000)
    some = f"[::{every}]" if every > 1 else ""
    units = [said(p.unit(p.focus)), said(p.unit(p.response))]
    names = [f"{name} ({unit})" if unit else name for name, unit in zip((parts.x, parts.y), units, strict=True)]
    x_label, y_label = (literal(name.replace("$", r"\$")) for name in names)
    labels = f'c="0.6", xlabel={x_label}, ylabel={y_label}'
    title = f"{parts.percent} of rows like the first" if p.covariates else f"{parts.percent} of further rows"
    others = "  # covariates as in the first row used" if p.covariates else ""
    return [
        f'at = np.linspace(rows["x"].min(), rows["x"].max(), 200){others}',
        *wrapped(f"curve = predict(used.iloc[[0] * 200].assign({held_at(parts, 'at')})).set_axis(at)"),
        *wrapped(f'ax = rows{some}.plot.scatter("x", "y", {labels}, title="{title}")'),
        'curve[["mean", "low", "high"]].plot(style=["C0-", "C1:", "C1:"], ax=ax)',
    ]


# --- checks -----------------------------------------------------------------------------------------------------------


def _checks(parts: Parts) -> list[str]:
    n = parts.numbers
    got, want = ["len(rows)"], [str(n.rows)]
    if len(n.coef) and not parts.delicate:
        names = [*(parts.columns if len(n.coef) > len(parts.searched) else ()), *parts.searched]
        got.append(f"*np.ravel(table.loc[{literal(names)}])")
        want += [rounded(v) for pair in zip(n.coef, n.error, strict=True) for v in pair]
    if n.edf is not None:
        got.append("edf")
        want.append(rounded(n.edf))
    if n.smear is not None:
        got.append("smear")
        want.append(rounded(n.smear))
    if not n.span.note:
        got.append("effect")
        want.append(rounded(n.span.difference.estimate))
    if parts.bounded:
        got.append("half")
        want.append(rounded((n.span.difference.high - n.span.difference.low) / 2))
    if not parts.covariates.unwritten:
        got.append("*predict(used.tail(1)).iloc[0]")
        want += [rounded(v) for v in n.prediction]
    message = literal(f"`{parts.frame}` differs from the rows of this script")
    return [
        *wrapped(f"got = [{', '.join(got)}]"),
        *wrapped(f"want = [{', '.join(want)}]"),
        *wrapped(f"np.testing.assert_allclose(got, want, rtol=1e-6{_floor(parts)}, err_msg={message})"),
        *settled(parts),
    ]


def _floor(parts: Parts) -> str:
    """A perfect fit leaves only rounding errors, which no two programs share."""
    est = parts.est
    size = max(float(np.abs(est.rows.y).max()), float(np.abs(est.coef).max()))
    return f", atol={1e-9 * size:.0e}" if est.sigma <= 1e-9 * float(np.ptp(est.z)) else ""


# --- names ------------------------------------------------------------------------------------------------------------


def _named(text: str, parts: Parts) -> str:
    """Put in the user's names; those of the script that the frame or a function of the user's already has change."""
    external = parts.covariates.external
    text = without_names(text, {parts.problem.frame_name, *external})
    for name in external:
        text = text.replace(PLACE + name, name)
    return text.replace(parts.frame, parts.problem.frame_name)
