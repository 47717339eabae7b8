"""The functions of a script: the model's columns, its design, the way back to the response, predictions."""

from __future__ import annotations

import re

from batten.emit.parts import Parts
from batten.emit.powers import power_functions
from batten.emit.text import WIDTH, docstring, noted, wrapped
from batten.emit.weights import root_function, root_of

__all__ = ["functions", "undo"]

#: a penalised curve's further columns, as entries of a dict
BENDS = '**{f"s{j}": bend(x, j) for j in range(1, len(KNOTS) - 1)}'
#: lines of a function that needs no blank line above it
SHORT = 3


def functions(parts: Parts) -> list[str]:
    """All functions; those of two or three lines stand under the one before, without a blank line."""
    blocks = [*_helpers(parts), _columns(parts), _design(parts), *_back(parts), *root_function(parts)]
    blocks += [] if parts.covariates.unwritten else [_predict(parts)]
    lines = blocks[0]
    for block in blocks[1:]:
        lines = [*lines, *([] if len(block) <= SHORT else [""]), *block]
    return lines


def undo(parts: Parts, argument: str) -> str:
    """Source of the way back to units of y."""
    if parts.kind == "identity":
        return argument
    if parts.kind == "share":
        return f"expit({argument})"
    if parts.kind != "square" and parts.left.inverse != "np.exp(z)":
        return f"undo({argument})"
    return re.sub(r"\bz\b", lambda _: argument, parts.left.inverse)


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
    lines = []
    if _warns(parts) or c.guarded:
        lines = ['@np.errstate(all="ignore")  # what a column cannot take becomes missing']
    lines += [
        f"def columns(frame, y=0.0{arguments}):",
        *docstring("The model's columns under plain names; an unknown level is missing, not the reference level."),
    ]
    if parts.shape.check is not None:
        condition, words = parts.shape.check
        lines += noted(f"    x = {c.focus}.where(lambda x: {condition})", words)
    else:
        lines += wrapped(f"    x = {c.focus}", 4)
    lines += [line for source in c.lines for line in wrapped(f"    {source}", 4)]
    shape = [f'"{name}": {source}' for name, source in parts.shape.columns if name != "x"]
    shape = [BENDS] if parts.smooth else shape
    entries = ", ".join(['"y": y', '"x": x', *shape, *(f'"{name}": {source}' for name, source in c.entries)])
    clean = "replace([np.inf, -np.inf], np.nan).reset_index(drop=True)"
    return [*lines, *_returned(f"pd.DataFrame({{{entries}}})", clean)]


def _returned(table: str, then: str) -> list[str]:
    """Return a table after a last step, in one statement where that saves a line."""
    apart = [*wrapped(f"    found = {table}", 4), *wrapped(f"    return found.{then}", 4)]
    together = wrapped(f"    return {table}.{then}", 4)
    return together if len(together) < len(apart) else apart


def _warns(parts: Parts) -> bool:
    """Whether numpy would warn at some values of x; pandas' own arithmetic does not."""
    return any("np.exp" in source for _, source in parts.shape.columns)


def _design(parts: Parts) -> list[str]:
    """design(), where constants of the shape were searched with a column for each of them."""
    if not parts.searched:
        return ["def design(frame):", *noted(f"    return {_exog(parts, '')}", "gaps keep their place")]
    names, columns = parts.searched, _moves(parts)
    given, places = _places(parts)
    at = "".join(f", {name}={name} + {letter}" for name, letter in zip(names, given, strict=True))
    design = [
        *wrapped(f"    X, *moved = ({_exog(parts, at)} for {', '.join(given)} in ({places}))", 4),
        *wrapped(f"    return np.column_stack([X, {', '.join(columns)}])", 4),
    ]
    why = f"  # last: how the fit moves with {' and '.join(names)}"
    if len(design[-1] + why) <= WIDTH:
        return ["def design(frame):", *design[:-1], design[-1] + why]
    text = f"The model's design, then how the fit moves with {' and '.join(names)}, estimated with the rest."
    return ["def design(frame):", *docstring(text), *design]


