"""What the app works out for a book off the event loop: the review first, then what the open sheet needs."""

from __future__ import annotations

import datetime
from collections.abc import Callable, Mapping
from dataclasses import dataclass, field
from typing import Any

from worksheet.model.keys import Key
from worksheet.model.problem import Problem
from worksheet.model.quantity import format_quantity
from worksheet.review.results import Review, SheetReview
from worksheet.session.session import Session
from worksheet.session.snapshot import Snapshot
from worksheet.solver.results import Bound, Solved, Window


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


@dataclass(frozen=True, eq=False)
class Bounded:
    """The windows of one sheet, which are found long before its proposal."""

    name: str
    windows: Mapping[str, Window]


def needs_of(session: Session, snapshot: Snapshot, name: str, early: Callable[[Bounded], None]) -> Needed:
    """Solve one sheet of a snapshot; `early` is handed its windows while the rest is looked for."""
    from worksheet.session.needs import Needs

    evaluator = session.evaluator(snapshot)
    if evaluator is None or name not in snapshot.project.sheets:
        return Needed(snapshot.revision, name)
    found = Needs.at(session.root, evaluator, name, early=lambda windows: early(Bounded(name, windows)))
    if isinstance(found, list):
        return Needed(snapshot.revision, name, problems=tuple(found))
    return Needed(snapshot.revision, name, found.solved, found.proposal())


@dataclass(frozen=True, eq=False)
class Hands:
    """Formulas by hand of a sheet's bounds, in words, by (variable, target, side)."""

    revision: int
    name: str
    texts: Mapping[tuple[str, str, str], str]


def hands_of(session: Session, snapshot: Snapshot, name: str, wanted: Callable[[], bool]) -> Hands:
    """Find the algebra of every bound. `wanted` tells, between two bounds, whether it is still worth while."""
    from worksheet.session.needs import Needs

    texts: dict[tuple[str, str, str], str] = {}
    evaluator = session.evaluator(snapshot)
    found = None if evaluator is None else Needs.at(session.root, evaluator, name)
    if isinstance(found, Needs):
        for window in found.solved.needed.values():
            for bound in window.bounds:
                if not wanted():
                    return Hands(snapshot.revision, name, texts)
                text = _in_words(found.keys[window.name], bound, found.hand(window, bound))
                if text:
                    texts[window.name, bound.target, bound.side] = text
    return Hands(snapshot.revision, name, texts)


def _in_words(key: Key, bound: Bound, said: Mapping[str, Any]) -> str:
    sign = "≥" if bound.side == "low" else "≤"
    where = "".join(f", {one}" for one in said.get("where", ()))
    if said["method"] == "closed form":
        return f"{key.symbol} {sign} {said['formula']}{where}"
    hand = said.get("hand")
    if not hand or key.dimension is None:
        return ""
    neglects = f"; neglects {', '.join(hand['neglects'])}" if hand["neglects"] else ""
    value = format_quantity(hand["value"], key.dimension, 3)
    return f"by hand {key.symbol} {sign} {hand['formula']} = {value}{where}{neglects}"


def today() -> datetime.date:
    """The day where the user is; decides which waivers have ended."""
    return datetime.datetime.now().astimezone().date()
