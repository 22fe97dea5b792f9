"""Two states of a project as one list: every value that differs in a line of its own, the weightiest first.

Weight: verdicts that turned for the worse, then those that turned otherwise; what was stated differently, since that
can be answered for; targets that hold their verdict, by the room that they lost; what is needed; all other metrics.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence

from worksheet.compare.compared import Comparison, Result
from worksheet.report import revisions_plain
from worksheet.tui import rows
from worksheet.tui.pages import compare_page
from worksheet.tui.pages.compare_page import INPUT, NEED, OTHER, PART, RESULT, Look
from worksheet.tui.rows import LABEL, PLAIN, QUIET, Page, Row, Span, line

_NAME = 44
"""Columns of what a line is about; what does not fit goes below it."""

_WORSE, _TURNED, _STATED, _HELD, _NEEDED, _OTHERS = range(6)


def page(found: Comparison, look: Look) -> Page:
    """One row a value."""
    weighed = sorted(_weighed(found, look), key=lambda one: one[0])
    return Page(tuple(row for _, row in weighed) or (compare_page.nothing(),))


def _weighed(found: Comparison, look: Look) -> Iterator[tuple[tuple[int, float], Row]]:
    for title, moved in (("Project", found.project), ("Process file", found.process)):
        for one in moved:
            said = revisions_plain.stated_ends(one)
            yield (_STATED, 0.0), _row(f"{OTHER}.{title}.{one.key}", (OTHER, ""), title, one.key, said, PLAIN, look)
    for change in found.sheets:
        name = change.sheet
        if change.status in ("added", "removed"):
            turn = ("no sheet", "a sheet") if change.status == "added" else ("a sheet", "no sheet")
            yield (_STATED, 0.0), _row(f"{PART}.{name}", (PART, name), name, "", turn, PLAIN, look)
            continue
        for one in change.inputs:
            said = revisions_plain.stated_ends(one)
            subject = (INPUT, f"{name}:{one.key}")
            yield (_STATED, 0.0), _row(f"{INPUT}.{name}.{one.key}", subject, name, one.key, said, PLAIN, look)
        for result in change.results:
            yield _weight(result), _result(name, result, look)
        for need in change.needed:
            what, *states = revisions_plain.need_ends(need)
            subject = (NEED, f"{name}:{need.variable}")
            yield (_NEEDED, 0.0), _row(compare_page.need_key(name, need), subject, name, what, states, PLAIN, look)


def _weight(result: Result) -> tuple[int, float]:
    if result.old_verdict != result.new_verdict:
        return (_WORSE if result.new_verdict in (rows.MISSED, rows.UNKNOWN) else _TURNED), _lost(result)
    return (_OTHERS if result.new_verdict is None else _HELD), _lost(result)


def _lost(result: Result) -> float:
    """By how much a target's margin grew: what lost most comes first. [-]"""
    if result.old_margin is None or result.new_margin is None:
        return 0.0
    return result.new_margin - result.old_margin


def _result(name: str, result: Result, look: Look) -> Row:
    key, subject = f"{RESULT}.{name}.{result.metric}", (RESULT, f"{name}:{result.metric}")
    made = _row(key, subject, name, result.metric, compare_page.ends(result), compare_page.role(result), look)
    lines = (*made.lines, *compare_page.why(result, look))
    return Row(key, lines, subject=subject, copied=(name, *compare_page.copied(result)))


def _row(
    key: str, subject: tuple[str, str], name: str, about: str, said: Sequence[str], role: str, look: Look
) -> Row:  # fmt: skip
    """What it is about, what it was and what it is; on two lines where one does not hold them."""
    text = look.signs.text
    label = text(f"{name}  {about}" if about else name)
    old, new = text(said[0]), text(said[-1])
    turn = (Span(old, QUIET), Span(" -> ", QUIET), Span(new.rstrip(), role))
    copied = (name, about, *said)
    if len(label) <= _NAME and _NAME + len(old) + len(new) + 5 <= look.columns:
        return Row(key, ((*line(Span(label, LABEL, _NAME)), Span(" "), *turn),), subject=subject, copied=copied)
    return Row(key, (line(Span(label, LABEL)), (Span("    "), *turn)), subject=subject, copied=copied)
