"""Tables and paragraphs in a terminal: never too wide, never out of line, never a sign that cannot be shown."""

from __future__ import annotations

import re

import pytest
from hypothesis import given
from hypothesis import strategies as st

from worksheet.model.text import SIGNS, clean, plain_signs
from worksheet.report.table import Column, Table, cut, lines, on, paper_for, width_of, wrapped

CELLS = st.text(st.characters(codec="utf-8"), max_size=12)


@given(rows=st.lists(st.tuples(CELLS, CELLS, CELLS), max_size=5), width=st.integers(40, 100))
def test_columns_stand_under_each_other(rows: list[tuple[str, ...]], width: int) -> None:
    table = Table((Column("name", flexible=True), Column("number", right=True), Column("end")), tuple(rows))
    found = lines(table, width, "  ")
    assert len(found) == len(rows) + 1
    place = width_of(found[0][: found[0].index("end")])
    for row, line in zip(rows, found[1:], strict=True):
        assert clean(line) == line
        if row[2].strip() and row[2].isascii() and row[2].isprintable():
            assert width_of(line[: len(line) - len(row[2].rstrip())]) >= place - len(row[2])


@given(rows=st.lists(st.tuples(st.text("abcdefgh", min_size=1, max_size=60), st.text("x", max_size=9)), min_size=1))
def test_a_flexible_column_gives_way(rows: list[tuple[str, ...]]) -> None:
    table = Table((Column("name", flexible=True), Column("value", right=True)), tuple(rows))
    for row, line in zip(rows, lines(table, 40)[1:], strict=True):
        assert width_of(line) <= 40
        assert line.startswith(row[0][:6])
        assert row[0] in line or "…" in line


@given(text=st.text("ab ", max_size=200), width=st.integers(30, 80))
def test_a_column_that_wraps_loses_nothing(text: str, width: int) -> None:
    table = Table((Column("key"), Column("said", wraps=True)), (("bandwidth", text),))
    found = lines(table, width)
    words = " ".join(found[1:]).split()
    assert words == ["bandwidth", *text.split()] or "".join(words) == "bandwidth" + "".join(text.split())
    assert all(len(line) <= max(width, 17) for line in found)


def test_gaps_narrow_before_a_name_is_cut() -> None:
    table = Table(
        (Column("name", flexible=True), Column("a"), Column("b")), (("unity_gain_frequency", "x" * 9, "y" * 9),)
    )
    assert lines(table, 42)[1] == "unity_gain_frequency  xxxxxxxxx  yyyyyyyyy"
    assert lines(table, 40)[1] == "unity_gain_frequency xxxxxxxxx yyyyyyyyy"
    assert lines(table, 39)[1] == "unity_gain_frequen… xxxxxxxxx yyyyyyyyy"


@given(text=st.text(st.characters(codec="utf-8"), max_size=40), width=st.integers(2, 30))
def test_a_cut_text_fits(text: str, width: int) -> None:
    found = cut(text, width)
    assert width_of(found) <= max(width, width_of(text) if found == text else width)
    assert found == text or found.endswith("…")


@given(text=st.text(max_size=300), width=st.integers(20, 90))
def test_a_paragraph_is_harmless_and_fits(text: str, width: int) -> None:
    for line in wrapped(text, width, "  "):
        assert clean(line) == line
        assert len(line) <= width


@pytest.mark.parametrize(
    ("encoding", "stated", "plain"),
    [
        ("utf-8", False, False),
        ("utf-8", True, True),
        ("ascii", False, True),
        ("iso8859-1", False, True),
        ("no-such", False, True),
    ],
)
def test_the_paper_is_plain_where_a_sign_is_missing(encoding: str, stated: bool, plain: bool) -> None:
    assert paper_for(encoding, stated).plain is plain


def test_every_sign_has_a_plain_spelling() -> None:
    assert all(spelling.isascii() and spelling for spelling in SIGNS.values())
    assert plain_signs("≥ 1.2 µA, 3 kΩ, 4 nV/√Hz, 5 µm², −40 °C…") == ">= 1.2 uA, 3 kohm, 4 nV/rtHz, 5 um^2, -40 degC~"
    assert plain_signs("漢é") == "漢é"


def test_plain_cells_take_their_width_before_they_are_laid_out() -> None:
    table = Table((Column("a"), Column("b")), (("≥ 5 kΩ", "x"), ("1", "x")))
    with on(paper_for("ascii", plain=False)):
        found = lines(table, 80)
    assert {line.index("x") for line in found[1:]} == {len(">= 5 kohm") + 2}
    assert lines(table, 80)[1] == "≥ 5 kΩ  x"


def test_tones_add_nothing_but_sequences() -> None:
    table = Table(
        (Column("a"), Column("verdict", toned=True)), (("x", "MISSED"), ("y", "met"), ("missed", "waived (1)"))
    )
    plain = lines(table, 80)
    with on(paper_for("utf-8", plain=False, tones={"missed": ("\x1b[1m", "\x1b[0m")})):
        toned = lines(table, 80)
    assert [re.sub(r"\x1b\[[0-9;]*m", "", line) for line in toned] == plain
    assert [("\x1b" in line) for line in toned] == [False, True, False, False]
    assert lines(table, 80) == plain
