"""The revisions of a project as JSON-ready data and as lines of text."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from typing import Any

from worksheet.history.revisions import Revision
from worksheet.report import plain
from worksheet.report.table import Column, Table, lines

Plain = dict[str, Any]
_ID = 10


def history(listed: Sequence[Revision]) -> Plain:
    """The revisions as a document."""
    return {"schema": plain.SCHEMA, "revisions": [revision(r) for r in listed], "problems": []}


def revision(found: Revision) -> Plain:
    """One revision."""
    sheets = [p.removeprefix("sheets/").removesuffix(".toml") for p in found.paths if p.startswith("sheets/")]
    return {"revision": found.revision, "dated": found.dated, "by": found.by, "note": found.note, "sheets": sheets}


def history_text(listed: Sequence[Revision], width: int) -> Iterator[str]:
    """The revisions as a table, newest first."""
    columns = (Column("revision"), Column("dated"), Column("by", flexible=True), Column("note", flexible=True))
    rows = tuple((r.revision[:_ID], r.dated[:16].replace("T", " "), r.by, r.note) for r in listed)
    yield from lines(Table(columns, rows), width) if rows else ["no revision yet"]