def _places(parts: Parts) -> tuple[str, str]:
    """Letters for steps in the searched constants, and the steps: none, then each to both sides, at corners to one."""
    count, signs = len(parts.searched), ("",) if parts.est.shape.corners else ("", "-")
    if count == 1:
        return "d", ", ".join(["0", *(sign + parts.steps[0] for sign in signs)])
    ways = [["0"] * count]
    ways += [
        [sign + step if i == j else "0" for i in range(count)] for j, step in enumerate(parts.steps) for sign in signs
    ]
    return "cd", ", ".join(f"({', '.join(way)})" for way in ways)


def _moves(parts: Parts) -> list[str]:
    """Sources of the fit's slopes in the searched constants."""
    if parts.est.shape.corners:
        return [f"(moved[{j}] - X) @ fit.params / {step}" for j, step in enumerate(parts.steps)]
    pairs = enumerate(parts.steps)
    return [f"(moved[{2 * j}] - moved[{2 * j + 1}]) @ fit.params / 2{step[1:]}" for j, step in pairs]


def _exog(parts: Parts, given: str) -> str:
    """Source of the design at the rows of `frame` by the model's own formula."""
    response = "" if parts.response == "y" else f".assign({parts.response}=0.0)"
    return f"smf.ols(MODEL, columns(frame{given}).fillna(rows.iloc[0]){response}).exog"


# --- the way back -----------------------------------------------------------------------------------------------------


def _back(parts: Parts) -> list[list[str]]:
    """undo() and mean(), where the way back is more than exp()."""
    if parts.power:
        return [*power_functions(parts), _mean_of_pairs(parts)]
    blocks = []
    if undo(parts, "z") == "undo(z)" and parts.left.inverse != "undo(z)":
        blocks.append(["def undo(z):", *wrapped(f"    return {parts.left.inverse}", 4)])
    if parts.kind == "square":
        blocks.append(_mean_of_squares(parts))
    elif parts.kind == "pairs":
        blocks.append(_mean_of_pairs(parts))
    return blocks


def _mean_of_squares(parts: Parts) -> list[str]:
    lines = [
        "def mean(eta, e):",
        *docstring(f"Mean {parts.y} at fitted roots eta: squares over the errors e, a root below 0 counting as 0."),
    ]
    if parts.few_pairs:
        return [*lines, "    return (np.maximum(np.add.outer(eta, e), 0) ** 2).mean(axis=1)"]
    return [
        *lines,
        "    sums = [np.append(0, np.cumsum(np.sort(e)[::-1] ** k)) for k in range(3)]",
        "    n, one, two = (total[np.searchsorted(np.sort(-e), eta)] for total in sums)  # over the roots above 0",
        "    return (n * eta**2 + 2 * eta * one + two) / len(e)",
    ]


def _mean_of_pairs(parts: Parts) -> list[str]:
    extra, given, args = (", v=LAMBDA", ", v", "(e, v)") if parts.power else ("", "", "(e,)")
    lines = [
        f"def mean(eta, e{extra}):",
        *docstring(f"Mean {parts.y} at fitted values eta, averaged over the errors e (Duan 1983)."),
    ]
    if parts.few_pairs:
        return [*lines, f"    return undo(np.add.outer(eta, e){given}).mean(axis=1)"]
    return [
        *lines,
        "    if len(eta) <= 200:",
        f"        return undo(np.add.outer(eta, e){given}).mean(axis=1)",
        "    ends = [np.nanmin(eta) - 1e-9, np.nanmax(eta) + 1e-9]  # many eta by a polynomial right to ten digits",
        f"    return np.polynomial.Chebyshev.interpolate(mean, 60, ends, args={args})(eta)",
    ]


# --- predictions ------------------------------------------------------------------------------------------------------


