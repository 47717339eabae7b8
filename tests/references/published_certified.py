"""Certified sets: NIST Statistical Reference Datasets, from the certified files.

digits: how many must be met, a little under what is reached here.
"""

from __future__ import annotations

from published import Published
from published_tables import TABLES, wampler

__all__ = ["CERTIFIED"]

_LONGLEY = {
    "Intercept": ("-3482258.63459582", "890420.383607373"), "x1": ("15.0618722713733", "84.9149257747669"),
    "x2": ("-0.035819179292591", "0.0334910077722432"), "x3": ("-2.02022980381683", "0.488399681651699"),
    "x4": ("-1.03322686717359", "0.214274163161675"), "x5": ("-0.0511041056535807", "0.226073200069370"),
    "x6": ("1829.15146461355", "455.478499142212"),
}  # fmt: skip
_WAMPLER_TERMS = ("Intercept", "x", "I(x**2)", "I(x**3)", "I(x**4)", "I(x**5)")
_WAMPLER_SE = (
    2152.32624678170, 2363.55173469681, 779.343524331583, 101.475507550350, 5.64566512170752, 0.112324854679312,
)  # fmt: skip


def _wampler(size: float, *, digits: int) -> Published:
    """Certified: coefficients 1; standard errors of set 3 times the size of the disturbances."""
    printed = {f"coef:{t}": "1" for t in _WAMPLER_TERMS}
    printed |= {f"se:{t}": repr(size * se) for t, se in zip(_WAMPLER_TERMS, _WAMPLER_SE, strict=True)}
    printed["resid_sd"] = repr(size * 2360.14502379268)
    formula = "y ~ x + I(x**2) + I(x**3) + I(x**4) + I(x**5)"
    return Published("NIST, linear regression, Wampler", wampler(size), formula, "x", printed, digits=digits)


def _curve(name: str, formula: str, starts: list[list[float]], printed: dict[str, str]) -> Published:
    given = {f"start{i}": start for i, start in enumerate(starts, start=1)}
    return Published(
        f"NIST, nonlinear regression, {name}", TABLES[name], formula, "x", printed, kind="nist-nonlinear", given=given,
        digits=9,
    )  # fmt: skip


CERTIFIED = {
    "Norris": Published(
        "NIST, linear regression, Norris", TABLES["norris"], "y ~ x", "x", digits=13,
        printed={"coef:Intercept": "-0.262323073774029", "se:Intercept": "0.232818234301152",
                 "coef:x": "1.00211681802045", "se:x": "0.000429796848199937", "resid_sd": "0.884796396144373",
                 "r2": "0.999993745883712"},
    ),
    "NoInt1": Published(
        "NIST, linear regression, NoInt1", TABLES["noint1"], "y ~ x - 1", "x", digits=14,
        printed={"coef:x": "2.07438016528926", "se:x": "0.0165289256198347", "resid_sd": "3.56753034006338",
                 "r2": "0.999365492298663"},
    ),
    "Longley": Published(
        "NIST, linear regression, Longley", TABLES["longley"], "y ~ x1 + x2 + x3 + x4 + x5 + x6", "x1", digits=12,
        printed={**{f"coef:{t}": b for t, (b, _) in _LONGLEY.items()},
                 **{f"se:{t}": s for t, (_, s) in _LONGLEY.items()},
                 "resid_sd": "304.854073561965", "r2": "0.995479004577296"},
    ),
    "Wampler1": _wampler(0, digits=12),
    "Wampler3": _wampler(1, digits=13),
    "Wampler5": _wampler(1e4, digits=9),
    "SiRstv": Published(
        "NIST, analysis of variance, SiRstv", TABLES["sirstv"], "y ~ C(x)", "x", digits=12,
        printed={"ss_between": "5.11462616000000E-02", "ss_within": "2.16636560000000E-01",
                 "f": "1.18046237440255E+00", "r2": "1.90999039051129E-01", "resid_sd": "1.04076068334656E-01"},
    ),
    "Misra1a": _curve(
        "misra1a", "y ~ b1*(1-exp(-b2*x))", [[500, 1e-4], [250, 5e-4]],
        {"coef:b1": "238.94212918", "se:b1": "2.7070075241", "coef:b2": "5.5015643181E-04", "se:b2": "7.2668688436E-06",
         "rss": "0.12455138894"},
    ),
    "DanWood": _curve(
        "danwood", "y ~ b1*x**b2", [[1, 5], [0.7, 4]],
        {"coef:b1": "0.76886226176", "se:b1": "0.018281973860", "coef:b2": "3.8604055871", "se:b2": "0.051726610913",
         "rss": "0.0043173084083"},
    ),
    "Rat42": _curve(
        "rat42", "y ~ b1/(1+exp(b2-b3*x))", [[100, 1, 0.1], [75, 2.5, 0.07]],
        {"coef:b1": "72.462237576", "se:b1": "1.7340283401", "coef:b2": "2.6180768402", "se:b2": "0.088295217536",
         "coef:b3": "0.067359200066", "se:b3": "0.0034465663377", "rss": "8.0565229338"},
    ),
    # none of batten's curves: its columns and slopes go through the same search
    "Chwirut2": _curve(
        "chwirut2", "y ~ exp(-b1*x)/(b2+b3*x)", [[0.1, 0.01, 0.02], [0.15, 0.008, 0.01]],
        {"coef:b1": "0.16657666537", "se:b1": "0.038303286810", "coef:b2": "0.0051653291286",
         "se:b2": "0.00066621605126", "coef:b3": "0.012150007096", "se:b3": "0.0015304234767", "rss": "513.04802941"},
    ),
}  # fmt: skip
