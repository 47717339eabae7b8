"""The fit of a script: rows, statsmodels, the table of coefficients, coefficients and errors without each row."""

from __future__ import annotations

from batten.emit.covariates import read_numbers
from batten.emit.functions import undo
from batten.emit.parts import Parts
from batten.emit.powers import power_moves
from batten.emit.smoothing import smooth_fit
from batten.emit.text import WIDTH, literal, noted, wrapped
from batten.emit.weights import beside_lines, clusters_left_out, data_lines, learned_fit

__all__ = ["fitting"]

#: family, square root of the working weight, residual in units of its own spread (both in mu)
_LINKS = {
    "loglink y": ("Poisson()", "np.sqrt(mu)", "(y - mu) / np.sqrt(mu)"),
    "loglink-gamma y": ("Gamma(families.links.Log())", "", "y / mu - 1"),
    "loglink-gaussian y": ("Gaussian(families.links.Log())", "mu", "y - mu"),
    "invlink-gamma y": ("Gamma()", "mu", "1 - y / mu"),
    "share y": ("Binomial()", "np.sqrt(mu * (1 - mu))", "(y - mu) / np.sqrt(mu * (1 - mu))"),
}


def fitting(parts: Parts) -> list[str]:
    """From the frame to fitted coefficients and what their uncertainty needs."""
    return [*_rows(parts), *_model_fit(parts)]


def _model_fit(parts: Parts) -> list[str]:
    if parts.link:
        return _glm(parts)
    return smooth_fit(parts) if parts.smooth else _ols(parts)


def _chosen(parts: Parts) -> str:
    """The expression given with --rows, or ""."""
    for why in parts.problem.left_out["why"].unique():
        found = str(why).partition("not in --rows ")[2]
        if found:
            return found
    return ""


def _rows(parts: Parts) -> list[str]:
    lines = data_lines(parts, _chosen(parts))
    data = "data" if lines else parts.frame
    response, exposure = parts.problem.response_column or parts.problem.response, parts.problem.beside.exposure
    y = read_numbers(response, data, text=parts.as_text(response))
    if exposure is not None:
        y += f" / pd.to_numeric({data}[{literal(exposure)}])"
    lines += wrapped(f"rows = columns({data}, {y}).dropna()")
    lines.append(f'used, y = {data}.iloc[rows.index], rows["y"].to_numpy()')
    if parts.left.check is not None:
        condition, words = parts.left.check
        lines += wrapped(f"assert ({condition}).all(), {literal(words)}")
    return [*lines, *beside_lines(parts)]


# --- least squares ----------------------------------------------------------------------------------------------------


def _ols(parts: Parts) -> list[str]:
    lines = ["m = np.median(y)"] if parts.power else []
    lines += _fit(parts)
    w = "w" if parts.weighted else ""
    values = {
        "X": f"fit.model.{w}exog" if not parts.searched else f"design(used){' * v[:, None]' if w else ''}",
        "z": f"fit.model.{w}endog",
        "e": f"fit.{w}resid.to_numpy()",
        "b": _coefficients(parts),
    }
    names = ["X", "z", "e", "b"]
    direct = parts.bounded and not parts.deletes and (parts.triangle or not parts.uses_without)
    if parts.kind == "identity" or (parts.kind == "exp" and direct):
        names.remove("z")
    code = f"{', '.join(names)} = {', '.join(values[name] for name in names)}"
    zero = "0: linear around what was searched"
    lines += [f"{code}  # {zero}"] if parts.searched and len(code) + len(zero) + 4 <= WIDTH else wrapped(code)
    if parts.kind == "exp":
        lines.append("smear = np.exp(e).mean()  # exp() of a fitted log is a median; this makes it a mean (Duan 1983)")
    if parts.needs_s2:
        lines.append(f"s2 = e @ e / {parts.est.df_residual}")
    lines += _deletions(parts)
    lines += _table(parts)
    if not parts.power:
        return lines
    if parts.clustered:
        return [*lines, *power_moves(parts, _BY_LEVERAGE[parts.alone])]
    weight = "* np.where(np.abs(out) < 1e8 * np.abs(e), out / e, 0)" if parts.alone else "* out / e"
    return [*lines, *power_moves(parts, weight)]


#: what leaving out a row makes of its score; nothing where it owns a coefficient
_BY_LEVERAGE = {False: "/ (1 - h)", True: "* np.where(h < 1 - 1e-8, 1 / (1 - h), 0)"}


def _fit(parts: Parts) -> list[str]:
    source = "bent(LAMBDA)" if parts.power else parts.left.columns[0][1]
    response = "" if parts.kind == "identity" else f".assign({parts.response}={source})"
    fit = f"fit = smf.ols(MODEL, rows{response})"
    if parts.weigher:
        fit = f"fit = smf.wls(MODEL, rows{response}, weights=v**2)"
    if parts.est.spread is not None:
        return learned_fit(parts)
    if parts.uneven:
        return noted(f'{fit}.fit(method="qr")', "columns differ much in size: QR keeps their digits")
    if parts.robust and not parts.own_table:
        code = f'{fit}.fit(cov_type="HC3", use_t=True)'
        why = "  # errors may differ in size"
        return [code + (why if len(code + why) <= WIDTH else "")]
    return wrapped(f"{fit}.fit()")


def _coefficients(parts: Parts) -> str:
    """Coefficients; those of searched constants are 0, since the fit is linear around what was found."""
    if not parts.searched:
        return "fit.params.to_numpy()"
    zeros = ", ".join(["0.0"] * len(parts.searched))
    return f"np.append(fit.params, {zeros if len(parts.searched) == 1 else f'[{zeros}]'})"