def _predict(parts: Parts) -> list[str]:
    row = "row of average weight" if parts.weigher else "row from a new cluster" if parts.clustered else "row"
    text = f"{parts.y} of one further {row}: median, mean, {parts.percent} interval{_way(parts)}."
    known = "columns(frame).notna().all(axis=1)"
    limits = _limits(parts)
    lines = [f"    N, known = design(frame), {known}"]
    kept = f"known & {limits}" if limits else "known"
    if limits and parts.kind == "pairs" and not parts.few_pairs:
        lines = ["    N = design(frame)", f"    known = {known} & {limits}"]
        lines += ["    N = np.where(known.to_numpy()[:, None], N, np.nan)"]
        kept = "known"
    return [
        "def predict(frame):",
        *docstring(text),
        *lines,
        *(_new_row_of_link(parts) if parts.link else _new_row(parts)),
        *_returned(f"pd.DataFrame({{{_targets(parts)}}})", f"where({kept}).set_axis(frame.index)"),
    ]


def _way(parts: Parts) -> str:
    """How the interval is made."""
    if not parts.ordered:
        return " for normal errors"
    return " by jackknife+" + ("" if parts.weigher or parts.clustered else " (errors as seen, not as if normal)")


def _limits(parts: Parts) -> str:
    """Condition for a fitted value that can be brought back, or ""."""
    if parts.link:
        return ""
    low, high = parts.est.scale.limits(parts.est.c)
    eta = "N @ b"
    above = f"({eta} > {low:.17g})" if low > -float("inf") else ""
    below = f"({eta} < {high:.17g})" if high < float("inf") else ""
    return " & ".join(part for part in (above, below) if part)


def _targets(parts: Parts) -> str:
    """Median, mean and the ends of the interval."""
    if parts.link:
        ratio = "1 + v * (y / mu - 1)" if parts.weigher else "y / mu"
        return f'"median": mean * np.median({ratio}), "mean": mean, "low": low, "high": high'
    eta = "N @ b"
    mean = {"identity": eta, "exp": f"np.exp({eta}) * smear"}.get(parts.kind, f"mean({eta}, e)")
    return f'"median": {undo(parts, f"{eta} + np.median(e)")}, "mean": {mean}, "low": low, "high": high'


def _new_row(parts: Parts) -> list[str]:
    """low and high for further rows at the design N."""
    first, last = parts.rank, -1 - parts.rank
    lines = []
    if not parts.ordered:
        own = "1"
        if parts.est.spread is not None:
            lines, own = [f"    roots = {root_of('N')}"], "roots**-2"
        half = f"{parts.row_t_name} * np.sqrt(s2 * ({own} + (np.linalg.solve(R.T, N.T) ** 2).sum(axis=0)))"
        lines.append(f"    half = {half}")
        ends = "np.array([N @ b - half, N @ b + half])"
    elif parts.many:
        ends = f"np.add.outer(np.sort(out)[[{first}, {last}]], N @ b)"
        if parts.est.spread is not None:
            ends = f"N @ b + np.sort(out)[[{first}, {last}]][:, None] / {root_of('N')}"
    else:
        without = "without[:, :-2]" if parts.power else "without"
        if parts.clustered:
            without = "without[cluster, :-2]" if parts.power else "without[cluster]"
        each = "np.sort(WITHOUT @ row + out)[[FIRST, LAST]] for row in N"
        if parts.est.spread is not None:
            lines = [f"    roots = {root_of('N')}"]
            each = "np.sort(WITHOUT @ row + out / r)[[FIRST, LAST]] for row, r in zip(N, roots, strict=True)"
        each = each.replace("WITHOUT", without).replace("FIRST", str(first)).replace("LAST", str(last))
        ends = f"np.transpose([{each}])"
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
    without = "without[cluster]" if parts.clustered else "without"
    value = f"{undo(parts, f'{without} @ row')} {'+' if share else '*'} out"
    value = f"np.clip({value}, 0, 1)" if share else value
    return [mean, f"    low, high = np.transpose([np.sort({value})[[{first}, {last}]] for row in N])"]
