"""What a review meeting has to decide: of everything that was reviewed, what does not speak for itself.

One item a target, evidence, waiver, state, budget or requirement that wants a decision; a target that is missed after
its waiver ended is one item and not two.
"""

from __future__ import annotations

import datetime
from collections.abc import Iterator
from dataclasses import dataclass
from enum import Enum

from worksheet.model.sheet import Waiver
from worksheet.review.results import MET, MISSED, UNKNOWN, WAIVED, Review, SheetReview, TargetReview
from worksheet.review.state import ACCEPTED


class Why(Enum):
    """Why something is on the agenda, the most pressing first; the value is how it is said."""

    MISSED = "missed"
    PAST = "waiver ended"
    WORSE = "worse than waived"
    UNKNOWN = "unknown"
    BUDGET = "budget"
    COLLISION = "unsettled merge"
    STALE = "stale evidence"
    WAIVED = "waived"
    REMARK = "open remark"
    NOT_REVIEWED = "not accepted"
    NO_EVIDENCE = "no evidence"
    UNCOVERED = "not covered"


@dataclass(frozen=True, slots=True)
class Item:
    """One thing to decide.

    Attributes:
        why: What kind of thing.
        sheet: The block; "" for the whole project.
        about: A target, a budget, a requirement's number, a dotted key; "" for the block as a whole.
        said: What there is to know beyond the target's numbers, in words; "" for nothing.
        number: Of a remark in its sheet, counted from 0; None for anything else.
        target: The target's review, where it is about one.
    """

    why: Why
    sheet: str
    about: str
    said: str
    number: int | None = None
    target: TargetReview | None = None


def agenda(review: Review, today: datetime.date) -> tuple[Item, ...]:
    """Everything that wants a decision, block by block, and the project's own last.

    Args:
        review: The project, reviewed.
        today: For waivers with an end.
    """
    return tuple(_items(review, today))


def _items(review: Review, today: datetime.date) -> Iterator[Item]:
    for name in sorted(review.bad):
        yield Item(Why.UNKNOWN, name, "", "cannot be read; see the problems")
    for sheet in review.sheets:
        yield from sorted(_of_sheet(sheet, today), key=lambda item: list(Why).index(item.why))
    for budget in review.budgets:
        if budget.verdict != MET:
            yield Item(Why.BUDGET, "", budget.metric, f"{budget.verdict} over all blocks")
    for number, text in review.uncovered.items():
        yield Item(Why.UNCOVERED, "", number, text)


def _of_sheet(result: SheetReview, today: datetime.date) -> Iterator[Item]:
    sheet = result.sheet
    for target in result.targets:
        yield from _of_target(result, target, today)
    for collision in sheet.collisions:
        yield Item(Why.COLLISION, sheet.name, collision.key, "two people gave it different values")
    for number, remark in enumerate(sheet.remarks):
        if remark.open:
            asked = f", to {remark.to}" if remark.to else ""
            yield Item(Why.REMARK, sheet.name, remark.about, f"{remark.by}{asked}: {remark.text}", number)
    if result.state != ACCEPTED or result.state_reason is not None:
        yield Item(Why.NOT_REVIEWED, sheet.name, "", result.state_reason or f"it is {_stated(result.state)}")
    if result.targets and not any(target.evidence for target in result.targets):
        yield Item(Why.NO_EVIDENCE, sheet.name, "", "nothing simulated or measured stands beside the calculation")


def _stated(state: str) -> str:
    return "a draft" if state == "draft" else state


def _of_target(result: SheetReview, target: TargetReview, today: datetime.date) -> Iterator[Item]:
    name, block = target.target.name, result.sheet.name
    if target.verdict in (MISSED, UNKNOWN):
        waivers = [waiver for waiver in result.sheet.waivers if waiver.target == name]
        why = _why(target, waivers, today)
        yield Item(why, block, name, target.reason or "", target=target)
    elif target.verdict == WAIVED:
        yield Item(Why.WAIVED, block, name, target.reason or "", target=target)
    stale = [one for one in target.evidence if one.stale]
    if stale:
        what = ", ".join(dict.fromkeys(one.found_by for one in stale))
        yield Item(Why.STALE, block, name, f"{len(stale)} of {len(target.evidence)} ({what})", target=target)


def _why(target: TargetReview, waivers: list[Waiver], today: datetime.date) -> Why:
    if any(waiver.until is not None and today > waiver.until for waiver in waivers):
        return Why.PAST
    if waivers:
        return Why.WORSE
    return Why.MISSED if target.verdict == MISSED else Why.UNKNOWN
