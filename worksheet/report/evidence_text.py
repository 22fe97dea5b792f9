"""Calculation against evidence, as JSON-ready data, rows of a table, and lines of text."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from typing import Any

from worksheet.compare.inputs import Moved
from worksheet.model.problem import Problem
from worksheet.report import plain, revisions_plain, wording
from worksheet.report.table import Column, Table, lines, wrapped
from worksheet.review.deviations import Deviation, Summary

COLUMNS = (
    "sheet", "metric", "unit", "found", "calculated", "off", "found_by", "stale", "process", "temperature", "supply",
    "low", "high", "spread", "samples", "dated", "by", "reference",
)  # fmt: skip
"""Columns of the CSV, SI units; "off" is (found - calculated)/abs(calculated)."""


def document(found: Sequence[Deviation], summed: Sequence[Summary], problems: Sequence[Problem]) -> dict[str, Any]:
    """Everything as a document."""
    return {
        "schema": plain.SCHEMA,
        "evidence": [{**dict(zip(COLUMNS, row(one), strict=True)), "at": plain.condition(one.at)} for one in found],
        "metrics": [{"metric": s.metric, "count": s.count, "mean": s.mean, "rms": s.rms} for s in summed],
        "problems": plain.problems(problems),
    }


def row(one: Deviation) -> tuple[Any, ...]:
    """One piece of evidence in the order of COLUMNS; None for what is not stated."""
    item = one.evidence
    return (
        one.sheet, item.metric, one.unit, item.value, one.calculated, one.off, item.found_by, one.stale, one.at.process,
        one.at.temperature, one.at.supply, item.low, item.high, item.spread, item.samples,
        None if item.dated is None else item.dated.isoformat(), item.by or None, item.reference or None,
    )  # fmt: skip


Since = Mapping[tuple[str, str], tuple[str, tuple[Moved, ...]]]
"""By sheet and digest: the revision that had the digest, and what is stated differently now."""


def text(
    found: Sequence[Deviation], summed: Sequence[Summary], width: int, since: Since | None = None
) -> Iterator[str]:
    """As a designer reads it: piece by piece, what moved since the stale ones, then metric by metric."""
    if not found:
        yield "There is no evidence yet."
        return
    columns = (
        Column("block", flexible=True),
        Column("metric"),
        Column("found", right=True),
        Column("calculated", right=True),
        Column("off", right=True),
        Column("by"),
        Column("", toned=True),
    )
    rows = tuple(_shown(one) for one in found)
    yield from lines(Table(columns, rows), width)
    for (sheet, basis), (revision, moved) in (since or {}).items():
        named = ", ".join(
            dict.fromkeys(one.evidence.metric for one in found if (one.sheet, one.evidence.basis) == (sheet, basis))
        )
        yield from wrapped(f"{sheet} {named}: {revisions_plain.moved_since(revision, moved)}", width, "  ")
    if summed:
        yield ""
        yield "By how much the calculation is off, stale evidence left out"
        heads = (Column("metric"), Column("pieces", right=True), Column("mean", right=True), Column("rms", right=True))
        table = tuple((s.metric, str(s.count), wording.margin(s.mean), f"{s.rms:.1%}") for s in summed)
        yield from lines(Table(heads, table), width, "  ")
    yield ""
    yield from wrapped(wording.STANDING, width)


def _shown(one: Deviation) -> tuple[str, ...]:
    item = one.evidence
    numbers = [wording.metric_number(item.metric, value, one.unit, digits=3) for value in (item.value, one.calculated)]
    return one.sheet, item.metric, *numbers, wording.margin(one.off), item.found_by, "stale" if one.stale else ""
