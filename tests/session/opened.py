"""A session over the invented book, and the bytes of a project's folder."""

from __future__ import annotations

import datetime
from pathlib import Path

from tests.tui.book import write_book
from worksheet.model.problem import Problem
from worksheet.session import fields
from worksheet.session.edits import ChangeSheet, KeyPath, Piece
from worksheet.session.session import Outcome, Session
from worksheet.session.snapshot import Snapshot

TODAY = datetime.date(2026, 11, 20)


def opened(folder: Path) -> Session:
    """A session over a new book."""
    session = Session(write_book(folder / "book"))
    assert session.snapshot().project.problems == ()
    return session


def contents(root: Path) -> dict[str, bytes]:
    """Every file of a folder by its path; left-over temporary files would show here."""
    return {str(path.relative_to(root)): path.read_bytes() for path in sorted(root.rglob("*")) if path.is_file()}


def typed(session: Session, sheet: str, path: KeyPath, text: str) -> Outcome:
    """What comes of a text that is typed at a place; a text that cannot be read there is a problem."""
    place = fields.place(session.snapshot(), sheet, path)
    assert place is not None, path
    pieces = fields.read(place, text)
    if isinstance(pieces, str):
        return Outcome(problems=(Problem("", None, "", pieces),))
    return session.apply(ChangeSheet(sheet, pieces, f"{path[-1]} {text}"))


def put(session: Session, sheet: str, *pieces: Piece) -> Outcome:
    """What comes of some pieces."""
    return session.apply(ChangeSheet(sheet, pieces, "a change"))


def messages(outcome: Outcome) -> str:
    """All problems of an outcome."""
    return "\n".join(map(str, outcome.problems))


def stated(snapshot: Snapshot, sheet: str, *path: str | int) -> object:
    """What a sheet states at a path."""
    from worksheet.session.edits import value_at

    return value_at(snapshot.data(sheet), path)
