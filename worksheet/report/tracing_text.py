"""One value or one metric over revisions, as JSON-ready data, rows and lines of text."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from typing import Any

from worksheet.history.revisions import Revision
from worksheet.report import plain, revisions_plain, wording
from worksheet.report.table import Column, Table, lines

_ID, _BAR = 10, 20
VALUE_COLUMNS = ("revision", "dated", "by", "note", "value", "unit")
METRIC_COLUMNS = ("revision", "dated", "by", "note", "nominal", "worst", "unit", "verdict")
Entry = tuple[Revision, Any, str]
"""(revision, value, unit)"""
Point = tuple[Revision, float | None, float | None, str, str]
"""(revision, nominal, worst, unit, verdict)"""


def value_rows(found: Sequence[Entry]) -> Iterator[tuple[Any, ...]]:
    """Changes of a value in the order of VALUE_COLUMNS."""
    for revision, value, unit in found:
        yield (*_who(revision), value, unit)


def metric_rows(found: Sequence[Point]) -> Iterator[tuple[Any, ...]]:
    """A metric over revisions in the order of METRIC_COLUMNS."""
    for revision, nominal, worst, unit, verdict in found:
        yield (*_who(revision), nominal, worst, unit, verdict)


def _who(revision: Revision) -> tuple[str, str, str, str]:
    return revision.revision, revision.dated, revision.by, revision.note


def document(name: str, columns: Sequence[str], rows: Iterator[tuple[Any, ...]]) -> dict[str, Any]:
    """Rows as a document."""
    named = [dict(zip(columns, row, strict=True)) for row in rows]
    return {"schema": plain.SCHEMA, "of": name, "history": named, "problems": []}


def value_text(found: Sequence[Entry], width: int) -> Iterator[str]:
    """Changes of a value, newest first."""
    columns = (
        Column("revision"),
        Column("dated"),
        Column("by", flexible=True),
        Column("value", right=True),
        Column("note", flexible=True),
    )
    rows = tuple(
        (r.revision[:_ID], r.dated[:10], r.by, revisions_plain.shown(value, unit), r.note) for r, value, unit in found
    )
    yield from lines(Table(columns, rows), width)


def metric_text(name: str, found: Sequence[Point], width: int) -> Iterator[str]:
    """A metric over revisions, newest first, with a bar from the least to the greatest."""
    numbers = [nominal for _, nominal, *_ in found if nominal is not None]
    low, high = (min(numbers), max(numbers)) if numbers else (0.0, 0.0)
    columns = (
        Column("revision"),
        Column("dated"),
        Column("nominal", right=True),
        Column(""),
        Column("worst", right=True),
        Column("verdict", toned=True),
        Column("note", flexible=True),
    )
    rows = tuple(
        (
            r.revision[:_ID],
            r.dated[:10],
            wording.metric_number(name, nominal, unit),
            _bar(nominal, low, high),
            wording.metric_number(name, worst, unit),
            verdict,
            r.note,
        )
        for r, nominal, worst, unit, verdict in found
    )
    yield from lines(Table(columns, rows), width)


def _bar(value: float | None, low: float, high: float) -> str:
    """A mark between the least and the greatest value."""
    if value is None:
        return ""
    place = round((value - low) / (high - low) * (_BAR - 1)) if high > low else _BAR - 1
    return "." * place + "#" + "." * (_BAR - 1 - place)
