"""A review meeting, first decision to minutes: what was decided is in the sheets, the page and the revision."""

from __future__ import annotations

import datetime
from pathlib import Path

import pytest

from tests.cli import books
from tests.history.repositories import git
from tests.support import run
from worksheet.model.problem import Problem
from worksheet.review.agenda import Why, agenda
from worksheet.review.results import SheetReview
from worksheet.session import deciding, meeting, revisions
from worksheet.session.edits import Request
from worksheet.session.session import Session

TODAY = datetime.date(2026, 12, 1)
MISSES = books.replaced(books.FOLLOWER, 'min = "5 MHz"', 'min = "500 MHz"')


@pytest.fixture
def book(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    monkeypatch.setenv("HOME", str(tmp_path))
    for who in ("AUTHOR", "COMMITTER"):
        monkeypatch.setenv(f"GIT_{who}_NAME", "M. Roe")
        monkeypatch.setenv(f"GIT_{who}_EMAIL", "roe@example.org")
    made = books.write(tmp_path / "book", MISSES)
    found = revisions.record(made, "Before the meeting", TODAY)
    assert not isinstance(found, Problem)
    return made


def apply(session: Session, request: Request) -> None:
    outcome = session.apply(request)
    assert outcome.accepted, outcome.problems


def block(session: Session) -> SheetReview:
    review = session.review(session.snapshot(), TODAY)
    return next(one for one in review.sheets if one.sheet.name == books.BUFFER)


def decide(session: Session) -> None:
    """Everything that a meeting can decide, once."""
    apply(session, deciding.waive(books.BUFFER, "bandwidth", "M. Roe", "slow lamps", TODAY, "4 MHz", TODAY))
    apply(session, deciding.remark(books.BUFFER, "M. Roe", "Which sensor?", TODAY, "T. Vik", "assume.input_level"))
    apply(session, deciding.settle(books.BUFFER, 0, "T. Vik", "The old one.", TODAY))
    path = ("assume", "input_level")
    apply(session, deciding.check(books.BUFFER, path, "T. Vik", TODAY, "agreed"))
    apply(session, deciding.accept(books.BUFFER, block(session).basis, "M. Roe", TODAY, "with the waiver"))
    apply(session, deciding.send_back(books.OTHER, "M. Roe", "Simulate it.", TODAY, "T. Vik"))


def test_decisions_land_in_the_sheets(book: Path) -> None:
    session = Session(book)
    decide(session)
    found = block(session)
    assert (found.state, found.state_reason) == ("accepted", None)
    assert found.sheet.assume["input_level"].trust == "agreed"
    assert found.sheet.assume["input_level"].source == "sensor"
    assert not found.sheet.remarks[0].open
    items = agenda(session.review(session.snapshot(), TODAY), TODAY)
    assert [item.why for item in items if item.sheet == books.BUFFER] == [Why.MISSED, Why.NO_EVIDENCE] or [
        item.why for item in items if item.sheet == books.BUFFER
    ] == [Why.WAIVED, Why.NO_EVIDENCE]


def test_every_decision_can_be_taken_back(book: Path) -> None:
    before = {path: path.read_bytes() for path in (book / "sheets").iterdir()}
    session = Session(book)
    decide(session)
    while session.snapshot().undo:
        assert session.undo().accepted
    assert {path: path.read_bytes() for path in (book / "sheets").iterdir()} == before


def test_the_end_of_a_meeting_is_a_page_and_a_revision(book: Path) -> None:
    start = meeting.since(book, "HEAD", TODAY)
    assert isinstance(start, meeting.Start)
    decide(Session(book))
    closed = meeting.close(book, start, TODAY, present="M. Roe, T. Vik")
    assert isinstance(closed, meeting.Closed)
    assert [(one.sheet, one.about, one.what, one.by) for one in closed.decided] == [
        (books.OTHER, "", "remark to T. Vik", "M. Roe"),
        (books.BUFFER, "", "accepted", "M. Roe"),
        (books.BUFFER, "bandwidth", "waived until 2026-12-01", "M. Roe"),
        (books.BUFFER, "assume.input_level", "remark to T. Vik", "M. Roe"),
        (books.BUFFER, "assume.input_level", "remark settled", "T. Vik"),
        (books.BUFFER, "assume.input_level", "checked, trust none -> agreed", "T. Vik"),
    ]
    page = git(book, "show", f"{closed.revision}:{closed.file}")
    assert page == (book / closed.file).read_text("utf-8").rstrip("\n")
    for one in closed.decided:
        assert one.what.replace("->", "-\\>") in page
    assert "slow lamps" in page
    assert "Which sensor?" in page
    assert "Present: M. Roe, T. Vik" in page
    assert "to be confirmed with the foundry's qualified models" in page
    assert "sheets/buffer.toml" in git(book, "show", "--name-only", "--format=", closed.revision)


def test_a_second_meeting_on_a_day_has_a_page_of_its_own(book: Path) -> None:
    start = meeting.since(book, "HEAD", TODAY)
    assert isinstance(start, meeting.Start)
    first, second = (meeting.close(book, start, TODAY) for _ in range(2))
    assert isinstance(first, meeting.Closed)
    assert isinstance(second, meeting.Closed)
    assert first.file != second.file


def test_without_git_the_minutes_are_written_and_it_is_said(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setenv("PATH", str(tmp_path))
    book = books.write(tmp_path / "book", MISSES)
    session = Session(book)
    start = meeting.Start(session.snapshot().project.sheets)
    decide(session)
    closed = meeting.close(book, start, TODAY)
    assert isinstance(closed, meeting.Closed)
    assert closed.revision == ""
    assert "git" in " ".join(closed.remarks)
    assert (book / closed.file).exists()


def test_what_users_wrote_is_shown_in_the_minutes_and_does_nothing(book: Path) -> None:
    start = meeting.since(book, "HEAD", TODAY)
    assert isinstance(start, meeting.Start)
    nasty = "<script>alert(1)</script> | [x](javascript:1) `a` \x1b[31m\u202e **b**"
    apply(Session(book), deciding.remark(books.BUFFER, nasty, nasty, TODAY, nasty, nasty))
    text, _ = meeting.minutes(book, start, TODAY)
    assert "<script" not in text.replace("\\<script", "")
    assert "\x1b" not in text
    assert "\u202e" not in text
    row = next(line for line in text.splitlines() if line.startswith("| buffer |") and "alert" in line)
    assert row.replace("\\|", "").count("|") == 6


def test_the_commands_tell_the_same(book: Path) -> None:
    decide(Session(book))
    agenda_said = run("agenda", str(book))
    assert agenda_said.status == 1
    assert "bandwidth" in agenda_said.out
    assert run("agenda", str(book), "nobody").status == 2
    said = run("minutes", str(book))
    assert said.status == 0
    assert "accepted" in said.out
    closed = run("minutes", str(book), "--close", "--present", "M. Roe")
    assert closed.status == 0, closed.err
    assert "6 decisions" in closed.out
    assert run("minutes", str(book), "nowhere").status == 2
