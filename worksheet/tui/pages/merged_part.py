"""What a merge left to be settled: values that two people changed differently, and git's own conflict markers."""

from __future__ import annotations

from collections.abc import Iterator, Mapping

from worksheet.model.sheet_keys import COLLISION
from worksheet.report.table import wrapped
from worksheet.tui import rows
from worksheet.tui.pages import words
from worksheet.tui.pages.parts import Facts
from worksheet.tui.rows import LABEL, PLAIN, QUIET, Line, Row, Span, line

_MOST_LINES = 6
"""Lines of one side of a conflict that are shown; the file holds the rest."""


def collisions(facts: Facts) -> Iterator[Row]:
    """One row a [[collision]]: the key, what each side gave, and what both started from."""
    stated = facts.data.get(COLLISION.name)
    titles = {key.name: key.title for key in COLLISION.keys}
    for k, entry in enumerate(stated if isinstance(stated, list) else []):
        if isinstance(entry, Mapping):
            key = words.typed(entry.get("key"))
            lines = [line(facts.text(key, LABEL), Span("two people gave it different values", rows.MISSED), gap=2)]
            sides = {side: words.typed(entry.get(side)) or "not stated" for side in ("ours", "theirs", "base")}
            for side, text in sides.items():
                lines += _side(facts, titles[side], text)
            copied = (key, *sides.values())
            yield Row(f"{COLLISION.name}.{k}", tuple(lines), subject=(COLLISION.name, str(k)), copied=copied)


def _side(facts: Facts, title: str, text: str) -> list[Line]:
    parts = wrapped(text, max(facts.columns - 12, 20))[:_MOST_LINES]
    return [
        line(Span("  "), Span(title.lower() if k == 0 else "", QUIET, 8), facts.text(part, PLAIN), gap=0)
        for k, part in enumerate(parts)
    ]


def conflicts(facts: Facts) -> Iterator[Row]:
    """One row a place where git left both sides in the file."""
    found = facts.snapshot.sides(facts.name)
    for k, hunk in enumerate(() if found is None else found.hunks):
        lines: list[Line] = [line(Span(f"line {hunk.line}", LABEL))]
        assert found is not None  # it has hunks
        for title, text in ((found.our_label or "ours", hunk.ours), (found.their_label or "theirs", hunk.theirs)):
            lines.append(line(Span("  "), facts.text(title, QUIET), gap=0))
            shown = text.splitlines()[:_MOST_LINES] or ["(nothing)"]
            lines += [line(Span("    "), facts.text(one, PLAIN), gap=0) for one in shown]
        yield Row(f"conflict.{k}", tuple(lines), subject=("conflict", str(k)), copied=(hunk.ours, hunk.theirs))
