"""A review meeting: what it decides stands in the sheets at once; its end is a page of minutes and a revision."""

from __future__ import annotations

import datetime
from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path

from worksheet.compare.decisions import Decision, decisions
from worksheet.history.outcome import Person
from worksheet.model.problem import Problem
from worksheet.model.sheet import Sheet
from worksheet.report import minutes as pages
from worksheet.session import revisions
from worksheet.session.edits import FileChange
from worksheet.session.workbook import Workbook
from worksheet.session.writing import Writer

FOLDER = "evidence/minutes"
"""Where minutes are kept: among the project's own files, so that the revision of the meeting carries them."""

_MOST = 99
"""Meetings on one day."""


@dataclass(frozen=True, slots=True)
class Start:
    """What a meeting began with: the sheets as they stood, and the revision that held them ("" for none)."""

    sheets: Mapping[str, Sheet]
    revision: str = ""


@dataclass(frozen=True, slots=True)
class Closed:
    """A meeting's end: the file of its minutes, the decisions in them, the revision ("" where there is none)."""

    file: str
    decided: tuple[Decision, ...]
    revision: str
    remarks: tuple[str, ...] = ()


def since(root: Path, name: str, today: datetime.date) -> Start | Problem:
    """A meeting that is held to have begun with a revision."""
    found = revisions.state(root, name, today)
    if isinstance(found, Problem):
        return found
    revision, state = found
    return Start(state.project.sheets, revision)


def minutes(root: Path, start: Start, today: datetime.date, present: str = "") -> tuple[str, tuple[Decision, ...]]:
    """The page of minutes as Markdown, and the decisions in it.

    Args:
        root: The project folder.
        start: What the meeting began with.
        today: The day of the meeting.
        present: Who was there.
    """
    workbook = Workbook.read(root)
    decided = decisions(start.sheets, workbook.project.sheets)
    review = workbook.review(today)
    lines = pages.minutes(review, decided, today, present=present, revision=start.revision)
    return "\n".join(lines) + "\n", decided


def close(
    root: Path, start: Start, today: datetime.date, *, present: str = "", note: str = "", person: Person | None = None
) -> Closed | Problem:
    """End a meeting: write its minutes and record a revision.

    Without git the minutes are written all the same, and the remarks say why there is no revision.

    Args:
        root: The project folder.
        start: What the meeting began with.
        today: The day of the meeting.
        present: Who was there.
        note: Of the revision; "" for one that counts the decisions.
        person: Who records, where git does not know.
    """
    text, decided = minutes(root, start, today, present)
    file = _free(root, today)
    if file is None:
        return Problem(FOLDER, None, "", f"found minutes of {_MOST} meetings on {today.isoformat()} already")
    stuck = Writer(root).write([FileChange(file, None, text.encode())])
    if stuck:
        return stuck[0]
    said = note or f"Review meeting of {today.isoformat()}: {len(decided)} decisions"
    made = revisions.record(root, said, today, person)
    if isinstance(made, Problem):
        return Closed(file, decided, "", (made.message,))
    return Closed(file, decided, made.revision, made.remarks)


def _free(root: Path, today: datetime.date) -> str | None:
    """A file that does not exist yet for the minutes of a day."""
    names = [today.isoformat(), *(f"{today.isoformat()}-{number}" for number in range(2, _MOST + 1))]
    return next((file for name in names if not (root / (file := f"{FOLDER}/{name}.md")).exists()), None)
