"""The small writing under every script: literals that read back, comments that cannot break, names kept apart."""

from __future__ import annotations

import ast

import numpy as np
import pandas as pd
import pytest

from batten.emit.renaming import without_names
from batten.emit.text import comment, docstring, fstring, literal, noted, plain_name, rounded, said, wrapped

VALUES = [0.1, -1e-300, 1.0, 3, True, None, "plain", 'say "hi"', "it's \"both\"", "a\nb\\c", "μ \x07 \u2028", (1.5,),
          ("a", 2), [1, "x"], np.float64(2.5), np.int64(4), np.bool_(True)]  # fmt: skip


@pytest.mark.parametrize("value", VALUES, ids=repr)
def test_literals_read_back_the_same_on_one_line(value: object) -> None:
    source = literal(value)
    assert "\n" not in source
    assert ast.literal_eval(source) == (value.item() if isinstance(value, np.generic) else value)


def test_infinite_and_dated_literals() -> None:
    space = {"np": np, "pd": pd}
    assert eval(literal(float("-inf")), space) == float("-inf")
    assert np.isnan(eval(literal(float("nan")), space))
    stamp = pd.Timestamp("2031-05-01 06:30")
    assert eval(literal(stamp), space) == stamp


def test_asserted_numbers_keep_eight_digits() -> None:
    assert rounded(1 / 3) == "0.33333333"
    assert float(rounded(123456789.987)) == pytest.approx(123456789.987, rel=5e-8)


def test_a_users_text_cannot_leave_its_comment_or_docstring() -> None:
    nasty = 'a"""\nimport os\r\x0c\u2028 \\ ' + "x" * 100
    assert len(said(nasty).splitlines()) == 1
    assert len(said(nasty)) <= 60
    assert '"' not in said(nasty)
    assert "\\" not in said(nasty)
    ast.parse("\n".join(["def f():", *docstring(f"{said(nasty)} and {said(nasty)} and {said(nasty)}"), "    return 1"]))
    assert all(line.startswith("#") and len(line) <= 120 for line in comment("word " * 60))


def test_long_statements_break_after_commas_and_stay_the_same_program() -> None:
    for line in (
        "want = [" + ", ".join(str(k / 7) for k in range(60)) + "]",
        "x = f(g(" + ", ".join(f"[{k}, {k}]" for k in range(40)) + '), "a, b", k=(1, 2))',
    ):
        lines = wrapped(line)
        assert len(lines) > 1
        assert max(map(len, lines)) <= 120
        assert ast.dump(ast.parse("\n".join(lines))) == ast.dump(ast.parse(line))


def test_a_reason_stands_behind_its_statement_or_above_it() -> None:
    assert noted("x = 1", "short") == ["x = 1  # short"]
    assert noted("    x = 1", "long " * 30)[-1] == "    x = 1"


def test_texts_of_an_fstring_stand_as_they_are() -> None:
    value = 2.5
    assert eval(fstring('{a} "b" \\ ', ("value:.2f",), " }{"), {"value": value}) == '{a} "b" \\ 2.50 }{'


@pytest.mark.parametrize(
    ("text", "name"),
    [("Melt Temp (°C)", "melt_temp_c"), ("μ", "c0"), ("class", "class_"), ("C", "c"), ("x", "x_"), ("2nd", "c_2nd")],
)
def test_plain_names(text: str, name: str) -> None:
    assert plain_name(text, (), "c0") == name
    assert plain_name(text, (name,), "c0") == f"{name}_2"


def test_own_names_move_away_from_the_users() -> None:
    source = (
        'import numpy as np\nrows = np.ones(3)\ndef f(rows, k=1):\n    return f"{rows.sum()} rows"\nf(rows, k=rows)\n'
    )
    changed = without_names(source, {"rows", "np", "absent"})
    assert changed == (
        "import numpy as np_\nrows_ = np_.ones(3)\ndef f(rows_, k=1):\n"
        '    return f"{rows_.sum()} rows"\nf(rows_, k=rows_)\n'
    )
    assert without_names(source, {"castings"}) == source
    # a library's keyword is not the script's name, its own functions' keywords are
    source = "rows = g(rows=1)\ndef h(rows):\n    return rows\nh(rows=2)\n"
    assert without_names(source, {"rows"}) == "rows_ = g(rows=1)\ndef h(rows_):\n    return rows_\nh(rows_=2)\n"
