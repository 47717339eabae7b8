"""Keys, display names, the order from simple to elaborate, and the default grid."""

from __future__ import annotations

import pickle
import subprocess
import sys

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from batten.errors import InputError, UnknownNameError
from batten.families import FAMILIES, Remedy, curves, default_grid, expand, links, parse, scales, shapes

ANY = np.array([0.5, 2.0, 9.0])
SHARES = np.array([0.0, 0.4, 1.0])
CHANGES = np.array([-1.0, 0.0, 2.0])


def keys(remedies: tuple[Remedy, ...]) -> list[str]:
    return [r.key for r in remedies]


def in_order(found: list[str], wanted: list[str]) -> bool:
    """Whether the wanted keys all stand among the found ones in this order; a family more is no fault."""
    return [key for key in found if key in wanted] == wanted


def test_the_folders_hold_these_members_from_simple_to_elaborate() -> None:
    left = ["y", "log y", "sqrt y", "1/y", "y^2", "log1p y", "asinh y", "boxcox y", "yeojohnson y", "logit(0, 1) y"]
    assert in_order([m.key for m in scales()], left)
    right = [
        "x", "log x", "sqrt x", "1/x", "x^2", "poly2 x", "hinge x", "fp1 x", "x^p", "fp2 x", "hinge2 x", "spline4 x",
        "smooth x", "cut x", "bins5 x",
    ]  # fmt: skip
    assert in_order([m.key for m in shapes()], right)
    assert in_order(
        [m.key for m in links()], ["loglink y", "loglink-gamma y", "loglink-gaussian y", "share y", "invlink-gamma y"]
    )
    known = ["exponential x", "power x", "level-exp x", "level-hyp x", "s-curve x", "gompertz x"]
    assert in_order([m.key for m in curves()], known)


def test_every_written_form_reads_back() -> None:
    lefts = [
        "y", "log y", "sqrt y", "1/y", "y^2", "boxcox y", "boxcox(-0.5) y", "yeojohnson y", "yeojohnson(1.5) y",
        "logit(0, 100) y", "log1p y", "asinh y", "loglink y", "loglink-gamma y", "loglink-gaussian y", "share y",
    ]  # fmt: skip
    rights = [
        "x", "1/x", "x^2", "x^-0.5", "x^1.5", "x^p", "log x", "sqrt x", "poly2 x", "poly10 x", "fp1 x", "fp2 x",
        "fp1(-1) x", "fp2(0, 3) x", "bins3 x", "bins(10, 20, 40) x", "cut x", "hinge x", "hinge2 x", "hinge(500) x",
        "hinge2(200, 500) x", "spline3 x", "spline7 x", "spline(5, 10, 20) x", "smooth x",
    ]  # fmt: skip
    for left in lefts:
        for right in rights:
            for key in (f"{left} ~ {right}", f"weighted {left} ~ {right}"):
                remedy = parse(key)
                assert remedy.key == str(remedy) == key
                assert parse(remedy.key) == remedy
    for member in curves():
        assert parse(f"y ~ {member.key}").shape == member


@pytest.mark.parametrize(
    ("typed", "key"),
    [
        ("log y~log x", "log y ~ log x"),
        ("  y  ~x ", "y ~ x"),
        ("1 / y ~ 1 / x", "1/y ~ 1/x"),
        ("y ~ x ^ 2", "y ~ x^2"),
        ("y~bins( 10,20.0 , 4e1)x", "y ~ bins(10, 20, 40) x"),
        ("weighted   y ~ x", "weighted y ~ x"),
        ("boxcox(0.50) y ~ x", "boxcox(0.5) y ~ x"),
        ("y ~ x^0.5", "y ~ sqrt x"),
        ("y ~ x^-1", "y ~ 1/x"),
        ("y ~ fp2(3, 0) x", "y ~ fp2(0, 3) x"),
        ("logit(0,1) y ~ spline( 5,10 ,20 ) x", "logit(0, 1) y ~ spline(5, 10, 20) x"),
    ],
)
def test_a_key_is_tidied_to_one_spelling(typed: str, key: str) -> None:
    assert parse(typed).key == key


@settings(max_examples=100, deadline=None, derandomize=True)
@given(st.lists(st.floats(-1e9, 1e9), min_size=3, max_size=8, unique=True))
def test_numbers_in_a_key_survive_the_round_trip_exactly(values: list[float]) -> None:
    places = tuple(sorted(v + 0.0 for v in values))  # minus zero is zero
    for word in ("bins", "spline"):
        key = f"y ~ {word}({', '.join(map(repr, places))}) x"
        found = parse(key)
        assert parse(found.key) == found
        assert found.shape.learn(np.zeros(3))[-len(places) :] == places
    assert parse(f"boxcox({places[0]!r}) y ~ x").left.learn(ANY) == (places[0],)  # type: ignore[union-attr]


