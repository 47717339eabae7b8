"""Errors about the data: columns that are not there or not numbers, rows that are too few, weights of a wrong kind."""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence

from batten.errors import BattenError, InputError, UnknownNameError, closest

__all__ = [
    "at_no_covariate",
    "at_unusable",
    "clusters_too_few",
    "columns_missing",
    "constant",
    "duplicate_column",
    "empty",
    "exposure_not_positive",
    "frequency_not_whole",
    "is_dates",
    "kind_without_weights",
    "mixture",
    "no_level",
    "not_a_table",
    "not_groups",
    "not_numbers",
    "rows_not_read",
    "rows_not_yes_no",
    "stores",
    "survey_weights",
    "too_few_rows",
    "too_large",
    "unequal_lengths",
    "unit_of_unknown",
    "unknown_option",
    "unknown_sample",
    "unknown_weights_kind",
    "weights_kind_missing",
    "weights_not_positive",
]


def _listed(values: Iterable[object], most: int = 3) -> str:
    """The first few values as they are written in code."""
    shown = [repr(v) for v in values]
    return ", ".join(shown[:most]) + (f" and {len(shown) - most} more" if len(shown) > most else "")


# --- the table --------------------------------------------------------------------------------------------------------


def not_a_table(kind: str) -> InputError:
    return InputError(
        "The data must be a data frame, or a dict of columns.",
        f"Seen: {kind}.",
        "pandas, polars and Arrow tables can be read, and whatever narwhals reads.",
    )


def unequal_lengths(lengths: Iterable[tuple[str, int]]) -> InputError:
    seen = ", ".join(f"{name} {length}" for name, length in lengths)
    return InputError(
        "The columns of the data have different lengths.", f"Seen: {seen}.", "Give every column one value per row."
    )


def duplicate_column(name: str, count: int) -> InputError:
    return InputError(
        f"Which column is `{name}`?",
        f"{count} columns of the data have that name.",
        "Rename them so that each name stands for one column.",
    )


def unknown_option(option: str, name: str, columns: Iterable[object]) -> UnknownNameError:
    """A column named in an option (weights, cluster, exposure)."""
    return UnknownNameError(f"There is no column `{name}` for {option}.", "", closest(name, [str(c) for c in columns]))


def unit_of_unknown(name: str, columns: Iterable[object]) -> UnknownNameError:
    return UnknownNameError(
        f"There is no column `{name}` to have a unit.", "", closest(name, [str(c) for c in columns])
    )


def columns_missing(names: Sequence[str], columns: Iterable[object]) -> UnknownNameError:
    """A frame to predict for lacks columns."""
    do = closest(names[0], [str(c) for c in columns]) if len(names) == 1 else "Add them."
    listed = ", ".join(f"`{n}`" for n in names)
    return UnknownNameError(
        f"The rows to predict have no column {listed}.",
        "The formula uses it." if len(names) == 1 else "The formula uses them.",
        do,
    )


# --- what a column holds ----------------------------------------------------------------------------------------------


def not_numbers(name: str, role: str, stray: Sequence[str], rows: int) -> InputError:
    """Text where numbers are needed. stray: distinct texts that are no plain numbers."""
    if any("," in text for text in stray):
        do = f"Say what the comma means: data[{name!r}].str.replace(',', '.').astype(float), or read with decimal=','."
    else:
        do = f"Correct them or leave them missing: pd.to_numeric(data[{name!r}], errors='coerce')."
    return InputError(
        f"The {role} `{name}` is text that is not plainly numbers.",
        f"Among {rows} rows: {_listed(stray)}.",
        do,
    )


def is_dates(name: str, role: str) -> InputError:
    return InputError(
        f"The {role} `{name}` holds dates.",
        "A date can be the focal predictor or a covariate (as days since the first), not this.",
        f"Make it a number first, such as days since a start: (data[{name!r}] - start).dt.days",
    )


def stores(name: str, role: str, what: str) -> InputError:
    """A column of a type that is neither numbers nor groups: lengths of time, complex numbers, lists."""
    return InputError(
        f"The {role} `{name}` cannot be used as it is stored.",
        f"It holds: {what}.",
        "Make it a number (for lengths of time: .dt.total_seconds()), text or a category first.",
    )


def mixture(name: str, examples: Sequence[str]) -> InputError:
    """A covariate in which most values look like numbers and some do not."""
    return InputError(
        f"Is `{name}` a number or a group?",
        f"Most of its values look like numbers, but not {_listed(examples)}.",
        f"Correct these or leave them missing; if it is a group, write C({name}).",
    )


def not_groups(name: str) -> InputError:
    return InputError(
        f"`{name}` cannot be read as groups.",
        "It holds lists or other objects that cannot be compared.",
        "Make it text or a category first.",
    )


def no_level(name: str, level: object, levels: Iterable[object]) -> UnknownNameError:
    """A reference level or a list of levels in C(column, ...) that the rows do not hold."""
    return UnknownNameError(
        f"`{name}` has no level {level!r} in these rows.", "", closest(str(level), [str(v) for v in levels])
    )


def constant(name: str, role: str, value: float, rows: int) -> InputError:
    do = (
        "Choose another response." if role == "response" else "Choose another focal predictor, or rows where it varies."
    )
    return InputError(f"The {role} `{name}` does not vary.", f"All {rows} rows hold {value:.6g}.", do)


# --- rows -------------------------------------------------------------------------------------------------------------


def empty(rows: int, reasons: str) -> InputError:
    seen = f"Of {rows} rows all are left out: {reasons}." if rows else "The data have no rows."
    return InputError(
        "There are no rows to work with.", seen, "Check the columns named in the formula, and the choice of rows."
    )


