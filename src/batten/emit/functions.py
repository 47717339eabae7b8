"""The functions of a script: the model's columns, its design, the way back to the response, predictions."""

from __future__ import annotations

import re

from batten.emit.parts import Parts
from batten.emit.powers import power_functions
from batten.emit.text import docstring, noted, wrapped

__all__ = ["design_call", "functions", "undo"]


def functions(parts: Parts) -> list[str]:
    """All functions, a blank line between them."""
    blocks = [*_helpers(parts), _columns(parts), _design(parts), *_jacobian(parts), *_means(parts)]
    blocks += [] if parts.covariates.unwritten else [_predict(parts)]
    return [line for block in blocks for line in ["", *block]][1:]


def undo(parts: Parts, argument: str) -> str:
    """Source of the way back to units of y."""
    if parts.kind == "identity":
        return argument
    if parts.kind != "square" and parts.left.inverse != "np.exp(z)":
        return f"undo({argument})"
    return re.sub(r"\bz\b", argument, parts.left.inverse)


def design_call(parts: Parts) -> str:
    """The function that gives design rows, searched constants included."""
    return "jacobian" if parts.searched else "design"


def _helpers(parts: Parts) -> list[list[str]]:
    sources = [parts.shape.helper, *parts.covariates.helpers, *([] if parts.power else [parts.left.helper])]
    return [block.splitlines() for source in sources for block in _blocks(source)]


def _blocks(source: str) -> list[str]:
    """The functions of a helper, apart."""
    return [block for block in re.split(r"\n{2,}(?=def )", source.strip()) if block]


# --- columns and design -----------------------------------------------------------------------------------------------


def _columns(parts: Parts) -> list[str]:
    c = parts.covariates
    arguments = "".join(f", {name}={name}" for name in parts.searched)
    guarded = _overflows(parts) or c.guarded
    focus = _finite(c.focus) if parts.shape.helper and not guarded else c.focus
    lines = ['@np.errstate(all="ignore")  # what a column cannot take becomes missing'] if guarded else []
    lines += [
        f"def columns(frame{arguments}):",
        *docstring("The model's columns under plain names; an unknown level is missing, not the reference level."),
        *wrapped(f"    x = {focus}", 4),
    ]
    if parts.shape.check is not None:
        condition, words = parts.shape.check
        lines += noted(f"    x = np.where({condition}, x, np.nan)", words)
    lines += [line for source in c.lines for line in wrapped(f"    {source}", 4)]
    shape = [(name, source) for name, source in parts.shape.columns if name != "x"]
    entries = ", ".join(f'"{name}": {source}' for name, source in [("x", "x"), *shape, *c.entries])
    return [*lines, *wrapped(f"    return pd.DataFrame({{{entries}}})", 4)]


def _finite(source: str) -> str:
    """A series without its infinite values, which splines and groups cannot take quietly."""
    return source.removesuffix(".to_numpy()") + ".replace([np.inf, -np.inf], np.nan).to_numpy()"


def _overflows(parts: Parts) -> bool:
    """Whether some values of x would make numpy warn, far outside the data or at zero."""
    sources = " ".join(source for _, source in parts.shape.columns)
    return bool(parts.searched) or any(sign in sources for sign in ("exp", "**", "1 /"))


def _design(parts: Parts) -> list[str]:
    more, given = (", **constants", ", **constants") if parts.searched else ("", "")
    return [
        f"def design(frame{more}):",
        *docstring("The design at the rows of `frame`, by the model's own formula; missing where a column is."),
        f"    new = columns(frame{given}).replace([np.inf, -np.inf], np.nan)",
        *noted(
            f"    X = smf.ols(MODEL, new.fillna(rows.iloc[0]).assign({parts.response}=0.0)).exog",
            "gaps keep their place",
        ),
        "    return np.where(new.notna().all(axis=1).to_numpy()[:, None], X, np.nan)",
    ]


def _jacobian(parts: Parts) -> list[list[str]]:
    """Design, then how the fitted value moves with each searched constant."""
    if not parts.searched:
        return []
    names = " and ".join(parts.searched)
    text = f"The design, then how the fitted value moves with {names}, estimated as the coefficients are."
    lines, moves = ["def jacobian(frame):", *docstring(text)], []
    for name, step in zip(parts.searched, parts.steps, strict=True):
        if parts.est.shape.corners:
            moves.append(f"(design(frame, {name}={name} + STEP) - design(frame)) @ fit.params / STEP")
            continue
        pair = f"[design(frame, {name}={name} + d) @ fit.params for d in (1{step}, -1{step})]"
        lines.append(f"    {name.lower()} = {pair}")
        moves.append(f"({name.lower()}[0] - {name.lower()}[1]) / 2{step}")
    return [[*lines, *wrapped(f"    return np.column_stack([design(frame), {', '.join(moves)}])", 4)]]


# --- the way back -----------------------------------------------------------------------------------------------------


def _means(parts: Parts) -> list[list[str]]:
    """undo() and mean(), where the way back is more than exp()."""
    if parts.power:
        return [*power_functions(parts), _mean_of_pairs(parts)]
    found = []
    if undo(parts, "z") == "undo(z)" and parts.left.inverse != "undo(z)":
        inverse = parts.left.inverse
        found.append(["def undo(z):", *docstring(f"Back to {parts.y}."), *wrapped(f"    return {inverse}", 4)])
    if parts.kind == "square":
        found.append(_mean_of_squares(parts))
    elif parts.kind == "pairs":
        found.append(_mean_of_pairs(parts))
    return found