def _deletions(parts: Parts) -> list[str]:
    """without: coefficients with each row left out; out: its error around that fit."""
    out, without = "# each row's error around the fit without it", "# coefficients with each row left out"
    if parts.clustered:
        return _clusters(parts)
    if parts.power:
        made = ["Q, R = np.linalg.qr(X)", f"out = e / (1 - {parts.leverages})"]
        lines = made if parts.triangle else ["out = fit.get_influence().resid_press"]
        return [*lines[:-1], f"{lines[-1]}  {out}"]
    if parts.triangle:
        lines = ["Q, R = np.linalg.qr(X)"]
        if not parts.robust and parts.kind in ("identity", "exp"):
            return ['R = np.linalg.qr(X, mode="r")']
        if parts.ordered or parts.uses_without:
            lines.append(f"out = e / (1 - {parts.leverages})  {out}")
        if parts.uses_without:
            lines.append(f"without = b - np.linalg.solve(R, Q.T * out).T  {without}")
        return lines
    if not parts.uses_without:
        return [f"out = fit.get_influence().resid_press  {out}"]
    y = "y" if parts.kind == "identity" else "z"
    if parts.searched:
        fit = f"np.linalg.lstsq(np.delete(X, i, axis=0), np.delete({y}, i), rcond=None)[0]"
        lines = wrapped(f"without = np.array([{fit} for i in range(len(y))])")
    else:
        lines = [f"without = fit.get_influence().params_not_obsi  {without}"]
    return [*lines, f"out = {y} - (X * without).sum(axis=1)  {out}"]


def _clusters(parts: Parts) -> list[str]:
    """The same for clusters: coefficients without each, and rows' errors around the fit without their own."""
    lines = ["Q, R = np.linalg.qr(X)"]
    if parts.robust:
        lines += clusters_left_out("e")
    if parts.power:
        lines.append(f"h = {parts.leverages}")
    else:
        lines.append("without = b - np.linalg.solve(R, lost.T).T  # coefficients with each cluster left out")
    if parts.ordered:
        lines.append("out = e + (Q * lost[cluster]).sum(axis=1)  # each row's error around the fit without its cluster")
    return lines


# --- links ------------------------------------------------------------------------------------------------------------


def _glm(parts: Parts) -> list[str]:
    family, weight, score = _LINKS[parts.est.remedy.left.key]
    scale = "" if parts.robust else 'scale="X2", '
    settled = f'fit({scale}tol=0, rtol=1e-10, tol_criterion="params")'
    weights = ", var_weights=v**2" if parts.weigher else ""
    lines = wrapped(f"fit = smf.glm(MODEL, rows, family=families.{family}{weights}).{settled}")
    if parts.kind == "invlink":
        warned = 'warnings.filterwarnings("ignore", "The InversePower link")'
        lines = [f"{warned}  # it warns of means below zero; here all lie above", *lines]
    X = "design(used)" if parts.searched else "fit.model.exog"
    lines.append(f"X, b, mu = {X}, {_coefficients(parts)}, fit.mu")
    if parts.triangle:
        lines += _newton(parts, weight, score)
    else:
        why = "each row left out by a Newton step: GLM's HC3 is HC0"
        lines += noted("without = b - fit.get_influence(observed=False).d_params", why)
    lines += noted(f"out = {_against(parts)}", "each row against the mean without it")
    return [*lines, *_table(parts)]


def _newton(parts: Parts, weight: str, score: str) -> list[str]:
    """without, where statsmodels' own step does not serve."""
    if parts.weigher:
        weight, score = f"(v * {weight})" if weight else "v", f"v * ({score})"
    lines = [f"Q, R = np.linalg.qr(X{f' * {weight}[:, None]' if weight else ''})", f"score = {score}"]
    lines += [f"s2 = score @ score / {parts.est.df_residual}"] if parts.needs_s2 else []
    if parts.clustered:
        lines += [*clusters_left_out("score"), "# each cluster left out, by one Newton step"]
        return [*lines, "without = b - np.linalg.solve(R, lost.T).T"]
    lines.append("# each row left out by a Newton step: GLM's HC3 is HC0")
    return [*lines, f"without = b - np.linalg.solve(R, Q.T * (score / (1 - {parts.leverages}))).T"]


def _against(parts: Parts) -> str:
    """Each row against its mean without it, that of a row of average weight: a ratio, for shares a difference."""
    own = undo(parts, f"(X * without{'[cluster]' if parts.clustered else ''}).sum(axis=1)")
    if parts.kind == "share":
        return f"v * (y - {own})" if parts.weigher else f"y - {own}"
    return f"np.maximum(1 + v * (y / {own} - 1), 0)" if parts.weigher else f"y / {own}"


# --- table ------------------------------------------------------------------------------------------------------------


def _table(parts: Parts) -> list[str]:
    """The coefficients with standard errors of the kind in use."""
    if not parts.own_table:
        return ['print(table := pd.DataFrame({"estimate": fit.params, "std_error": fit.bse}))']
    if not parts.robust:
        spread = "s2 * (np.linalg.inv(R) ** 2).sum(axis=1)"
    elif parts.power and parts.clustered:
        spread = "(1 - 1 / len(lost)) * (np.linalg.solve(R, lost.T) ** 2).sum(axis=1)"
    elif parts.power:
        spread = "(np.linalg.solve(R, Q.T * out) ** 2).sum(axis=1)"
    else:
        spread = f"{parts.few}((without - b) ** 2).sum(axis=0)"
    estimate, index = "fit.params", ""
    if parts.searched:
        estimate = f"[*fit.params, {', '.join(parts.searched)}]"
        index = f", [*fit.params.index, {', '.join(literal(name) for name in parts.searched)}]"
    return wrapped(f'print(table := pd.DataFrame({{"estimate": {estimate}, "std_error": np.sqrt({spread})}}{index}))')
