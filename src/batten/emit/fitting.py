"""The fit of a script: rows, statsmodels, leverages, coefficients without each row, the table of coefficients."""

from __future__ import annotations

from batten.emit.covariates import read_numbers
from batten.emit.functions import undo
from batten.emit.parts import Parts
from batten.emit.powers import power_moves
from batten.emit.text import WIDTH, literal, noted, wrapped

__all__ = ["fitting"]

#: family, square root of the variance, square root of the working weight (in mu)
_LINKS = {
    "loglink y": ("Poisson()", "np.sqrt(mu)", "np.sqrt(mu)"),
    "loglink-gamma y": ("Gamma(sm.families.links.Log())", "mu", ""),
    "loglink-gaussian y": ("Gaussian(sm.families.links.Log())", "", "mu"),
    "share y": ("Binomial()", "np.sqrt(mu * (1 - mu))", "np.sqrt(mu * (1 - mu))"),
}


def _chosen(parts: Parts) -> str:
    """The expression given with --rows, or ""."""
    for why in parts.problem.left_out["why"].unique():
        found = str(why).partition("not in --rows ")[2]
        if found:
            return found
    return ""


def fitting(parts: Parts) -> list[str]:
    """From the frame to fitted coefficients and what their uncertainty needs."""
    return [*_rows(parts), *(_glm(parts) if parts.link else _ols(parts)), *_table(parts)]


def _rows(parts: Parts) -> list[str]:
    response, lines, data = parts.problem.response, [], parts.frame
    if _chosen(parts):
        data = "data"
        lines = wrapped(f"data = {parts.frame}.query({literal(_chosen(parts))})")
    text = any(f"{response} (stored as text)" in said for said in parts.problem.announcements)
    source = read_numbers(response, data, text=text)
    made = f"rows = columns({data}).assign(y={source}.to_numpy())"
    finite = any(
        "finite" in str(why) for why in parts.problem.left_out["why"].unique()
    )  # infinite; not a finite number
    clean = ".replace([np.inf, -np.inf], np.nan).dropna()" if finite else ".dropna()"
    if len(made + clean) <= WIDTH:
        lines.append(made + clean)
    else:
        lines += [*wrapped(made), f"rows = rows{clean}"]
    lines.append(f'y, used = rows["y"].to_numpy(), {data}.iloc[rows.index]')
    if parts.left.check is not None:
        condition, words = parts.left.check
        lines += wrapped(f"assert ({condition}).all(), {literal(words)}")
    return lines


def _ols(parts: Parts) -> list[str]:
    source = parts.left.columns[0][1]
    response = "" if parts.kind == "identity" else f".assign({parts.response}={source})"
    fit = f"fit = smf.ols(MODEL, rows{response})"
    if parts.uneven:
        lines = noted(f'{fit}.fit(method="qr")', "columns differ much in size: QR keeps their digits")
    elif parts.robust and not parts.own_table:
        lines = noted(f'{fit}.fit(cov_type="HC3", use_t=True)', "HC3: errors may be of uneven size")
    else:
        lines = [f"{fit}.fit()"]
    if parts.searched:
        lines.append("X, z, e = jacobian(used), fit.model.endog, fit.resid.to_numpy()")
        lines += noted(f"b = np.append(fit.params, {_zeros(parts)})", "0: the fit is linear around what was searched")
    else:
        lines.append("X, z, e, b = fit.model.exog, fit.model.endog, fit.resid.to_numpy(), fit.params.to_numpy()")
    if parts.kind == "exp":
        lines.append("smear = np.exp(e).mean()  # exp() of a fitted log is a median; this makes it a mean (Duan 1983)")
    lines.append("Q, R = np.linalg.qr(X)")
    if parts.needs_s2:
        lines.append(f"s2 = e @ e / {parts.est.df_residual}")
    if parts.power:
        lines += [f"h = {parts.leverages}", "out = e / (1 - h)  # each row's error around the fit without it"]
        return [*lines, *power_moves(parts)]
    if not parts.robust:
        return lines
    lines.append(f"out = e / (1 - {parts.leverages})  # each row's error around the fit without it")
    return [*lines, "without = b - np.linalg.solve(R, Q.T * out).T  # coefficients with each row left out"]


def _zeros(parts: Parts) -> str:
    return "0.0" if len(parts.searched) == 1 else f"[{', '.join(['0.0'] * len(parts.searched))}]"


def _glm(parts: Parts) -> list[str]:
    family, spread, weight = _LINKS[parts.est.remedy.left.key]
    score = f"(y - mu) / {spread}" if spread else "y - mu"
    lines = [
        f"model = smf.glm(MODEL, rows, family=sm.families.{family})",
        'fit = model.fit(tol=0, rtol=1e-10, tol_criterion="params")',
        "X, b = fit.model.exog, fit.params.to_numpy()",
        f"mu = {undo(parts, 'X @ b')}",
        f"Q, R = np.linalg.qr(X{f' * {weight}[:, None]' if weight else ''})",
        f"score = {score}",
        "# GLM's own HC1 to HC3 are all HC0: leave out each row instead, by one Newton step",
        f"without = b - np.linalg.solve(R, Q.T * (score / (1 - {parts.leverages}))).T",
        f"out = y {'-' if parts.kind == 'share' else '/'} {undo(parts, '(X * without).sum(axis=1)')}"
        "  # each row against the mean without it",
    ]
    return [*lines, f"s2 = score @ score / {parts.est.df_residual}"] if not parts.robust else lines


def _table(parts: Parts) -> list[str]:
    """The coefficients with standard errors of the kind in use."""
    if not parts.own_table:
        return ['print(table := pd.DataFrame({"estimate": fit.params, "std_error": fit.bse}))']
    if not parts.robust:
        spread = "s2 * (np.linalg.inv(R) ** 2).sum(axis=1)"
    elif parts.power:
        spread = "(np.linalg.solve(R, Q.T * out) ** 2).sum(axis=1)"
    else:
        spread = "((without - b) ** 2).sum(axis=0)"
    estimate, index = "fit.params", ""
    if parts.searched:
        estimate = f"[*fit.params, {', '.join(parts.searched)}]"
        index = f", [*fit.params.index, {', '.join(literal(name) for name in parts.searched)}]"
    return wrapped(f'print(table := pd.DataFrame({{"estimate": {estimate}, "std_error": np.sqrt({spread})}}{index}))')
