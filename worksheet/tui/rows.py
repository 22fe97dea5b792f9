"""What a page of a book consists of: rows of spans, as frozen data that knows nothing of the screen.

Builders (pages) make rows from a snapshot, the ledger shows them. A row is told from another by its key, which stays
the same while its numbers change, so that the cursor stays on what the user looked at.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field
from typing import TYPE_CHECKING

from worksheet.report.table import cut, width_of

if TYPE_CHECKING:
    from worksheet.model.keys import Key

KeyPath = tuple[str | int, ...]

PLAIN, QUIET, HEAD, VALUE, LABEL, RULE = "plain", "quiet", "head", "value", "label", "rule"
MET, MISSED, UNKNOWN, WAIVED = "met", "missed", "unknown", "waived"
ROLES = (PLAIN, QUIET, HEAD, VALUE, LABEL, RULE, MET, MISSED, UNKNOWN, WAIVED)
"""What a span is, which decides its colour and nothing else: every meaning is also in its words."""


@dataclass(frozen=True, slots=True)
class Field:
    """Something the user can change in place.

    Attributes:
        path: Where it stands in the sheet's file.
        text: What stands there now, as typed; "" where nothing does.
        key: The description of its key, which gives help, unit and completion.
        title: What it is called, with what it belongs to.
    """

    path: KeyPath
    text: str
    key: Key
    title: str


@dataclass(frozen=True, slots=True)
class Span:
    """A piece of a line: its text as the terminal shows it, what it is, and the field behind it where there is one.

    `width` of 0 takes what the text needs.
    """

    text: str
    role: str = PLAIN
    width: int = 0
    right: bool = False
    field: Field | None = None

    @property
    def shown(self) -> str:
        """The text in its width: cut with a mark, or filled."""
        if not self.width:
            return self.text
        text = cut(self.text, self.width)
        fill = " " * (self.width - width_of(text))
        return fill + text if self.right else text + fill


Line = tuple[Span, ...]


@dataclass(frozen=True, slots=True)
class Row:
    """One or more lines that the cursor takes together.

    Attributes:
        key: Its name within the page ("target.bandwidth").
        lines: What it shows.
        stops: Whether the cursor can stand on it.
        subject: What it is about, for help and algebra: (kind, name), such as ("metric", "bandwidth").
        copied: What copying the row gives, cell by cell; the first is its name.
    """

    key: str
    lines: tuple[Line, ...]
    stops: bool = True
    subject: tuple[str, str] = ("", "")
    copied: tuple[str, ...] = ()

    @property
    def fields(self) -> tuple[Field, ...]:
        """Fields of the row in reading order."""
        return tuple(span.field for line in self.lines for span in line if span.field is not None)


@dataclass(frozen=True, slots=True)
class Page:
    """All rows of a page, with the rows that open a section."""

    rows: tuple[Row, ...] = ()
    sections: tuple[str, ...] = field(default=())


def line(*spans: Span, gap: int = 1) -> Line:
    """Spans beside each other with room between them."""
    out: list[Span] = []
    for k, span in enumerate(spans):
        if k and gap:
            out.append(Span(" " * gap))
        out.append(span)
    return tuple(out)


def width(spans: Sequence[Span]) -> int:
    """Columns that a line takes."""
    return sum(width_of(span.shown) for span in spans)


def heading(key: str, title: str, columns: int, across: str, note: str = "") -> Row:
    """A row that opens a section: its title, a line, and a note at the end."""
    tail = f" {note}" if note else ""
    fill = max(columns - width_of(title) - 2 - width_of(tail), 1)
    spans = (Span(f"{title} ", HEAD), Span(across * fill, RULE), Span(tail, QUIET))
    return Row(key, (spans,), stops=False)
