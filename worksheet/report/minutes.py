"""Minutes of a review meeting, as Markdown: what was decided, by whom, and what is still open."""

from __future__ import annotations

import datetime
import re
from collections.abc import Iterable, Iterator, Sequence

from worksheet.compare.decisions import Decision
from worksheet.model.text import clean
from worksheet.report import agenda_text, wording
from worksheet.review.agenda import Item, agenda
from worksheet.review.results import Review

_MARKS = re.compile(r"([\\`*_{}\[\]<>#|~&!])")


def minutes(
    review: Review, decided: Sequence[Decision], today: datetime.date, *, present: str = "", revision: str = ""
) -> Iterator[str]:
    """Lines of the minutes.

    Args:
        review: The project after the meeting.
        decided: What was decided.
        today: The day of the meeting.
        present: Who was there; "" where that is not kept.
        revision: The revision that the meeting looked at; "" where there is none.
    """
    yield f"# Review of {escaped(review.title or 'the project')}, {today.isoformat()}"
    yield ""
    if present:
        yield f"Present: {escaped(present)}"
        yield ""
    targets = [target for sheet in review.sheets for target in sheet.targets]
    counted = ", ".join(
        f"{count} {verdict}"
        for verdict in dict.fromkeys(target.verdict for target in targets)
        if (count := sum(target.verdict == verdict for target in targets))
    )
    since = f" Decisions since revision {escaped(revision[:10])}." if revision else ""
    yield f"{len(review.sheets)} blocks, {len(targets)} targets: {counted or 'none'}.{since}"
    yield ""
    yield "## Decided"
    yield ""
    yield from _table(("block", "about", "decision", "by", "said"), map(_decision, decided), "Nothing was decided.")
    yield ""
    yield "## Still open"
    yield ""
    yield from _table(("block", "about", "why", "what is known"), map(_item, agenda(review, today)), "Nothing is open.")
    yield ""
    yield wording.STANDING
    if any(v.what == "max_voltage" for sheet in review.sheets for v in sheet.validity):
        yield ""
        yield wording.CAUTION


def escaped(text: str) -> str:
    """A user's text as Markdown that shows it and does nothing else."""
    return _MARKS.sub(r"\\\1", " ".join(clean(text, lines=True).split()))


def _decision(one: Decision) -> tuple[str, ...]:
    return one.sheet, one.about or "the block", one.what, one.by, one.said


def _item(one: Item) -> tuple[str, ...]:
    return one.sheet or "project", one.about or "the block", one.why.value, agenda_text.said(one)


def _table(heads: tuple[str, ...], rows: Iterable[tuple[str, ...]], none: str) -> Iterator[str]:
    every = list(rows)
    if not every:
        yield none
        return
    yield f"| {' | '.join(heads)} |"
    yield f"|{' --- |' * len(heads)}"
    for row in every:
        yield f"| {' | '.join(map(escaped, row))} |"
