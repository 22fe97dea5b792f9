"""A review in words: at 80 columns nothing is lost that a wide terminal shows, and what is wrong is said."""

from __future__ import annotations

import datetime
from pathlib import Path

import pytest

from tests.cli import books
from tests.cli.books import FOLLOWER, replaced
from tests.paths import TOP
from worksheet.report import review_text, wording
from worksheet.session.workbook import Workbook

SAMPLE = TOP / "sample_projects" / "tide_gauge"
TODAY = datetime.date(2026, 12, 1)


def said(book: Path, width: int = 80) -> list[str]:
    return list(review_text.text(Workbook.read(book).review(TODAY), width))


@pytest.mark.parametrize("width", [80, 100, 109, 110, 120, 200])
def test_no_line_is_wider_than_the_terminal(width: int) -> None:
    assert max(map(len, said(SAMPLE, width))) <= width


def test_where_a_value_is_worst_is_said_at_every_width() -> None:
    wide = "\n".join(said(SAMPLE, 120))
    assert "where" in wide
    assert "slow 60 °C 1.62 V" in wide
    narrow = said(SAMPLE)
    assert not any(line.split()[-1:] == ["where"] for line in narrow)
    assert "  dc_gain: worst at slow 60 °C 1.62 V" in narrow


def test_every_target_of_every_sheet_has_its_row() -> None:
    result = Workbook.read(SAMPLE).review(TODAY)
    text = said(SAMPLE)
    for sheet in result.sheets:
        start = next(k for k, line in enumerate(text) if line.startswith(f"{sheet.sheet.name}:"))
        rows = [line.split() for line in text[start + 2 : start + 2 + len(sheet.targets)]]
        assert [row[0] for row in rows] == [t.target.name for t in sheet.targets]
        assert [row[-1].lower() for row in rows] == [t.verdict for t in sheet.targets]


def test_the_unit_of_two_limits_is_given_once() -> None:
    assert any("0.68 to 0.74 V/V" in line for line in said(SAMPLE))


def test_what_does_not_hold_is_said_with_how_much_and_where(tmp_path: Path) -> None:
    text = replaced(FOLLOWER, 'input_level = { value = "1.1 V", source = "sensor" }', 'input_level = "1.75 V"')
    lines = said(books.write(tmp_path, text))
    (line,) = [line for line in lines if line.startswith("  not valid: main outside its range by")]
    assert "50 mV" in line
    assert "bandwidth: 4 of 8 points are not valid" in "\n".join(lines)


def test_a_rating_that_is_passed_brings_its_caution(tmp_path: Path) -> None:
    rated = books.PROCESS.replace('max_voltage = "1.98 V"', 'max_voltage = "1.75 V"')
    text = " ".join(" ".join(said(books.write(tmp_path, process=rated))).split())
    assert "past its voltage rating by" in text
    assert wording.CAUTION in text
    assert wording.CAUTION not in " ".join(said(SAMPLE))


def test_every_review_says_what_it_is() -> None:
    assert " ".join(" ".join(said(SAMPLE)).split()).endswith(wording.STANDING)


@pytest.mark.parametrize(
    ("value", "text"),
    [
        (None, "-"),
        (-0.06, "-6.0%"),
        (0.0, "+0.0%"),
        (-1e-9, "+0.0%"),
        (0.4999, "+50.0%"),
        (3.333, "+333%"),
        (11.8, "+12x"),
        (-25.0, "-25x"),
    ],
)
def test_a_margin_has_a_sign_and_a_size(value: float | None, text: str) -> None:
    assert wording.margin(value) == text
