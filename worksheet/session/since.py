"""What moved since a digest was right: since evidence was found, or since a sheet was accepted."""

from __future__ import annotations

import datetime
from dataclasses import dataclass
from pathlib import Path

from worksheet.compare.compared import State, compare
from worksheet.compare.inputs import Moved
from worksheet.history import revisions as listed
from worksheet.history.outcome import Refused
from worksheet.history.revisions import Files, Revision
from worksheet.model.problem import Problem
from worksheet.review.results import SheetReview
from worksheet.review.review import reviewed
from worksheet.review.state import Past, left_behind
from worksheet.session.laying import laid
from worksheet.session.listing import repository_of
from worksheet.session.workbook import Workbook

MOST = 40
"""Revisions that are looked at, newest first."""


@dataclass(frozen=True, slots=True)
class Moves:
    """What moved since, and the newest revision that had those inputs; "" and nothing where none is known to."""

    past: Past
    revision: str
    moved: tuple[Moved, ...]


class Since:
    """What moved in a project since digests of its sheets were right; each revision is looked at once."""

    def __init__(self, root: Path, today: datetime.date) -> None:
        """Take the project's folder; nothing is looked at yet."""
        self._root, self._today = root, today
        self._revisions: tuple[Revision, ...] | None = None
        self._states: dict[str, Workbook | None] = {}

    def of(self, result: SheetReview) -> tuple[Moves, ...]:
        """What moved since each thing that a sheet's inputs have left behind."""
        found = []
        for past in left_behind(result):
            revision, moved = self.moved(result.sheet.name, past.basis) or ("", ())
            found.append(Moves(past, revision, moved))
        return tuple(found)

    def moved(self, sheet: str, basis: str) -> tuple[str, tuple[Moved, ...]] | None:
        """The newest revision at which a sheet had a digest, and what is stated differently now.

        Returns: (revision, movements); None where no revision had it, or there is no git to ask
        """
        if not basis:
            return None
        for revision in self._every():
            then = self._state(revision)
            if then is None or then.evaluator is None or sheet not in then.project.sheets:
                continue
            result = reviewed(then.evaluator, (sheet,), self._today)[sheet].result
            if result is not None and result.basis == basis:
                return revision.revision, self._between(then, sheet)
        return None

    def _between(self, then: Workbook, sheet: str) -> tuple[Moved, ...]:
        now = Workbook.read(self._root)
        states = [State(one.project, one.review(self._today), one.evaluator) for one in (then, now)]
        found = compare(states[0], states[1], deep=False)
        mine = next((one.inputs for one in found.sheets if one.sheet == sheet), ())
        conditions = tuple(one for one in found.project if one.key.startswith("conditions."))
        return (*(one for one in mine if _moves_results(one.key)), *conditions, *found.process)

    def _every(self) -> tuple[Revision, ...]:
        if self._revisions is None:
            repository = repository_of(self._root)
            found = () if isinstance(repository, Problem) else listed.history(repository, limit=MOST)
            self._revisions = () if isinstance(found, Refused) else found
        return self._revisions

    def _state(self, revision: Revision) -> Workbook | None:
        if revision.revision not in self._states:
            repository = repository_of(self._root)
            content = None if isinstance(repository, Problem) else listed.read_files(repository, revision.revision)
            self._states[revision.revision] = _laid(content) if isinstance(content, Files) else None
        return self._states[revision.revision]


def _moves_results(key: str) -> bool:
    """Whether a key of a sheet is one of those that its digest is made of."""
    head, _, rest = key.partition(".")
    beside = ("source", "trust", "note", "checked", "checked_by", "standard_error")
    if head in ("assume", "own", "choose", "bias"):
        return not rest.endswith(tuple(f".{name}" for name in beside))
    return head in ("stage", "device", "bulk", "solve")


def _laid(content: Files) -> Workbook:
    with laid(content.files) as folder:
        return Workbook.read(folder)
