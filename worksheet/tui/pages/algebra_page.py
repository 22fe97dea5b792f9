"""The algebra of a number as rows: what it equals, the numbers put in, each to be followed, and what it leaves out."""

from __future__ import annotations

from collections.abc import Iterator

from worksheet.report import algebra_text, wording
from worksheet.report.table import wrapped
from worksheet.solver.explanation import Explanation, Given
from worksheet.tui.explained import Explained, name_of
from worksheet.tui.pages.parts import Facts
from worksheet.tui.rows import HEAD, LABEL, MISSED, PLAIN, QUIET, VALUE, Row, Span, heading, line

EXPLAIN = "explain"
"""Kind of a row's subject that is a number with its algebra (explained.name_of)."""

_SYMBOL, _NUMBER = 10, 13


def rows(facts: Facts, found: Explained | None) -> Iterator[Row]:
    """Rows about the algebra of a number; a line that says so while it is being looked for."""
    yield heading("part.algebra", "Algebra", facts.columns, facts.signs.across, facts.signs.text(_note(found)))
    if found is None:
        yield Row("algebra.working", (line(facts.text("looking for the algebra...", QUIET)),), stops=False)
    elif found.found is None:
        yield from _said(facts, "algebra.none", found.reason, QUIET)
    else:
        yield from _equation(facts, found, found.found)
        yield from _given(facts, found.given)
        yield from _remarks(facts, found, found.found)


def _note(found: Explained | None) -> str:
    return "" if found is None or found.found is None else f"at {wording.condition(found.found.at)}"


def _equation(facts: Facts, shown: Explained, found: Explanation) -> Iterator[Row]:
    value = wording.number(found.value, found.unit, found.reason)
    text = f"{found.title} {found.symbol} = {value}"
    copied = (found.symbol, value, *found.latex())
    yield Row("algebra.value", (line(facts.text(text, HEAD)),), copied=copied)
    if found.origin is not None:
        yield from _said(facts, "algebra.origin", f"stated: {algebra_text.origin(found.origin)}", PLAIN)
    if shown.lines:
        made = tuple((Span("  "), Span(one, VALUE)) for one in shown.lines)
        yield Row("algebra.equation", made, stops=False)


def _given(facts: Facts, given: tuple[Given, ...]) -> Iterator[Row]:
    """The numbers put in."""
    for one in given:
        came = f"follows from {one.key}" if one.origin is None else algebra_text.origin(one.origin)
        number = wording.number(one.value, one.unit)
        first = line(
            facts.text(one.symbol, LABEL, _SYMBOL), facts.text(number, PLAIN, _NUMBER), facts.text(one.title, PLAIN)
        )
        below = tuple(
            line(Span("  "), facts.text(text, QUIET), gap=0) for text in wrapped(came, max(facts.columns - 2, 20))
        )
        name = name_of(one.key, one.condition_index)
        yield Row(
            f"given.{name}", (first, *below), subject=(EXPLAIN, name), copied=(one.symbol, number, one.title, came)
        )


def _remarks(facts: Facts, shown: Explained, found: Explanation) -> Iterator[Row]:
    if found.relation:
        yield from _said(facts, "algebra.relation", f"behind it: {found.relation}", QUIET)
    for k, remark in enumerate(found.remarks):
        said = remark if found.in_range else f"OUT OF RANGE: {remark}"
        yield from _said(facts, f"algebra.remark.{k}", said, QUIET if found.in_range else MISSED)
    if found.neglects:
        effects = ", ".join(f"{one.name} {algebra_text.share(one)}" for one in found.neglects)
        yield from _said(facts, "algebra.neglects", f"what a neglect would change: {effects}", PLAIN)
    if shown.simplified:
        yield from _said(facts, "algebra.simplified", shown.simplified[0], PLAIN)
        made = tuple((Span("  "), Span(one, VALUE)) for one in shown.simplified[1:])
        if made:
            yield Row("algebra.simple", made, stops=False)


def _said(facts: Facts, key: str, text: str, role: str) -> Iterator[Row]:
    lines = tuple(line(facts.text(one, role)) for one in wrapped(text, max(facts.columns, 20)))
    yield Row(key, lines, copied=(text,))