@pytest.mark.parametrize(
    ("key", "message"),
    [
        ("log yy ~ x", "'log yy' is not a known form of the response in a remedy's key.\nSeen: 'log yy ~ x'.\n"
         "Did you mean 'log y' or 'log1p y'? In a key, y stands for the response and x for the focal predictor: "
         "'log y ~ x', 'y ~ poly2 x'."),
        ("y ~ ply2 x", "'ply2 x' is not a known form of the predictor in a remedy's key.\nSeen: 'y ~ ply2 x'.\n"
         "Did you mean 'poly2 x' or 'fp2 x'? In a key, y stands for the response and x for the focal predictor: "
         "'log y ~ x', 'y ~ poly2 x'."),
    ],
)  # fmt: skip
def test_an_unknown_form_gets_did_you_mean(key: str, message: str) -> None:
    with pytest.raises(UnknownNameError) as error:
        parse(key)
    assert str(error.value) == message
    assert isinstance(error.value, KeyError)


@pytest.mark.parametrize(
    ("key", "wrong", "do"),
    [
        ("y = x", "A remedy's key has two sides with one '~' between them.",
         "In a key, y stands for the response and x for the focal predictor: 'log y ~ x', 'y ~ poly2 x'."),
        ("y ~", "A remedy's key has two sides with one '~' between them.",
         "In a key, y stands for the response and x for the focal predictor: 'log y ~ x', 'y ~ poly2 x'."),
        ("y ~ poly1 x", "A polynomial has a degree from 2 to 20.", "Write x for degree 1, poly2 x for a quadratic."),
        ("y ~ spline2 x", "A spline has 3 to 7 knots at its usual places.",
         "Write spline4 x, or knots by hand: spline(5, 10, 20) x."),
        ("y ~ spline(20, 10, 30) x", "A spline needs three or more knots in rising order.",
         "Write spline(5, 10, 20) x, or spline4 x."),
        ("y ~ bins1 x", "There can be 2 to 50 groups.", "Write bins5 x."),
        ("y ~ bins(20, 20) x", "Groups need inner edges in rising order.",
         "Write bins(10, 20, 40) x for four groups."),
        ("y ~ bins(low) x", "Brackets in a key hold numbers with commas between them.",
         "Write y ~ bins(10, 20, 40) x."),
        ("y ~ bins(nan, inf) x", "Brackets in a key hold numbers with commas between them.",
         "Write y ~ bins(10, 20, 40) x."),
        ("y ~ hinge(1, 2) x", "A hinge takes one break, hinge2 two in rising order.",
         "Write hinge(500) x, hinge2(200, 500) x, or hinge x to have the break searched."),
        ("y ~ fp1(1, 2) x", "fp1 takes 1 power.",
         "Write fp1(-0.5) x, fp2(0, 3) x, or fp1 x to have the power chosen."),
        ("y ~ x^1", "x^1 is x itself.", "Write x."),
        ("y ~ x^0", "x^0 is a constant.", "Write log x, which stands at power 0 of the ladder."),
        ("y ~ x^1.2.3", "A power of x is written with one number.", "Write x^2 or x^-0.5."),
        ("boxcox(1, 2) y ~ x", "A Box-Cox scale takes one power.",
         "Write boxcox(0.5) y, or boxcox y to have the power estimated."),
        ("yeojohnson() y ~ x", "A Yeo-Johnson scale takes one power.",
         "Write yeojohnson(0.5) y, or yeojohnson y to have the power estimated."),
        ("logit y ~ x", "A logit needs the lower and the upper bound of the response.",
         "Write logit(0, 1) y, or logit(0, 100) y for percentages."),
        ("logit(5, 1) y ~ x", "A logit needs the lower and the upper bound of the response.",
         "Write logit(0, 1) y, or logit(0, 100) y for percentages."),
        ("log y ~ s-curve x", "A known curve stands on the response as it is.",
         "Write 'y ~ s-curve x', or keep 'log y' with another shape, such as 'log y ~ log x'."),
    ],
)  # fmt: skip
def test_a_key_that_does_not_fit_says_what_to_write(key: str, wrong: str, do: str) -> None:
    with pytest.raises(InputError) as error:
        parse(key)
    assert (error.value.wrong, error.value.do) == (wrong, do)
    assert error.value.seen.startswith("Seen: '")


