"""The page of a review meeting: everything that wants a decision, and what is known of the thing under the cursor."""

from __future__ import annotations

from collections.abc import Sequence

from worksheet.report import agenda_text, wording
from worksheet.report.table import wrapped
from worksheet.review.agenda import Item, Why
from worksheet.tui import rows
from worksheet.tui.pages import words
from worksheet.tui.rows import HEAD, LABEL, PLAIN, QUIET, VALUE, Line, Page, Row, Span, line
from worksheet.tui.signs import Signs

_BLOCK, _WHY, _ABOUT, _WORST, _MARGIN = 17, 19, 20, 10, 7
_ROLES = {
    Why.MISSED: rows.MISSED,
    Why.PAST: rows.MISSED,
    Why.WORSE: rows.MISSED,
    Why.BUDGET: rows.MISSED,
    Why.UNKNOWN: rows.UNKNOWN,
    Why.STALE: rows.UNKNOWN,
    Why.WAIVED: rows.WAIVED,
}


def heading() -> Line:
    """The line above the items."""
    return line(
        Span(" "),
        Span("block", QUIET, _BLOCK),
        Span("why", QUIET, _WHY),
        Span("about", QUIET, _ABOUT),
        Span("worst", QUIET, _WORST, right=True),
        Span("margin", QUIET, _MARGIN, right=True),
    )


def page(items: Sequence[Item], signs: Signs) -> Page:
    """One row an item."""
    if not items:
        return Page((Row("none", (line(Span("Nothing wants a decision.", QUIET)),), stops=False),))
    return Page(tuple(_row(item, signs) for item in items))


def key_of(item: Item) -> str:
    """The name of an item's row."""
    return f"{item.sheet}.{item.why.name}.{item.about}.{'' if item.number is None else item.number}"


def _row(item: Item, signs: Signs) -> Row:
    found = item.target
    worst = "" if found is None else words.metric(found, found.worst)
    margin = "" if found is None else wording.margin(found.margin)
    cells = (item.sheet or "(project)", item.why.value, item.about or "the block", worst, margin)
    spans = (
        Span(signs.text(cells[0]), VALUE, _BLOCK),
        Span(_said(item.why), _ROLES.get(item.why, PLAIN), _WHY),
        Span(signs.text(cells[2]), LABEL, _ABOUT),
        Span(signs.text(cells[3]), PLAIN, _WORST, right=True),
        Span(signs.text(cells[4]), PLAIN, _MARGIN, right=True),
    )
    return Row(key_of(item), (line(*spans),), subject=("item", key_of(item)), copied=cells)


def _said(why: Why) -> str:
    said: str = why.value
    return said.upper() if why in (Why.MISSED, Why.UNKNOWN) else said


def detail_lines(item: Item | None, columns: int, signs: Signs) -> list[Line]:
    """What is known of an item, before it is decided."""
    if item is None:
        return []
    out = [
        line(Span(signs.text(f"{item.sheet or 'Project'}: {item.about or 'the block'}"), HEAD), Span(item.why.value))
    ]
    if item.target is not None:
        out.append(_wanted(item, signs))
    known = agenda_text.said(item)
    out += [(Span(text, PLAIN),) for text in wrapped(signs.text(known), columns)] if known else []
    for one in item.target.evidence if item.target is not None else ():
        age = "stale " if one.stale else ""
        shown = wording.metric_number(
            item.about, one.value, item.target.unit if item.target else "", digits=words.DIGITS
        )
        text = f"{age}{one.found_by}: {shown}, {words.verdict(one.verdict)}"
        out.append((Span(signs.text(text), rows.UNKNOWN if one.stale else PLAIN),))
    return out


def _wanted(item: Item, signs: Signs) -> Line:
    found = item.target
    assert found is not None  # asked for items about targets
    target = found.target
    asked = " ".join(part for part in (target.id, target.source, target.why) if part)
    nominal = f"nominal {words.metric(found, found.nominal)}"
    parts = [f"wanted {wording.limits(target, found.unit)}", nominal, asked]
    return (Span(signs.text("; ".join(part for part in parts if part)), PLAIN),)


def title_line(items: Sequence[Item], shown: int, title: str, only: str, signs: Signs) -> Line:
    """What the meeting is about, and how much of it is shown."""
    blocks = len({item.sheet for item in items if item.sheet})
    counted = (
        f"{len(items)} to decide in {blocks} blocks" if not only else f"{len(items)} to decide; only {only}: {shown}"
    )
    return line(Span(signs.text(f"Review meeting: {title}"), HEAD), Span(signs.text(counted), PLAIN), gap=2)
