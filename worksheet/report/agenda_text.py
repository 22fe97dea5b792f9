"""The agenda of a review meeting as JSON-ready data and as lines of text."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from typing import Any

from worksheet.compare.inputs import Moved
from worksheet.model.problem import Problem
from worksheet.report import plain, revisions_plain, wording
from worksheet.report.table import Column, Table, lines, wrapped
from worksheet.review.agenda import Item
from worksheet.review.results import MISSED, UNKNOWN

Plain = dict[str, Any]


Since = Mapping[str, Sequence[tuple[str, str, Sequence[Moved]]]]
"""By sheet, what its inputs have left behind: what it is, the revision that had those inputs or "", what moved."""


def document(items: Sequence[Item], since: Since, problems: Sequence[Problem]) -> Plain:
    """The agenda as a document."""
    return {
        "schema": plain.SCHEMA,
        "items": [_item(item) for item in items],
        "moved": [
            {
                "sheet": sheet,
                "about": about,
                "since": revision or None,
                "inputs": [revisions_plain.moved_plain(one) for one in moved],
            }
            for sheet, entries in since.items()
            for about, revision, moved in entries
        ],
        "problems": plain.problems(problems),
    }


def _item(item: Item) -> Plain:
    return {
        "why": item.why.value,
        "sheet": item.sheet,
        "about": item.about,
        "said": item.said,
        "target": None if item.target is None else plain.target(item.target),
    }


def text(items: Sequence[Item], since: Since, width: int) -> Iterator[str]:
    """The agenda, block by block, with what moved since a block was accepted or evidence found."""
    if not items:
        yield "Nothing wants a decision."
        return
    yield f"{len(items)} things want a decision"
    for name in dict.fromkeys(item.sheet for item in items):
        yield ""
        yield name or "Project"
        of_block = [item for item in items if item.sheet == name]
        yield from lines(Table(_COLUMNS, tuple(map(_row, of_block))), width, "  ")
        for item in of_block:
            if known := said(item):
                yield from wrapped(f"{item.about or item.why.value}: {known}", width, "  ")
        for about, revision, moved in since.get(name, ()):
            yield from wrapped(f"{about}: {revisions_plain.moved_since(revision, moved)}", width, "  ")


def said(item: Item) -> str:
    """What there is to know of an item, with where its target is worst where it is not met."""
    found = item.target
    missed = found is not None and found.verdict in (MISSED, UNKNOWN)
    where = f"worst at {wording.condition(found.worst_at)}" if missed and found and found.worst_at else ""
    return "; ".join(part for part in (item.said, where) if part)


_COLUMNS = (
    Column("why", toned=True),
    Column("about", flexible=True),
    Column("wanted"),
    Column("worst", right=True),
    Column("margin", right=True),
)


def _row(item: Item) -> tuple[str, ...]:
    found = item.target
    if found is None:
        return item.why.value, item.about or "the block", "", "", ""
    name = found.target.name
    worst = wording.metric_number(name, found.worst, found.unit, digits=3)
    return item.why.value, item.about, wording.limits(found.target, found.unit), worst, wording.margin(found.margin)
