"""What moved since the last hand-off: what was stated, what that did, and the notes that say why."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

from worksheet.compare.compared import Result, SheetChange
from worksheet.compare.inputs import Moved
from worksheet.report import wording
from worksheet.report.handoff.material import Block, HandOff, Since
from worksheet.report.handoff.tree import Builder, Cell, Points, metric, text
from worksheet.report.revisions_plain import caused, needed

_ID = 10


def moved_block(made: HandOff, found: Block, into: Builder) -> None:
    """The section of what moved in one block; nothing where the project's own says already that nobody can tell."""
    if made.whole and (made.since is None or made.since.comparison is None):
        return
    into.head("What moved since the last hand-off", "moved")
    since = made.since
    if since is None:
        into.say("This is the first hand-off that is known here; there is nothing to compare with.")
        return
    _against(since, into)
    if since.comparison is None:
        return
    change = since.change(found.name)
    if not made.whole:
        _around(since, into)
    if change is None:
        into.say("Nothing in this block.")
    else:
        into.say(_status(change))
        _stated("What was stated", change.inputs, into)
        if change.status in ("changed", "affected"):
            _results(change.results, into)
        needs = tuple(text(needed(need)) for need in change.needed)
        if needs:
            into.add(Points(needs))
    if not made.whole:
        _why(since, into)


def moved_project(made: HandOff, into: Builder) -> None:
    """The section of what moved in the project as a whole."""
    into.head("What moved since the last hand-off", "moved")
    since = made.since
    if since is None:
        into.say("This is the first hand-off that is known here; there is nothing to compare with.")
        return
    _against(since, into)
    if since.comparison is None:
        return
    if since.comparison.same:
        into.say("Nothing.")
    _around(since, into)
    rows = tuple((text(one.sheet), text(_status(one)), text(_turned(one))) for one in since.comparison.sheets)
    into.table("Blocks that differ", ("block", "how", "verdicts that turned"), rows)
    _why(since, into)


def _against(since: Since, into: Builder) -> None:
    day = f" of {since.dated}" if since.dated else ""
    revision = f"revision {since.origin.revision[:_ID]}" if since.origin.revision else "no revision"
    inexact = "; its files held more than that revision, which cannot be seen here" if since.origin.changed else ""
    into.say(f"The last hand-off{day} was made from {revision}{inexact}.")
    if since.why_not:
        into.say(f"What moved cannot be told: {since.why_not}")


def _around(since: Since, into: Builder) -> None:
    assert since.comparison is not None
    _stated("What the project file states", since.comparison.project, into)
    _stated("What the process file states", since.comparison.process, into)


def _status(change: SheetChange) -> str:
    through = f" It was reached through {', '.join(change.through)}." if change.through else ""
    return _HOW[change.status] + through


_HOW = {
    "added": "The block is new.",
    "removed": "The block is gone.",
    "changed": "Its own sheet has changed.",
    "affected": "Its own sheet is as it was: what it takes from elsewhere has moved.",
}


def _turned(change: SheetChange) -> str:
    turned = [r for r in change.results if r.old_verdict != r.new_verdict and change.status in ("changed", "affected")]
    return ", ".join(f"{r.metric}: {r.old_verdict or '-'} to {r.new_verdict or '-'}" for r in turned) or "-"


def _stated(caption: str, moved: Sequence[Moved], into: Builder) -> None:
    rows = tuple((text(m.key), text(_shown(m.old, m.unit)), text(_shown(m.new, m.unit))) for m in moved)
    into.table(caption, ("key", "then", "now"), rows)


def _shown(value: Any, unit: str) -> str:
    if value is None:
        return "not stated"
    if isinstance(value, float):
        return wording.number(value, unit) if unit else f"{value:.6g}"
    if isinstance(value, list):
        return ", ".join(_shown(one, unit) for one in value)
    return str(value)


def _results(results: Sequence[Result], into: Builder) -> None:
    rows = tuple(_result(r) for r in results)
    columns = ("metric", "then", "now", "verdict", "because of")
    into.table("What that did, at the nominal condition", columns, rows, (1, 2))


def _result(result: Result) -> tuple[Cell, ...]:
    verdict = result.new_verdict or ""
    if result.old_verdict != result.new_verdict:
        verdict = f"{result.old_verdict or 'none'} to {result.new_verdict or 'none'}"
    then, now = (metric(result.metric, value, result.unit) for value in (result.old, result.new))
    return text(result.metric), then, now, text(verdict or "-"), text(_because(result))


def _because(result: Result) -> str:
    """What each input did to a metric; where one did it all, its key."""
    said = caused(result)
    if said or result.cause is None or not result.cause.parts:
        return said or "-"
    return result.cause.parts[0].key


def _why(since: Since, into: Builder) -> None:
    rows = tuple((text(r.revision[:_ID]), text(r.dated[:10]), text(r.by), text(r.note)) for r in since.revisions)
    into.table("Why: what was recorded meanwhile, newest first", ("revision", "dated", "by", "note"), rows)
