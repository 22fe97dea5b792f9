"""How far a block is: an accepted sheet falls back when the inputs move that it was accepted for."""

from __future__ import annotations

import datetime
from pathlib import Path

from tests.cli import books
from worksheet.report import plain, review_text
from worksheet.review.results import SheetReview
from worksheet.session.workbook import Workbook

TODAY = datetime.date(2026, 12, 1)


def reviewed(folder: Path, sheet: str) -> SheetReview:
    result = Workbook.read(books.write(folder, sheet)).review(TODAY)
    assert not result.problems
    return next(one for one in result.sheets if one.sheet.name == books.BUFFER)


def accepted(basis: str) -> str:
    stated = f'\n[[acceptance]]\nby = "M. Roe"\nbasis = "{basis}"\ndated = 2026-11-20\n'
    return books.replaced(books.FOLLOWER, "schema = 1\n", 'schema = 1\nstate = "accepted"\n') + stated


def test_it_stays_accepted_for_the_inputs_that_were_accepted(tmp_path: Path) -> None:
    basis = reviewed(tmp_path / "a", books.FOLLOWER).basis
    found = reviewed(tmp_path / "b", accepted(basis))
    assert (found.state, found.state_reason) == ("accepted", None)
    retitled = books.replaced(accepted(basis), "Lamp buffer", "Lamp driver")
    assert reviewed(tmp_path / "c", retitled).state == "accepted"


def test_it_falls_back_when_an_input_moves(tmp_path: Path) -> None:
    basis = reviewed(tmp_path / "a", books.FOLLOWER).basis
    moved = books.replaced(accepted(basis), '"4 uA"', '"5 uA"')
    found = reviewed(tmp_path / "b", moved)
    assert found.state == "for-review"
    assert found.state_reason == "accepted by M. Roe on 2026-11-20 for inputs that have moved since"
    data = plain.sheet(found)
    assert (data["state"], data["stated_state"]) == ("for-review", "accepted")
    assert data["state_reason"] == found.state_reason


def test_an_acceptance_that_nobody_signed_is_said(tmp_path: Path) -> None:
    sheet = books.replaced(books.FOLLOWER, "schema = 1\n", 'schema = 1\nstate = "accepted"\n')
    found = reviewed(tmp_path, sheet)
    assert found.state == "accepted"
    assert found.state_reason is not None
    assert "by whom" in found.state_reason


def test_open_remarks_are_shown_and_settled_ones_are_not(tmp_path: Path) -> None:
    remarks = (
        '\n[[remark]]\nby = "A"\nto = "B"\nabout = "target.bandwidth"\ntext = "Which load?"\n'
        '\n[[remark]]\nby = "A"\ntext = "Done"\nsettled = 2026-11-21\n'
    )
    book = books.write(tmp_path, books.FOLLOWER + remarks)
    text = "\n".join(review_text.text(Workbook.read(book).review(TODAY), 80))
    assert "open remark about target.bandwidth by A, to B: Which load?" in text
    assert "Done" not in text
