"""The page and the notebook's static copy: well-formed, escaped, small, readable without styles or figures."""

from __future__ import annotations

import re
from collections.abc import Callable
from functools import cache
from html.parser import HTMLParser
from pathlib import Path

import pytest
from situations import HOSTILE, QUICK, examined

from batten.exam.examination import Examination
from batten.report.page import page, save_page, static_html
from batten.report.words import headline

_VOID = {"meta", "img", "br", "hr"}
#: everything our pages are made of
_OURS = {
    "html", "head", "meta", "title", "style", "body", "main", "section", "h1", "h2", "p", "strong", "figure", "img",
    "div", "table", "thead", "tbody", "tr", "th", "td", "ul", "li", "details", "summary", "pre", "span",
}  # fmt: skip


class Read(HTMLParser):
    """Tags, attributes and text; raises where a tag is not closed in order."""

    def __init__(self, text: str) -> None:
        super().__init__(convert_charrefs=True)
        self.open: list[str] = []
        self.tags: list[tuple[str, dict[str, str | None]]] = []
        self.words: list[str] = []
        self.feed(text)
        self.close()
        assert self.open == []

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        self.tags.append((tag, dict(attrs)))
        if tag not in _VOID:
            self.open.append(tag)

    def handle_endtag(self, tag: str) -> None:
        assert self.open.pop() == tag

    def handle_data(self, data: str) -> None:
        if "style" not in self.open:
            self.words.append(data)

    @property
    def text(self) -> str:
        return " ".join(" ".join(self.words).split())


BOTH = pytest.mark.parametrize("make", [page, static_html])


@cache
def html_of(make: Callable[[Examination], str], name: str, n: int, *only: str) -> str:
    """One page or copy, made once."""
    return make(examined(name, n, *only))


@BOTH
@pytest.mark.parametrize(("name", "n"), [("fan", 40), ("bowl", 40), ("hostile", 60)])
def test_tags_close_in_order_and_nothing_but_our_own_stands_there(
    make: Callable[[Examination], str], name: str, n: int
) -> None:
    read = Read(html_of(make, name, n, *QUICK))
    assert {tag for tag, _ in read.tags} <= _OURS
    allowed = {"class", "scope", "src", "alt", "width", "lang", "charset", "name", "content"}
    assert {key for _, attrs in read.tags for key in attrs} <= allowed
    assert all((a.get("class") or "batten-").startswith("batten-") for _, a in read.tags)


@BOTH
def test_hostile_names_are_shown_letter_by_letter(make: Callable[[Examination], str]) -> None:
    read = Read(html_of(make, "hostile", 60, *QUICK))
    assert '_<b>cost</b> & "fuss" $\\bad{$ of every single casting' in read.text
    assert "<img src=x onerror=alert(1)>" in read.text
    assert HOSTILE["covariate"] in read.text
    assert all(str(a["src"]).startswith("data:image/png;base64,") for tag, a in read.tags if tag == "img")


@BOTH
def test_every_figure_says_in_words_what_it_shows(make: Callable[[Examination], str]) -> None:
    read = Read(html_of(make, "fan", 40, *QUICK))
    pictures = [attrs for tag, attrs in read.tags if tag == "img"]
    assert pictures
    assert all(len(str(attrs["alt"])) > 60 for attrs in pictures)
    assert all(int(str(attrs["width"])) <= 800 for attrs in pictures)


@pytest.mark.parametrize(("name", "n"), [("fan", 40), ("fan", 300), ("plateau", 3000)])
def test_the_static_copy_stays_under_300_kilobytes(name: str, n: int) -> None:
    only = QUICK if n == 3000 else ()
    assert len(html_of(static_html, name, n, *only).encode()) < 300_000


@BOTH
def test_the_first_screen_comes_first_and_in_order(make: Callable[[Examination], str]) -> None:
    exam = examined("fan", 40, *QUICK)
    text = Read(html_of(make, "fan", 40, *QUICK)).text
    parts = [
        headline(exam), "Over the central 90%", "Rows with mass_kg of 25 kg", "A difference between rows",
        "held-out error, min (mean)", "Why ", exam.choice.reasons[0], "How this was computed",
    ]  # fmt: skip
    places = [text.index(part) for part in parts]
    assert places == sorted(places)


@BOTH
def test_all_that_were_tried_or_refused_and_the_script_are_there(make: Callable[[Examination], str]) -> None:
    exam = examined("fan", 40, *QUICK)
    html = html_of(make, "fan", 40, *QUICK)
    text = Read(html).text
    assert all(key in text for key in exam)
    assert all(words in text for words in exam.refused["instead"])
    assert "import statsmodels.formula.api as smf" in text
    script = re.search(r'<pre class="batten-code">(.*?)</pre>', html, re.DOTALL)
    assert script is not None
    assert script[1].count("\n") == exam.code().count("\n")


def test_the_static_copy_leaves_the_notebooks_table_of_contents_alone() -> None:
    assert not {tag for tag, _ in Read(html_of(static_html, "fan", 40, *QUICK)).tags} & {"h1", "h2", "h3"}


def test_a_page_says_its_language_and_title_and_has_one_headline() -> None:
    read = Read(html_of(page, "fan", 40, *QUICK))
    assert ("html", {"lang": "en"}) in read.tags
    assert [tag for tag, _ in read.tags].count("h1") == 1
    assert read.text.startswith("minutes on mass_kg")


def test_a_saved_page_needs_no_other_file(tmp_path: Path) -> None:
    exam = examined("fan", 40, *QUICK)
    exam.save_report(tmp_path / "report.html")  # type: ignore[arg-type]
    text = (tmp_path / "report.html").read_text(encoding="utf-8")
    assert not re.search(r'(src|href)="(?!data:)', text)
    assert "@import" not in text
    assert "url(" not in text
    save_page(exam, tmp_path / "again.html")
    assert (tmp_path / "again.html").read_text(encoding="utf-8") == text


def test_styles_follow_the_notebooks_theme_and_have_a_fallback_without_one() -> None:
    css = html_of(static_html, "fan", 40, *QUICK).partition("<style>")[2].partition("</style>")[0]
    used = re.findall(r"var\((--jp-[\w-]+)(,?)", css)
    assert used
    assert all(comma for _, comma in used)
    assert 'body[data-jp-theme-light="false"]' in css
    selectors = [part.strip() for part in re.findall(r"([^{}]+)\{", css) if "@" not in part]
    assert all(".batten-" in part for selector in selectors for part in selector.split(","))
