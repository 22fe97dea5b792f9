"""Taking a block over: what is new since one looked last, what is asked of one, what is stale, what is weak.

The list is made of what stands in the files and in git, so it is the same for whoever opens the project.
"""

from __future__ import annotations

import datetime
from collections.abc import Iterator
from dataclasses import dataclass
from enum import Enum
from pathlib import Path

from worksheet.model.problem import Problem
from worksheet.model.sheet import Process, Sheet
from worksheet.project.evaluate import Evaluator
from worksheet.review.fragility import fragility
from worksheet.review.results import SheetReview
from worksheet.review.weakest import Weak, weakest
from worksheet.session import revisions


class Why(Enum):
    """Why something is shown to whoever takes a block over, in the order they are led through it."""

    ASKED = "asked"
    NEW = "new"
    STALE = "stale"
    WEAK = "weak"


@dataclass(frozen=True, slots=True)
class Step:
    """One thing to look at.

    Attributes:
        why: What kind of thing.
        key: The dotted key it is about; "" for the block as a whole.
        said: What there is to know, in words; "" where the values say it.
        number: Of a remark in its sheet, counted from 0; None for anything else.
        old, new, unit: What moved, for what is new; None where it was or is not stated. [unit]
        weak: The value, for what is weak.
    """

    why: Why
    key: str
    said: str = ""
    number: int | None = None
    old: object = None
    new: object = None
    unit: str = ""
    weak: Weak | None = None


def last_seen(root: Path, person: str) -> str:
    """The newest revision that somebody recorded, "" where there is none."""
    listed = revisions.history(root)
    if isinstance(listed, Problem) or not person:
        return ""
    return next((one.revision for one in listed if one.by == person), "")


def steps(
    root: Path, evaluator: Evaluator | None, result: SheetReview, today: datetime.date, since: str = ""
) -> tuple[Step, ...]:
    """Everything that whoever takes a block over is led through.

    Args:
        root: The project folder.
        evaluator: Of the project as it stands; None where it cannot be evaluated, and then nothing is weak.
        result: The block, reviewed.
        today: For waivers with an end.
        since: The revision after which something is new; "" leaves that out.
    """
    sheet = result.sheet
    return (
        *_asked(sheet),
        *(_new(root, sheet.name, today, since) if since else ()),
        *_stale(result),
        *(_weak(evaluator, result) if evaluator is not None else ()),
    )


def _asked(sheet: Sheet) -> Iterator[Step]:
    for number, remark in enumerate(sheet.remarks):
        if remark.open:
            asked = f", to {remark.to}" if remark.to else ""
            yield Step(Why.ASKED, remark.about, f"{remark.by}{asked}: {remark.text}", number)


def _new(root: Path, name: str, today: datetime.date, since: str) -> Iterator[Step]:
    found = revisions.compared(root, since, revisions.WORKING, today, deep=False)
    if isinstance(found, Problem):
        return
    comparison = found.comparison
    mine = next((one for one in comparison.sheets if one.sheet == name), None)
    if mine is None:
        return
    for moved in mine.inputs:
        yield Step(Why.NEW, moved.key, "", None, moved.old, moved.new, moved.unit)
    for prefix, movements in (("project", comparison.project), ("process", comparison.process)):
        for moved in movements:
            yield Step(Why.NEW, f"{prefix}.{moved.key}", "", None, moved.old, moved.new, moved.unit)
    for turned in mine.results:
        if turned.old_verdict != turned.new_verdict and turned.new_verdict is not None:
            said = f"{turned.old_verdict or 'no target'} -> {turned.new_verdict}"
            yield Step(Why.NEW, f"target.{turned.metric}", said, None, turned.old, turned.new, turned.unit)


def _stale(result: SheetReview) -> Iterator[Step]:
    for target in result.targets:
        stale = [one for one in target.evidence if one.stale]
        if stale:
            kinds = ", ".join(dict.fromkeys(one.found_by for one in stale))
            said = f"{len(stale)} of {len(target.evidence)} pieces of evidence were found for other inputs ({kinds})"
            yield Step(Why.STALE, f"target.{target.target.name}", said)


def _weak(evaluator: Evaluator, result: SheetReview) -> Iterator[Step]:
    worst = {one.target.name: one.worst_at for one in result.targets if one.worst_at is not None}
    ranked = fragility(evaluator, {result.sheet.name: worst})[result.sheet.name]
    process: Process | None = evaluator.project.process
    for one in weakest(result.sheet, process, ranked):
        yield Step(Why.WEAK, one.key, "", weak=one)
