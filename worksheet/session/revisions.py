"""Revisions for both front ends: recording, listing, and two states of a project laid side by side."""

from __future__ import annotations

import datetime
from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path

from worksheet.compare.compared import Comparison, State, compare
from worksheet.history import own, repository, revisions
from worksheet.history import record as recording
from worksheet.history.outcome import Person, Refused, RefusedError
from worksheet.history.repository import Repository
from worksheet.model.problem import Problem
from worksheet.model.text import clean
from worksheet.project.discover import load
from worksheet.report import revisions_plain, wording
from worksheet.review.results import Review
from worksheet.session.laying import laid
from worksheet.session.listing import history, names, refusal, repository_of
from worksheet.session.reading import FileReading, Shelf
from worksheet.session.reviewing import Reviewing
from worksheet.session.workbook import Workbook

WORKING = "working"
"""The files as they stand, instead of a revision."""

_MOST_LINES = 40


def identity(root: Path) -> str:
    """Who works here, as git knows it; "" where it does not or there is no repository."""
    found = repository_of(root)
    if isinstance(found, Problem):
        return ""
    try:
        return found.identity().name
    except RefusedError:
        return ""


@dataclass(frozen=True, slots=True)
class Outcome:
    """What came of a record: the new revision's id, "" where nothing had changed, and what there is to say."""

    revision: str
    remarks: tuple[str, ...]


def record(root: Path, note: str, today: datetime.date, person: Person | None = None) -> Outcome | Problem:
    """Save the project's own files as a revision, with a digest of what moved and which verdicts turned.

    Args:
        root: The project folder.
        note: Why.
        today: For waivers with an end.
        person: Who records, where git does not know.
    """
    found = repository.create(root)
    if isinstance(found, Refused):
        return refusal(found, root)
    files = own.own_files(root)
    deleted = recording.gone(found, files)
    if isinstance(deleted, Refused):
        return refusal(deleted, root)
    body = _digest(root, today)
    made = recording.record(found, files, deleted, note=note, body=body, person=person)
    if isinstance(made, Refused):
        return refusal(made, root)
    remarks = (*(f"{left.path}: {left.reason}" for left in made.left_out), *made.remarks)
    return Outcome(made.revision if isinstance(made, recording.Recorded) else "", remarks)


@dataclass(frozen=True, eq=False, slots=True)
class Compared:
    """Two states by name, and what differs."""

    old: str
    new: str
    comparison: Comparison
    problems: tuple[Problem, ...]


def compared(
    root: Path, old: str | None, new: str, today: datetime.date, deep: bool | None = None
) -> Compared | Problem:
    """Compare two revisions of a project, or a revision with the files as they stand.

    Args:
        root: The project folder.
        old: A revision; the newest one where None.
        new: A revision, or WORKING.
        today: For waivers with an end.
        deep: Whether causes and needs are wanted, see compare.
    """
    found = repository_of(root)
    if isinstance(found, Problem):
        return found
    reader = _Reader(today)
    before = _state(found, root, old or "HEAD", reader)
    after = _state(found, root, new, reader)
    for state in (before, after):
        if isinstance(state, Problem):
            return state
    assert isinstance(before, tuple)
    assert isinstance(after, tuple)
    problems = (*before[1].review.problems, *after[1].review.problems)
    return Compared(before[0], after[0], compare(before[1], after[1], deep), problems)


def state(root: Path, name: str, today: datetime.date) -> tuple[str, State] | Problem:
    """One state of a project, reviewed.

    Args:
        root: The project folder.
        name: A revision, or WORKING.
        today: For waivers with an end.
    Returns: (the revision's id or WORKING, the state)
    """
    reader = _Reader(today)
    if name == WORKING:
        return WORKING, reader.state(root)
    found = repository_of(root)
    return found if isinstance(found, Problem) else _state(found, root, name, reader)


def files(root: Path, name: str) -> Mapping[str, bytes] | Problem:
    """The project's own files at a revision, evidence left out, by path within the project."""
    found = repository_of(root)
    if isinstance(found, Problem):
        return found
    revision = revisions.resolve(found, name)
    content = revision if isinstance(revision, Refused) else revisions.read_files(found, revision)
    return refusal(content, root) if isinstance(content, Refused) else content.files


class _Reader:
    """Reads and reviews states of one project; what two of them share is parsed and worked out once."""

    def __init__(self, today: datetime.date) -> None:
        self._today = today
        self._shelf, self._reviewing = Shelf(), Reviewing()

    def state(self, root: Path) -> State:
        """The project in a folder, reviewed."""
        project = load(root, FileReading(self._shelf))
        evaluator = self._reviewing.evaluator(project)
        return State(project, self._reviewing.review(project, evaluator, self._today), evaluator)


def _state(found: Repository, root: Path, name: str, reader: _Reader) -> tuple[str, State] | Problem:
    if name == WORKING:
        return WORKING, reader.state(root)
    revision = revisions.resolve(found, name)
    if isinstance(revision, Refused):
        return refusal(revision, root)
    files = revisions.read_files(found, revision)
    if isinstance(files, Refused):
        return refusal(files, root)
    with laid(files.files) as folder:
        return revision, reader.state(folder)


def _digest(root: Path, today: datetime.date) -> str:
    """What moved since the newest revision and which verdicts turned, as plain lines for the message."""
    found = compared(root, None, WORKING, today, deep=False)
    if isinstance(found, Problem):
        return _first(Workbook.read(root).review(today))
    lines = [revisions_plain.movement(m) for m in (*found.comparison.project, *found.comparison.process)]
    for sheet in found.comparison.sheets:
        lines.append(f"{sheet.sheet}: {sheet.status}")
        lines += [f"  {revisions_plain.movement(m)}" for m in sheet.inputs]
        for result in sheet.results:
            if result.old_verdict != result.new_verdict:
                shown = [wording.metric_number(result.metric, v, result.unit) for v in (result.old, result.new)]
                verdicts = f"{result.old_verdict or 'no target'} -> {result.new_verdict or 'no target'}"
                lines.append(f"  {result.metric}: {verdicts} ({shown[0]} -> {shown[1]})")
    more = [f"and {len(lines) - _MOST_LINES} more"] if len(lines) > _MOST_LINES else []
    return clean("\n".join([*lines[:_MOST_LINES], *more]), lines=True)


def _first(review: Review) -> str:
    counts = {v: sum(s.count(v) for s in review.sheets) for v in ("met", "missed", "unknown", "waived")}
    said = ", ".join(f"{count} {verdict}" for verdict, count in counts.items() if count)
    return f"{len(review.sheets)} blocks; targets: {said or 'none'}"


__all__ = [
    "WORKING",
    "Compared",
    "Outcome",
    "compared",
    "files",
    "history",
    "identity",
    "names",
    "record",
    "refusal",
    "repository_of",
    "state",
]
