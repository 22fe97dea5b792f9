"""The algebra of a number for the screen: worked out off the event loop, laid out for a width, frozen."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

from worksheet.session.session import Session
from worksheet.session.snapshot import Snapshot

if TYPE_CHECKING:
    from worksheet.project.case import Case
    from worksheet.solver.explanation import Explanation, Given

WORST = "worst"
"""Stands for the condition in which a target is worst."""


@dataclass(frozen=True, eq=False)
class Explained:
    """The algebra of one number, or why there is none.

    Attributes:
        asked: What was asked for: revision of the book, name of the number, columns.
        found: Its algebra; None where `reason` says why not.
        lines: The expression as lines of characters.
        simplified: The same with what is small left out, in words and lines; empty where nothing is small.
        reason: Why there is none.
    """

    asked: tuple[int, str, int]
    found: Explanation | None = None
    lines: tuple[str, ...] = ()
    simplified: tuple[str, ...] = ()
    reason: str = ""

    @property
    def given(self) -> tuple[Given, ...]:
        """The numbers put in."""
        return () if self.found is None else self.found.given


def name_of(key: str, condition: int | str = 0) -> str:
    """The name of a number at a condition, for a row's subject."""
    return f"{key}@{condition}"


def explained(
    session: Session, snapshot: Snapshot, sheet: str, asked: tuple[int, str, int], *, plain: bool
) -> Explained:
    """Find the algebra of one number. Loads the algebra, which takes a while the first time.

    Args:
        session: The book.
        snapshot: Its state.
        sheet: The sheet.
        asked: Revision, name (name_of) and columns.
        plain: Whether only ASCII can be shown.
    """
    from worksheet.review.review import solve
    from worksheet.solver.algebra import explain

    key, _, condition = asked[1].rpartition("@")
    evaluator = session.evaluator(snapshot)
    if evaluator is None or sheet not in snapshot.project.sheets:
        return Explained(asked, reason="the sheet cannot be read")
    points, problems = solve(evaluator, sheet)
    if points is None:
        return Explained(asked, reason="; ".join(problem.message for problem in problems))
    index = _worst(session, snapshot, sheet, key, points.case) if condition == WORST else int(condition)
    try:
        found = explain(points.case, key, index)
    except KeyError:
        return Explained(asked, reason=f"there is no algebra of {key}")
    return Explained(asked, found, tuple(found.text(asked[2], not plain)), tuple(_simplified(found, asked[2])))


def _worst(session: Session, snapshot: Snapshot, sheet: str, key: str, case: Case) -> int:
    """The condition in which a target is worst; the nominal one where there is none."""
    from worksheet.tui.recomputed import review_of, today

    result = review_of(session, snapshot, today()).sheet(sheet)
    at = next((one.worst_at for one in result.targets if one.target.name == key), None) if result is not None else None
    conditions = list(case.conditions.conditions)
    return conditions.index(at) if at in conditions else 0


def _simplified(found: Explanation, columns: int) -> list[str]:
    from worksheet.report import wording

    simple = found.simplified
    if simple is None:
        return []
    names = ", ".join(effect.name for effect in simple.neglects)
    off = "" if simple.share is None else f", {simple.share:+.2%} off"
    said = f"without {names}: {wording.number(simple.value, found.unit)}{off}"
    return [said, *(one for one in simple.lines if len(one) <= columns)]