@pytest.mark.parametrize(
    ("key", "words"),
    [
        ("y ~ x", "straight line"),
        ("weighted y ~ x", "straight line, weighted"),
        ("y ~ log x", "log of mass"),
        ("log y ~ x", "log of minutes on mass"),
        ("log y ~ log x", "log of minutes on log of mass"),
        ("y ~ poly2 x", "quadratic in mass"),
        ("y ~ poly7 x", "polynomial of degree 7 in mass"),
        ("y ~ x^2", "square of mass only"),
        ("y ~ bins5 x", "grouped mass (5)"),
        ("y ~ bins(10, 20) x", "grouped mass (at 10, 20)"),
        ("y ~ hinge x", "hinge in mass"),
        ("y ~ hinge(500) x", "hinge in mass (at 500)"),
        ("sqrt y ~ spline4 x", "square root of minutes on spline in mass (4 knots)"),
        ("loglink y ~ log x", "log link for minutes on log of mass"),
        ("loglink-gamma y ~ x", "log link for minutes (Gamma) on mass"),
        ("y ~ fp1 x", "fractional polynomial in mass (degree 1)"),
        ("y ~ fp2(0, 3) x", "fractional polynomial in mass (powers 0, 3)"),
        ("boxcox(0.5) y ~ x", "Box-Cox power 0.5 of minutes on mass"),
        ("y ~ level-hyp x", "levelling off in mass (hyperbola)"),
    ],
)
def test_display_names_are_plain_words(key: str, words: str) -> None:
    assert parse(key).words("minutes", "mass") == words


def test_the_order_runs_from_simple_to_elaborate() -> None:
    """One-sided logs, then log-log; curves after the first-degree fractional polynomial; weighted after its twin."""
    expected = [
        "y ~ x", "weighted y ~ x", "y ~ log x", "y ~ sqrt x", "y ~ 1/x", "y ~ x^2", "y ~ x^3", "log y ~ x",
        "log y ~ log x", "sqrt y ~ x", "1/y ~ x", "log y ~ sqrt x", "sqrt y ~ log x", "loglink y ~ x",
        "loglink-gamma y ~ x", "loglink y ~ log x", "y ~ poly2 x", "log y ~ poly2 x", "y ~ hinge x", "y ~ fp1 x",
        "y ~ x^p", "boxcox y ~ x", "boxcox y ~ log x", "yeojohnson y ~ x", "logit(0, 1) y ~ x", "y ~ exponential x",
        "y ~ s-curve x", "y ~ spline3 x", "y ~ fp2 x", "y ~ hinge2 x", "y ~ spline4 x",
        "loglink y ~ spline4 x", "y ~ poly3 x", "y ~ spline5 x", "y ~ poly4 x", "y ~ poly10 x", "y ~ smooth x",
        "y ~ bins3 x", "y ~ bins5 x",
    ]  # fmt: skip
    assert [r.key for r in sorted(map(parse, sorted(expected)), key=lambda r: r.order)] == expected


def test_no_two_remedies_of_the_grid_share_a_place() -> None:
    grid = default_grid(SHARES + 0.1, ANY, zero_is_arbitrary=False) + default_grid(SHARES, ANY, zero_is_arbitrary=False)
    places = {r.order for r in grid}
    assert len(places) == len({r.key for r in grid})


def test_the_default_grid_is_the_documented_one() -> None:
    got = default_grid(ANY, ANY, zero_is_arbitrary=False)
    ladder = [f"{y} ~ {x}" for y in ("y", "log y", "sqrt y", "1/y", "boxcox y")
              for x in ("x", "log x", "sqrt x", "1/x", "x^2")]  # fmt: skip
    flexible = ("x^p", "fp1 x", "bins5 x", "hinge x", "smooth x", "spline3 x", "spline4 x", "spline5 x")
    both = [f"{y} ~ {x}" for y in ("y", "log y") for x in flexible]
    polynomials = [f"{y} ~ {x}" for y in ("y", "log y", "sqrt y") for x in ("poly2 x", "poly3 x")]
    named = [
        "loglink y ~ x", "loglink y ~ log x", "loglink y ~ spline4 x", "loglink-gamma y ~ x", "loglink-gamma y ~ log x",
        "loglink-gaussian y ~ x", "loglink-gaussian y ~ log x", "y ~ exponential x", "y ~ power x", "y ~ level-exp x",
        "y ~ level-hyp x", "y ~ s-curve x", "weighted y ~ x",
    ]  # fmt: skip
    assert sorted(keys(got)) == sorted(ladder + both + polynomials + named)
    assert len(got) == 60
    assert got[0].key == "y ~ x"
    assert [r.order for r in got] == sorted(r.order for r in got)


