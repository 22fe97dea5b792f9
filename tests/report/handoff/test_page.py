"""What a page consists of: what a reader needs to find the way, nothing that acts, nothing that is fetched."""

from __future__ import annotations

import csv
import io
import itertools
import re
from pathlib import Path

import pytest
from markdown_it import MarkdownIt

from tests.report.handoff.conftest import handed
from tests.report.handoff.hostile import write_hostile
from tests.report.handoff.reading import Page
from worksheet.report import wording
from worksheet.report.handoff import html

BLOCKS = 7
MEGABYTE = 1_000_000

MATHS = re.compile("math|m(row|i|n|o|text|space|sub|sup|subsup|frac|sqrt|root|over|under|underover|tr|td|style|padded)")
"""Elements of MathML Core (W3C) that a page may hold."""

PLAIN = re.compile(
    "html|head|meta|title|style|body|a|main|nav|ul|li|p|h[1-5]|div|span|data|table|caption|thead|tbody|tr|th|td|figure|"
    "figcaption|pre|img|footer|section|strong|wbr"
)
ATTRIBUTES = re.compile(
    "lang|charset|http-equiv|content|name|class|href|id|aria-label|tabindex|role|scope|value|data-of|alt|src|alttext|"
    "display|mathvariant|linethickness|stretchy"
)


@pytest.fixture(scope="module")
def hostile(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A hand-off of a project that is full of markup, as a whole and of its block."""
    root, into = write_hostile(tmp_path_factory.mktemp("hostile")), tmp_path_factory.mktemp("taken")
    handed(root, into)
    handed(root, into, "lamp")
    return into


def test_headings_lead_through_the_page_without_a_gap(page: Page) -> None:
    levels = [level for level, _, _ in page.headings]
    assert levels[0] == 1
    assert levels.count(1) == 1
    assert all(after <= before + 1 for before, after in itertools.pairwise(levels))
    names = [name for _, name, _ in page.headings]
    assert all(names)
    assert len(set(names)) == len(names)
    assert all(text.strip() for _, _, text in page.headings)


def test_a_reader_is_told_language_title_places_and_pictures(page: Page) -> None:
    assert page.named("html") == [{"lang": "en"}]
    assert page.title == "Tide gauge readout: hand-off"
    assert len(page.named("main")) == len(page.named("footer")) == 1
    assert page.named("a")[0] == {"class": "skip", "href": "#main"}
    pictures = page.named("img")
    assert len(pictures) >= 4 * BLOCKS - 2
    assert all(len(picture["alt"] or "") > 40 for picture in pictures)


def test_tables_have_captions_and_headers_with_scope(page: Page) -> None:
    assert len(page.tables) > 8 * BLOCKS
    for table in page.tables:
        assert table.caption.strip()
        assert set(table.scopes) == {"col", "row"}
        assert len({len(row) for row in table.rows}) == 1


def test_links_stay_in_the_page(page: Page) -> None:
    names = {attributes["id"] for _, attributes in page.elements if "id" in attributes}
    links = [link["href"] for link in page.named("a")]
    assert len(links) > BLOCKS
    assert all(link is not None and link.startswith("#") and link[1:] in names for link in links)


def test_the_page_says_what_its_numbers_are(page: Page, folder: Path) -> None:
    assert wording.STANDING in page.text
    assert "local codes and licensed practice" in page.text
    assert wording.STANDING.replace("-", "\\-") in (folder / "handoff.md").read_text("utf-8").replace("-", "\\-")


def _harmless(page: Page) -> None:
    """Nothing acts and nothing is fetched, whatever the texts say."""
    policy = [m["content"] for m in page.named("meta") if m.get("http-equiv")]
    assert policy == [html.POLICY]
    assert "default-src 'none'" in html.POLICY
    assert "script-src" not in html.POLICY
    for tag, attributes in page.elements:
        assert PLAIN.fullmatch(tag) or MATHS.fullmatch(tag), tag
        assert all(map(ATTRIBUTES.fullmatch, attributes)), (tag, attributes)
    assert [m["http-equiv"] for m in page.named("meta") if "http-equiv" in m] == ["Content-Security-Policy"]
    assert all((picture["src"] or "").startswith("data:image/svg+xml;base64,") for picture in page.named("img"))
    assert all((link["href"] or "").startswith("#") for link in page.named("a"))


def test_a_page_holds_nothing_that_acts(page: Page) -> None:
    _harmless(page)


@pytest.mark.parametrize("name", ["handoff", "handoff-lamp"])
def test_markup_in_a_sheet_shows_itself_and_does_nothing(hostile: Path, name: str) -> None:
    source = (hostile / f"{name}.html").read_text("utf-8")
    page = Page(source)
    _harmless(page)
    assert page.text.count("<script>document.title='taken'</script>") > 8
    assert "\x1b" not in source
    assert "\u202e" not in source


@pytest.mark.parametrize("name", ["handoff", "handoff-lamp"])
def test_markup_in_a_sheet_does_nothing_in_markdown(hostile: Path, name: str) -> None:
    source = (hostile / f"{name}.md").read_text("utf-8")
    made = Page(MarkdownIt("commonmark", {"html": True}).enable("table").render(source))
    assert all(PLAIN.fullmatch(tag) or tag in ("em", "hr", "code") for tag, _ in made.elements)
    assert not made.named("a", "img", "script")
    assert "\x1b" not in source


@pytest.mark.parametrize("name", ["handoff", "handoff-lamp"])
def test_no_cell_is_a_formula_to_a_spreadsheet(hostile: Path, name: str) -> None:
    text = (hostile / f"{name}.csv").read_bytes().decode()
    rows = list(csv.reader(io.StringIO(text, newline="")))
    assert {len(row) for row in rows} == {8}
    assert any("HYPERLINK" in cell for row in rows for cell in row)
    for row in rows[1:]:
        for place, cell in enumerate(row):
            if cell[:1] in ("=", "+", "-", "@", "\t", "\r"):
                assert place == 5 or re.fullmatch(r"[+-]([\d.]+[\w %/°]*)?", cell), cell
        assert row[5] == "" or float(row[5]) == float(row[5])


def test_the_same_project_on_the_same_day_makes_the_same_bytes(tmp_path: Path) -> None:
    root = write_hostile(tmp_path / "project")
    first, second = tmp_path / "first", tmp_path / "second"
    for into in (first, second):
        handed(root, into)
    assert sorted(p.name for p in first.iterdir()) == sorted(p.name for p in second.iterdir())
    assert all((second / path.name).read_bytes() == path.read_bytes() for path in first.iterdir())


def test_a_page_is_small_enough_to_be_sent(folder: Path) -> None:
    whole = sum(path.stat().st_size for path in folder.iterdir())
    assert whole / BLOCKS < 2 * MEGABYTE
    assert whole * 30 / BLOCKS < 10 * MEGABYTE


def test_every_block_of_the_page_has_every_part(page: Page) -> None:
    parts = ("stage", "weakest", "remarks", "targets", "windows", "algebra", "operating", "sizes", "waivers")
    names = {name for _, name, _ in page.headings}
    blocks = {name.removesuffix("-targets") for name in names if name.endswith("-targets")}
    assert len(blocks) == BLOCKS
    assert {f"{block}-{part}" for block in blocks for part in parts} <= names
    assert len(page.named("math")) > 2 * BLOCKS