def _mean_of_squares(parts: Parts) -> list[str]:
    text = f"Mean {parts.y} at fitted roots eta: squares averaged over the errors e, a root below 0 counting as 0."
    return [
        "def mean(eta, e):",
        *docstring(text),
        "    e = np.sort(e)[::-1]",
        "    above = np.searchsorted(-e, eta)  # how many errors leave the root above 0",
        "    one, two = (np.append(0, np.cumsum(e**k))[above] for k in (1, 2))",
        "    return (above * eta**2 + 2 * eta * one + two) / len(e)",
    ]


def _mean_of_pairs(parts: Parts) -> list[str]:
    extra, given, args = (", LAMBDA=LAMBDA", ", LAMBDA", "(e, LAMBDA)") if parts.power else ("", "", "(e,)")
    exact = f"np.array([undo(v + e{given}).mean() for v in eta])"
    lines = [
        f"def mean(eta, e{extra}):",
        *docstring(f"Mean {parts.y} at fitted values eta, averaged over the errors e (Duan 1983)."),
    ]
    if parts.single or parts.est.n <= 200:
        return [*lines, f"    return {exact}"]
    return [
        *lines,
        "    if len(eta) <= 200:",
        f"        return {exact}",
        "    ends = [np.nanmin(eta) - 1e-9, np.nanmax(eta) + 1e-9]  # many eta by a polynomial right to ten digits",
        f"    return np.polynomial.Chebyshev.interpolate(mean, 60, ends, args={args})(eta)",
    ]


# --- predictions ------------------------------------------------------------------------------------------------------


def _predict(parts: Parts) -> list[str]:
    limits = _limits(parts)
    text = f"{parts.y} of one further row: median, mean, {parts.percent} interval{_way(parts)}."
    lost = f"    N = np.where({limits}[:, None], N, np.nan)"
    return [
        "def predict(frame):",
        *docstring(text),
        f"    N = {design_call(parts)}(frame)",
        *(noted(lost, f"beyond, there is no {parts.y}") if limits else []),
        *(_new_row_of_link(parts) if parts.link else _new_row(parts)),
        *wrapped(f"    return pd.DataFrame({{{_targets(parts)}}}, index=frame.index)", 4),
    ]


def _way(parts: Parts) -> str:
    """How the interval is made."""
    return " by jackknife+ (errors as seen, none assumed normal)" if parts.ordered else " for normal errors"


def _limits(parts: Parts) -> str:
    """Condition for a fitted value that can be brought back, or ""."""
    if parts.link:
        return ""
    low, high = parts.est.scale.limits(parts.est.c)
    eta = f"N @ {_b(parts)}"
    above = f"({eta} > {low:.17g})" if low > -float("inf") else ""
    below = f"({eta} < {high:.17g})" if high < float("inf") else ""
    both = " & ".join(part for part in (above, below) if part)
    return f"({both})" if above and below else both


def _b(parts: Parts) -> str:
    return "b[:-1]" if parts.power else "b"


def _targets(parts: Parts) -> str:
    """Median, mean and the ends of the interval."""
    if parts.link:
        return '"median": mean * np.median(y / mu), "mean": mean, "low": low, "high": high'
    median = undo(parts, "eta + np.median(e)")
    mean = {"identity": "eta", "exp": "np.exp(eta) * smear"}.get(parts.kind, "mean(eta, e)")
    return f'"median": {median}, "mean": {mean}, "low": low, "high": high'


def _new_row(parts: Parts) -> list[str]:
    """eta, low and high for further rows at the design N."""
    first, last = parts.rank, -1 - parts.rank
    eta, tail = f"N @ {_b(parts)}", f"{50 - 50 * parts.question.level:.10g}% lie beyond each end"
    if not parts.ordered:
        half = f"{parts.t_name} * np.sqrt(s2 * (1 + (np.linalg.solve(R.T, N.T) ** 2).sum(axis=0)))"
        lines = [f"    eta, half = {eta}, {half}"]
        ends = "np.array([eta - half, eta + half])"
    elif parts.many:
        lines = noted(f"    eta, spread = {eta}, np.sort(out)[[{first}, {last}]]", tail)
        ends = "np.add.outer(spread, eta)"
    else:
        without = "without[:, :-1]" if parts.power else "without"
        lines = noted(f"    eta, ends = {eta}, [np.sort({without} @ row + out)[[{first}, {last}]] for row in N]", tail)
        ends = "np.transpose(ends)"
    back = undo(parts, ends)
    falls = bool((parts.est.scale.inverse_slope(parts.est.eta[:1], parts.est.c) < 0).all())
    return [*lines, *wrapped(f"    low, high = {f'np.sort({back}, axis=0)' if falls else back}", 4)]


def _new_row_of_link(parts: Parts) -> list[str]:
    """Ratios to the fit without the row itself; for shares differences, kept between 0 and 1."""
    first, last = parts.rank, -1 - parts.rank
    share = parts.kind == "share"
    mean = f"    mean = {undo(parts, 'N @ b')}"
    if parts.many:
        how = "np.add.outer" if share else "np.multiply.outer"
        ends = f"{how}(np.sort(out)[[{first}, {last}]], mean)"
        return [mean, f"    low, high = {f'np.clip({ends}, 0, 1)' if share else ends}"]
    value = f"{undo(parts, 'without @ row')} {'+' if share else '*'} out"
    value = f"np.clip({value}, 0, 1)" if share else value
    return [mean, f"    low, high = np.transpose([np.sort({value})[[{first}, {last}]] for row in N])"]