def test_the_grid_follows_the_rows() -> None:
    shares = keys(default_grid(SHARES, ANY, zero_is_arbitrary=False))
    assert {"share y ~ x", "share y ~ log x", "share y ~ spline4 x", "yeojohnson y ~ x"} <= set(shares)
    assert not [k for k in shares if k.startswith("boxcox")]
    assert not [k for k in keys(default_grid(ANY, ANY, zero_is_arbitrary=False)) if "share" in k or "yeo" in k]
    assert not [k for k in keys(default_grid(CHANGES, ANY, zero_is_arbitrary=False)) if "share" in k]


def test_roots_logs_and_powers_of_a_year_are_left_out() -> None:
    got = keys(default_grid(ANY, ANY, zero_is_arbitrary=True))
    rights = {k.split(" ~ ")[1] for k in got}
    assert rights == {
        "x", "poly2 x", "poly3 x", "bins5 x", "hinge x", "smooth x", "spline3 x", "spline4 x", "spline5 x",
        "exponential x", "level-exp x", "s-curve x",
    }  # fmt: skip
    assert "sqrt y ~ x" in got


def test_every_remedy_belongs_to_one_named_family() -> None:
    grid = default_grid(SHARES, ANY, zero_is_arbitrary=False)
    assert {r.family for r in grid} == set(FAMILIES)
    for key, family in (
        ("log y ~ log x", "ladder"), ("boxcox y ~ x", "powers"), ("y ~ x^p", "powers"), ("y ~ smooth x", "smooth"),
        ("boxcox y ~ poly2 x", "polynomials"), ("log y ~ fp2 x", "fractional"), ("y ~ cut x", "groups"),
        ("y ~ hinge2 x", "hinges"), ("log y ~ spline4 x", "splines"), ("loglink y ~ spline4 x", "links"),
        ("share y ~ x", "shares"), ("y ~ gompertz x", "curves"), ("weighted log y ~ x", "weighted"),
        ("asinh y ~ x", "ladder"),
    ):  # fmt: skip
        assert parse(key).family == family


def test_readable_remedies_can_be_told_in_a_sentence() -> None:
    for key in ("y ~ x", "log y ~ log x", "y ~ poly2 x", "y ~ hinge x", "y ~ bins5 x", "loglink y ~ x"):
        assert parse(key).readable
    for key in ("boxcox y ~ x", "y ~ spline4 x", "y ~ smooth x", "y ~ fp2 x", "y ~ poly3 x", "asinh y ~ x"):
        assert not parse(key).readable


def test_only_takes_families_and_keys_each_remedy_once() -> None:
    grid = default_grid(ANY, ANY, zero_is_arbitrary=False)
    got = expand(["hinges", "log y ~ x", "y ~ hinge x", "y ~ poly10 x"], grid)
    assert keys(got) == ["log y ~ x", "y ~ hinge x", "log y ~ hinge x", "y ~ poly10 x"]
    assert keys(expand("weighted", grid)) == ["weighted y ~ x"]
    assert keys(expand(["shares"], grid)) == ["share y ~ x", "share y ~ log x", "share y ~ spline4 x"]
    assert {r for r in expand(FAMILIES, grid) if r.family != "shares"} == set(grid)


def test_a_wrong_name_in_only_gets_did_you_mean() -> None:
    with pytest.raises(UnknownNameError) as error:
        expand(["splnes"], ())
    assert error.value.wrong == "'splnes' is neither a family of remedies nor a remedy's key."
    assert error.value.seen == "Families: " + ", ".join(FAMILIES) + "."
    assert error.value.do.startswith("Did you mean 'splines'?")


def test_remedies_are_values() -> None:
    remedy = parse("log y ~ spline(5, 10, 20) x")
    assert pickle.loads(pickle.dumps(remedy)) == remedy
    assert len({remedy, parse("log y~spline(5,10,20) x")}) == 1
    with pytest.raises(AttributeError):
        remedy.weighted = True  # type: ignore[misc]


def test_importing_a_member_by_its_path_leaves_the_registry_callable() -> None:
    """A folder and the function that lists it share a name; loading the folder first must not win."""
    script = "import batten.families.scales.log, batten.families as f; f.scales(); f.curves(); print(callable(f.links))"
    done = subprocess.run([sys.executable, "-c", script], capture_output=True, text=True, check=True)
    assert done.stdout.strip() == "True"
