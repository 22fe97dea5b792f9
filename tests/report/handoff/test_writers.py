"""Any text, any number: what a writer makes of them reads back as they are, and nothing of a text becomes structure."""

from __future__ import annotations

import csv
import io
import math

import pytest
from hypothesis import given
from hypothesis import strategies as st
from markdown_it import MarkdownIt

from tests.report.handoff.reading import Page as Read
from worksheet.model.text import clean
from worksheet.report.handoff import html, markdown, spread
from worksheet.report.handoff.tree import Builder, Cell, Formula, Lines, Number, Page, Picture, Points, Table, text

SIGNS = st.sampled_from(
    [
        *"<>&\"'`*_[](){}#|~!\\-+=@$:;/% \n\t\r",
        *("<script>", "</td>", "-->", "]]>", "&lt;", "&#60;", "\x00", "\x1b[2J", "\u202e"),
    ]
)
TEXTS = st.lists(SIGNS | st.characters(codec="utf-8"), max_size=24).map("".join)
ELEMENTS = frozenset(
    (
        *(
            "html",
            "head",
            "meta",
            "title",
            "style",
            "body",
            "a",
            "main",
            "h1",
            "p",
            "footer",
            "ul",
            "li",
            "div",
            "table",
        ),
        *("caption", "thead", "tbody", "tr", "th", "td", "data", "span", "figure", "figcaption", "pre", "img", "wbr"),
    )
)
IN_MARKDOWN = frozenset(("h1", "p", "ul", "li", "em", "table", "thead", "tbody", "tr", "th", "td", "pre", "code", "hr"))
NUMBERS = st.floats(allow_nan=False, allow_infinity=False)


def _page(said: str, value: float) -> Page:
    made = Builder()
    made.head(said, "top")
    made.say(said)
    made.add(Points((text(said),)))
    row = (text(said), Cell((said, Number(f"{value:.3g} V", value, "V", said))))
    made.add(Table(said, (said, said), (row,), frozenset({1})))
    made.add(Lines(said, (said,)), Picture("<svg/>", said, said, (said,)))
    return Page(said, said, tuple(made.nodes))


@given(TEXTS, NUMBERS)
def test_a_text_in_html_is_text_and_a_number_comes_back_to_the_last_bit(said: str, value: float) -> None:
    page = Read(html.write(_page(said, value)))
    assert {tag for tag, _ in page.elements} <= ELEMENTS
    shown = clean(said, lines=True)
    assert _bare(page.headings[0][2]) == _bare(shown)
    assert _bare(page.tables[0].rows[1][0]) == _bare(shown)
    (number,) = page.numbers
    assert number.value == value
    assert math.copysign(1.0, number.value) == math.copysign(1.0, value)
    (picture,) = page.named("img")
    assert _bare(picture["alt"] or "") == _bare(shown)


def _bare(said: str) -> str:
    """Without white space, which a page may set otherwise."""
    return "".join(said.split())


@given(TEXTS, NUMBERS)
def test_a_text_in_markdown_is_text(said: str, value: float) -> None:
    made = Read(MarkdownIt("commonmark", {"html": True}).enable("table").render(markdown.write(_page(said, value))))
    assert {tag for tag, _ in made.elements} <= IN_MARKDOWN


@given(TEXTS, NUMBERS)
def test_a_row_of_csv_holds_the_number_and_no_formula(said: str, value: float) -> None:
    rows = list(csv.DictReader(io.StringIO(spread.write(_page(said, value)), newline="")))
    (found,) = rows
    assert float(found["value"]) == value
    assert found["unit"] == "V"
    for key in ("section", "table", "row", "quantity"):
        assert found[key][:1] not in ("=", "@", "\t", "\r")
        assert found[key].lstrip("'") == clean(found[key]).lstrip("'")


@pytest.mark.parametrize(
    "element",
    [
        "<math><script>alert(1)</script></math>",
        "<math><mtext><img src='x'/></mtext></math>",
        "<math><maction>x</maction></math>",
        "<math><annotation-xml encoding='text/html'><b>x</b></annotation-xml></math>",
    ],
)
def test_mathematics_of_unknown_parts_is_refused(element: str) -> None:
    with pytest.raises(ValueError, match="no element of mathematics"):
        html.math(element)


def test_mathematics_keeps_no_attribute_that_acts() -> None:
    element = "<math display='block' onclick='x()' href='javascript:y()'><mi style='z' mathvariant='bold'>a</mi></math>"
    written = html.math(element)
    assert written == '<math display="block"><mi mathvariant="bold">a</mi></math>'


def test_a_formula_says_in_words_what_it_draws() -> None:
    node = Formula("gain", ("<math><mi>A</mi></math>",), (), ("A = g_m/g_d",), text("A = 3"))
    page = Read(html.write(Page("x", "y", (node,))))
    assert page.named("math")[0]["alttext"] == "A = g_m/g_d"