def too_few_rows(n: int, columns: int, total: int, reasons: str) -> InputError:
    """columns: coefficients of the straight line."""
    left = f" ({total} rows, left out: {reasons})" if reasons else ""
    if n < 5:
        return InputError("There are too few rows.", f"{n} can be used{left}; at least 5 are needed.", "Add rows.")
    return InputError(
        "There are too few rows for this formula.",
        f"{n} can be used{left}, and the straight line alone has {columns} coefficients.",
        "Add rows, or leave out covariates or groups.",
    )


def too_large(rows: int, columns: int, name: str) -> InputError:
    return InputError(
        "This formula has too many columns for so many rows.",
        f"{rows} rows by {columns} columns need {rows * columns * 8 / 1e9:.0f} GB; most columns come from `{name}`.",
        f"Leave `{name}` out of the formula; if its rows belong together, give it as cluster.",
    )


def rows_not_read(expression: str, why: str, columns: Iterable[object], name: str = "") -> BattenError:
    """`name`: a name in the expression that is no column."""
    if name:
        do = closest(name, [str(c) for c in columns])
        return UnknownNameError(f"The choice of rows names `{name}`, which is no column.", f"Seen: {expression}", do)
    return InputError(
        f"The choice of rows cannot be read: {why}.",
        f"Seen: {expression}",
        "Write it as for DataFrame.query: mass_kg < 50 and alloy == 'steel'; names with spaces go in backticks.",
    )


def rows_not_yes_no(expression: str) -> InputError:
    return InputError(
        "The choice of rows must say yes or no for each row.",
        f"Seen: {expression}",
        "Compare with something: mass_kg < 50, or alloy == 'steel' (two equal signs).",
    )


# --- weights, clusters, exposure --------------------------------------------------------------------------------------


def weights_kind_missing(name: str) -> InputError:
    return InputError(
        f"What kind of weights are in `{name}`?",
        "Weights can say how precise a row is, or how many equal rows it stands for; the answers differ.",
        "Give weights_kind='variance' (variance = s2 / weight) or weights_kind='frequency' (counts of rows).",
    )


def survey_weights(kind: str) -> InputError:
    return InputError(
        "Survey weights are not supported.",
        f"weights_kind={kind!r} asks for rows weighted by how they were sampled.",
        "Use software made for survey designs; weights of variance or frequency mean something else.",
    )


def unknown_weights_kind(kind: str, kinds: Sequence[str]) -> UnknownNameError:
    return UnknownNameError(f"There is no kind of weights {kind!r}.", "", closest(kind, list(kinds)))


def kind_without_weights(kind: str) -> InputError:
    return InputError(
        "A kind of weights is given, but no weights.", f"weights_kind={kind!r}.", "Name their column: weights='...'."
    )


def weights_not_positive(name: str, count: int, rows: int, lowest: float) -> InputError:
    return InputError(
        "Variance weights must be above zero.",
        f"{count} of {rows} values of `{name}` are not (lowest {lowest:.6g}).",
        "Leave these rows out, or correct the weights.",
    )


def frequency_not_whole(name: str, count: int, rows: int, example: float) -> InputError:
    return InputError(
        "Frequency weights must be whole numbers, zero or more.",
        f"{count} of {rows} values of `{name}` are not (such as {example:.6g}).",
        "Correct them; if they say how precise a row is, their kind is 'variance'.",
    )


def weights_and_exposure(weights: str, exposure: str) -> InputError:
    return InputError(
        "Weights of variance and an exposure cannot be given together.",
        f"weights={weights!r} and exposure={exposure!r}: an exposure already weighs the rows.",
        "Leave one of them out.",
    )


def too_many_repeats(name: str, total: float, most: int) -> InputError:
    return InputError(
        "The frequencies stand for too many rows.",
        f"`{name}` adds up to {total:,.0f}; up to {most:,} rows can be written out.",
        "Divide the frequencies by a common factor, or use weights_kind='variance'.",
    )


def exposure_missing(name: str) -> InputError:
    return InputError(
        "A total needs the exposure of every row.",
        f"The frame has no usable `{name}` in each row that can be predicted.",
        f"Add the column `{name}`, with values above zero.",
    )


def constant_with_clusters(name: str) -> InputError:
    return InputError(
        "Constant errors take rows as independent, clusters say that they are not.",
        f"errors='constant' and cluster={name!r}.", "Leave one of them out.",
    )  # fmt: skip


def exposure_not_positive(name: str, count: int, rows: int, lowest: float) -> InputError:
    return InputError(
        "An exposure must be above zero.",
        f"{count} of {rows} values of `{name}` are not (lowest {lowest:.6g}).",
        "Leave these rows out, or correct them.",
    )


def clusters_too_few(name: str, value: object) -> InputError:
    return InputError(
        "Clusters need at least two.",
        f"All rows have the same `{name}`: {value!r}.",
        "Leave the cluster out, or name another column.",
    )


def at_no_covariate(name: str, focus: str, covariates: Sequence[str]) -> BattenError:
    if name == focus:
        return InputError(
            f"`{name}` is the focal predictor and cannot be held at a value.",
            "at holds covariates.",
            "Give the two values to compare as span.",
        )
    return UnknownNameError(f"There is no covariate `{name}` to hold at a value.", "", closest(name, list(covariates)))


def at_unusable(at: Mapping[str, object], note: str) -> InputError:
    asked = ", ".join(f"{name}={value!r}" for name, value in at.items())
    return InputError(
        "These covariate values cannot be used.", f"at {asked}: {note}.", "Choose values that the rows hold."
    )


# --- samples ----------------------------------------------------------------------------------------------------------


def unknown_sample(name: str, names: Sequence[str]) -> UnknownNameError:
    return UnknownNameError(f"There is no sample {name!r}.", "", closest(name, list(names)))
