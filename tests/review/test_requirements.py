"""Requirements of the specification: which ones a target covers, and which nobody does."""

from __future__ import annotations

import datetime
from pathlib import Path

from tests.cli import books
from worksheet.report import plain, review_text
from worksheet.review.results import Review
from worksheet.session.workbook import Workbook

TODAY = datetime.date(2026, 12, 1)


def reviewed(folder: Path, stated: str, sheet: str = books.FOLLOWER) -> Review:
    return Workbook.read(books.write(folder, sheet, project=books.PROJECT + stated)).review(TODAY)


STATED = '\n[requirement]\nAFE-12 = "Bandwidth of the buffer"\n"4.2.1" = "Life on one battery"\n'


def test_a_requirement_that_no_target_names_is_listed(tmp_path: Path) -> None:
    found = reviewed(tmp_path, STATED)
    assert dict(found.uncovered) == {"AFE-12": "Bandwidth of the buffer", "4.2.1": "Life on one battery"}
    assert plain.review(found)["uncovered"][1] == {"id": "4.2.1", "text": "Life on one battery"}
    assert "  4.2.1: Life on one battery" in list(review_text.text(found, 80))


def test_a_target_covers_a_requirement_by_its_number(tmp_path: Path) -> None:
    sheet = books.replaced(books.FOLLOWER, 'id = "L-1"', 'id = "AFE-12"')
    assert dict(reviewed(tmp_path, STATED, sheet).uncovered) == {"4.2.1": "Life on one battery"}


def test_a_requirement_says_what_it_is(tmp_path: Path) -> None:
    found = reviewed(tmp_path, "\n[requirement]\nAFE-12 = 12\n")
    (problem,) = found.problems
    assert problem.key == "requirement.AFE-12"
    assert problem.line is not None
    assert "12" in problem.message
