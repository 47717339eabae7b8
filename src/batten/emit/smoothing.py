"""A penalised curve in a script: least squares on the rows of the data and on rows that stand for its roughness."""

from __future__ import annotations

from batten.effects.numbers import counted
from batten.emit.held import held_at
from batten.emit.parts import Parts
from batten.emit.text import constant, noted, number, wrapped
from batten.emit.weights import clusters_left_out

__all__ = ["smooth_constants", "smooth_fit"]


def smooth_constants(parts: Parts) -> list[str]:
    """The amount of smoothing, and the columns it holds."""
    est = parts.est
    assert est.roughness is not None
    # the shape measures roughness in units of the knots' range
    weight = est.roughness.amount * (est.state[-1] - est.state[0])
    edf = f"{counted(est.roughness.edf)} degrees of freedom"
    return [
        *constant("WEIGHT", number(weight), f"of the curve's roughness, by restricted likelihood: {edf}"),
        'BENDS = " + ".join(f"s{j}" for j in range(1, len(KNOTS) - 1))',
    ]


def smooth_fit(parts: Parts) -> list[str]:
    """Coefficients b, residuals e, and what their uncertainty needs."""
    response = "" if parts.kind == "identity" else f".assign({parts.response}={parts.left.columns[0][1]})"
    v = " * v" if parts.weigher else ""
    lines = [
        *wrapped(f"model = smf.ols(MODEL, rows{response})"),
        f"X, z, w = model.exog{' * v[:, None]' if v else ''}, model.endog{v}, np.diff(KNOTS)",
        *_roughness(parts),
        "Q, R = np.linalg.qr(np.vstack([X, D]))  # least squares on the data and on zeros with design D",
        "Q, low = Q[: len(z)], Q[len(z) :]",
        "b, h = np.linalg.solve(R, Q.T @ z), (Q**2).sum(axis=1)",
        "e, edf = z - X @ b, h.sum()",
    ]
    if parts.kind == "exp":
        lines.append("smear = np.exp(e).mean()  # exp() of a fitted log is a median; this makes it a mean (Duan 1983)")
    variance = "e @ e / (len(z) - edf)"
    if not parts.robust:
        return [*lines, f"s2 = {variance}", *_table("s2 * (np.linalg.inv(R) ** 2).sum(axis=1)")]
    taken = "taken = np.sqrt(s2) * np.linalg.solve(R, low.T).T  # moves of b by what smoothing may take (Nychka 1988)"
    table = _table(f"{parts.few}((without - b) ** 2).sum(axis=0) + (taken**2).sum(axis=0)")
    if parts.clustered:
        lines += [f"s2 = {variance}", *clusters_left_out("e")]
        return [
            *lines,
            "without = b - np.linalg.solve(R, lost.T).T  # coefficients with each cluster left out",
            "out = e + (Q * lost[cluster]).sum(axis=1)  # each row's error around the fit without its cluster",
            taken,
            *table,
        ]
    return [
        *lines,
        f"s2, out = {variance}, e / (1 - h)  # out: each row's error around the fit without it",
        "without = b - np.linalg.solve(R, Q.T * out).T  # coefficients with each row left out",
        taken,
        *table,
    ]


def _table(variance: str) -> list[str]:
    """The coefficients, of which none means anything by itself, with standard errors."""
    numbers = f'{{"estimate": b, "std_error": np.sqrt({variance})}}'
    return wrapped(f"print(table := pd.DataFrame({numbers}, model.exog_names))")


def _roughness(parts: Parts) -> list[str]:
    """D: rows whose squares add up to the integrated squared second derivative of every curve, times WEIGHT."""
    lines, each = [], "used[:1]"
    modifier = parts.est.rows.modifier
    if not (modifier == modifier[0]).all():
        far, near = (f"design(used.assign({held_at(parts, f'KNOTS[{k}]')}))" for k in (-1, 0))
        lines = [
            *wrapped(f"ends = {near}, {far}"),
            "own = np.unique(ends[1] - ends[0], axis=0, return_index=True)[1]  # one row of every curve",
        ]
        each = "used.iloc[own]"
    return [
        *lines,
        *wrapped(f"N = design(pd.concat([{each}.assign({held_at(parts, 'k')}) for k in KNOTS]))"),
        *noted(
            "turn = np.diff(np.diff(N.reshape(len(KNOTS), -1), axis=0) / w[:, None], axis=0)",
            "of the slope at inner knots",
        ),
        "G = np.diag(w[:-1] + w[1:]) / 3 + np.diag(w[1:-1], 1) / 6 + np.diag(w[1:-1], -1) / 6",
        "D = np.sqrt(WEIGHT) * np.linalg.solve(np.linalg.cholesky(G), turn).reshape(-1, X.shape[1])",
        "# D'D is WEIGHT times the integral of the squared second derivative",
    ]
