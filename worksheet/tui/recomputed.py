"""What the app works out for a book off the event loop: the review first, then what the open sheet needs."""

from __future__ import annotations

import datetime
from collections.abc import Mapping
from dataclasses import dataclass, field

from worksheet.model.problem import Problem
from worksheet.review.results import Review, SheetReview
from worksheet.session.session import Session
from worksheet.session.snapshot import Snapshot
from worksheet.solver.results import Solved


@dataclass(frozen=True, eq=False)
class Needed:
    """What one sheet needs, or why that cannot be said.

    Attributes:
        revision: Of the book that it belongs to.
        name: The sheet.
        solved: Windows, points, conflict; None where `problems` say why not.
        proposal: What taking the proposal over would write, by key. [SI]
        problems: Why there is nothing.
    """

    revision: int
    name: str
    solved: Solved | None = None
    proposal: Mapping[str, float] = field(default_factory=dict)
    problems: tuple[Problem, ...] = ()


@dataclass(frozen=True, eq=False)
class Results:
    """A book's review at one revision."""

    revision: int
    review: Review

    def sheet(self, name: str) -> SheetReview | None:
        """Results of one sheet, None where it has none."""
        return next((one for one in self.review.sheets if one.sheet.name == name), None)


def review_of(session: Session, snapshot: Snapshot, today: datetime.date) -> Results:
    """Review a snapshot."""
    return Results(snapshot.revision, session.review(snapshot, today))


def needs_of(session: Session, snapshot: Snapshot, name: str) -> Needed:
    """Solve one sheet of a snapshot."""
    from worksheet.session.needs import Needs

    evaluator = session.evaluator(snapshot)
    if evaluator is None or name not in snapshot.project.sheets:
        return Needed(snapshot.revision, name)
    found = Needs.at(session.root, evaluator, name)
    if isinstance(found, list):
        return Needed(snapshot.revision, name, problems=tuple(found))
    return Needed(snapshot.revision, name, found.solved, found.proposal())


def today() -> datetime.date:
    """The day where the user is; decides which waivers have ended."""
    return datetime.datetime.now().astimezone().date()
