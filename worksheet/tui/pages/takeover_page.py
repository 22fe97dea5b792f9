"""The page of a block that changes hands: what is asked, new, stale and weak, one row each."""

from __future__ import annotations

from collections.abc import Sequence

from worksheet.report import revisions_plain, wording
from worksheet.report.table import wrapped
from worksheet.session.taking_over import Step, Why
from worksheet.tui import rows
from worksheet.tui.rows import HEAD, LABEL, PLAIN, QUIET, Line, Page, Row, Span, heading, line
from worksheet.tui.signs import Signs

TITLES = {
    Why.ASKED: "Asked",
    Why.NEW: "New",
    Why.STALE: "Stale evidence",
    Why.WEAK: "Weakest first",
}
_NOTES = {
    Why.WEAK: "least trust, then least room before a target breaks",
}
_KEY, _NUMBER, _TRUST, _ROOM = 30, 11, 10, 8


def page(steps: Sequence[Step], columns: int, signs: Signs) -> Page:
    """Sections in the order in which one is led through them."""
    made: list[Row] = []
    for why, title in TITLES.items():
        found = [step for step in steps if step.why is why]
        if found:
            made.append(
                heading(f"section.{why.name}", f"{title} ({len(found)})", columns, signs.across, _NOTES.get(why, ""))
            )
            made += [_row(step, columns, signs) for step in found]
    if not made:
        made = [Row("none", (line(Span("Nothing is asked, new, stale or weak.", QUIET)),), stops=False)]
    return Page(tuple(made), tuple(row.key for row in made if not row.stops))


def key_of(step: Step) -> str:
    """The name of a step's row."""
    return f"{step.why.name}.{step.key}.{'' if step.number is None else step.number}.{step.said if step.unit else ''}"


def _row(step: Step, columns: int, signs: Signs) -> Row:
    key = Span(signs.text(step.key or "the block"), LABEL, _KEY)
    if step.weak is not None:
        one = step.weak
        room = "-" if one.room is None else f"{one.room:.1%}" if one.room < 1 else f"{one.room:.0f}x"
        checked = f"checked {one.checked.isoformat()}" if one.checked is not None else ""
        spans: tuple[Span, ...] = (
            key,
            Span(signs.text(wording.number(one.value, one.unit, "formula")), PLAIN, _NUMBER, right=True),
            Span(signs.text(one.trust or "no trust"), PLAIN if one.trust else rows.UNKNOWN, _TRUST),
            Span(room, PLAIN, _ROOM, right=True),
            Span(signs.text(checked), rows.MET),
        )
    else:
        spans = (key, Span(signs.text(_said(step)), PLAIN, max(columns - _KEY - 2, 10)))
    cells = (step.key or "the block", step.why.value, _said(step))
    return Row(key_of(step), (line(*spans),), subject=("step", key_of(step)), copied=cells)


def _said(step: Step) -> str:
    if step.why is not Why.NEW:
        return step.said
    moved = f"{revisions_plain.shown(step.old, step.unit)} -> {revisions_plain.shown(step.new, step.unit)}"
    return f"{step.said}; {moved}" if step.said else moved


def detail_lines(step: Step | None, columns: int, signs: Signs) -> list[Line]:
    """What is known of a step."""
    if step is None:
        return []
    out = [(Span(signs.text(f"{step.why.value}: {step.key or 'the block'}"), HEAD),)]
    one = step.weak
    if one is None:
        parts = [_said(step)]
    else:
        parts = [
            f"source: {one.source or 'none stated'}",
            one.note,
            f"{one.target} breaks at {wording.number(one.break_value, one.unit)}" if one.target else "no target breaks",
            f"known to {wording.number(one.standard_error, one.unit)}" if one.standard_error is not None else "",
            f"checked by {one.checked_by} on {one.checked.isoformat()}" if one.checked is not None else "",
        ]
    text = "; ".join(part for part in parts if part)
    return [*out, *((Span(part, PLAIN),) for part in wrapped(signs.text(text), columns))]


def title_line(name: str, owner: str, since: str, signs: Signs) -> Line:
    """Whose block it is, and since when something counts as new."""
    told = f"new: since your {since[:10]}" if since else "no revision of yours yet"
    return line(
        Span(signs.text(f"Taking over {name}"), HEAD),
        Span(signs.text(f"kept by {owner or 'nobody'}; {told}"), PLAIN),
        gap=2,
    )
