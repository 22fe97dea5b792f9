"""Rows that every format shares, and how they stand in columns of a terminal.

What the paper can show (signs, colours) is the same for all text of a run, so it is set once around the writing by
whoever writes, and asked for here, where text gets its width.
"""

from __future__ import annotations

import textwrap
import unicodedata
from collections.abc import Iterator, Mapping, Sequence
from contextlib import contextmanager
from contextvars import ContextVar
from dataclasses import dataclass, field
from types import MappingProxyType

from worksheet.model.text import SIGNS, clean, plain_signs

GAP, NARROW_GAP = "  ", " "


@dataclass(frozen=True, slots=True)
class Paper:
    """What text is written on.

    Attributes:
        encoding: Character set; what it lacks is spelled in ASCII, or replaced.
        plain: Whether only ASCII signs may be used, whatever the encoding.
        tones: How a cell that starts with a word is set off: word to the sequences before and after it.
    """

    encoding: str = "utf-8"
    plain: bool = False
    tones: Mapping[str, tuple[str, str]] = field(default_factory=lambda: MappingProxyType({}))

    def shown(self, text: str) -> str:
        """A text as it can be shown: harmless, on one line, in characters that there are."""
        text = clean(text)
        if text.isascii():
            return text
        if self.plain:
            text = plain_signs(text)
        return text.encode(self.encoding, "replace").decode(self.encoding)


_ORDINARY = Paper()
_paper: ContextVar[Paper] = ContextVar("paper")


def paper_for(encoding: str, plain: bool, tones: Mapping[str, tuple[str, str]] | None = None) -> Paper:
    """The paper of a stream.

    Args:
        encoding: Of the stream.
        plain: Whether the user's locale asks for ASCII.
        tones: See Paper; none for no colour.
    """
    try:
        "".join(SIGNS).encode(encoding)
    except (UnicodeEncodeError, LookupError):
        plain = True
    return Paper(encoding, plain, MappingProxyType(dict(tones or {})))


@contextmanager
def on(paper: Paper) -> Iterator[None]:
    """Lay out for a paper what is laid out meanwhile."""
    token = _paper.set(paper)
    try:
        yield
    finally:
        _paper.reset(token)


def can_show(text: str) -> bool:
    """Whether the paper that is being laid out for has all of some characters."""
    paper = _paper.get(_ORDINARY)
    try:
        text.encode("ascii" if paper.plain else paper.encoding)
    except (UnicodeEncodeError, LookupError):
        return False
    return True


@dataclass(frozen=True, slots=True)
class Column:
    """One column: its heading, which side its cells lean to, and how it gives way when space is short.

    A flexible column is cut; one that wraps goes on below, so that nothing is lost. Only the last column may wrap.
    Cells of a toned one are set off by the paper's tones; their words say the same.
    """

    title: str
    right: bool = False
    flexible: bool = False
    wraps: bool = False
    toned: bool = False


@dataclass(frozen=True, slots=True)
class Table:
    """Columns and rows of text; a row has one cell a column."""

    columns: tuple[Column, ...]
    rows: tuple[tuple[str, ...], ...]


def width_of(text: str) -> int:
    """Columns that a text takes in a terminal: wide characters two, combining ones none."""
    return sum(0 if unicodedata.combining(c) else 2 if unicodedata.east_asian_width(c) in "WF" else 1 for c in text)


def cut(text: str, width: int) -> str:
    """A text cut to a number of terminal columns, the cut marked."""
    if width_of(text) <= width:
        return text
    kept = ""
    for character in text:
        if width_of(kept + character) > width - 1:
            break
        kept += character
    return kept + _paper.get(_ORDINARY).shown("…")


def lines(table: Table, width: int, indent: str = "") -> list[str]:
    """A table as lines no wider than `width` columns; gaps, then flexible columns give way, or the one that wraps.

    Args:
        table: What to show.
        width: Columns of the terminal.
        indent: Put before every line.
    """
    shown = _paper.get(_ORDINARY).shown
    rows = [tuple(shown(cell) for cell in row) for row in table.rows]
    widths = [max([width_of(c.title), *(width_of(row[k]) for row in rows)]) for k, c in enumerate(table.columns)]
    gap = GAP
    excess = sum(widths) + len(gap) * (len(widths) - 1) + len(indent) - width
    if excess > 0 and not table.columns[-1].wraps:
        gap = NARROW_GAP
        excess -= (len(GAP) - len(gap)) * (len(widths) - 1)
    for k, column in enumerate(table.columns):
        if excess > 0 and (column.flexible or column.wraps):
            give = min(excess, max(widths[k] - max(6, width_of(column.title)), 0))
            widths[k] -= give
            excess -= give
    heading = tuple(column.title for column in table.columns)
    parts = (part for row in (heading, *rows) for part in _parts(table, row, widths))
    return [(indent + gap.join(_cells(table, part, widths))).rstrip() for part in parts]


def _parts(table: Table, row: tuple[str, ...], widths: Sequence[int]) -> list[tuple[str, ...]]:
    """A row as one line or, where its last cell wraps, as several of which only the first names it."""
    if not table.columns[-1].wraps:
        return [row]
    first, *further = textwrap.wrap(row[-1], widths[-1]) or [""]
    blank = ("",) * (len(row) - 1)
    return [(*row[:-1], first), *((*blank, more) for more in further)]


def _cells(table: Table, row: Sequence[str], widths: Sequence[int]) -> list[str]:
    cells = []
    for column, cell, width in zip(table.columns, row, widths, strict=True):
        shown = cut(cell, width)
        fill = " " * max(width - width_of(shown), 0)
        if column.toned:
            before, after = _paper.get(_ORDINARY).tones.get(shown.partition(" ")[0].lower(), ("", ""))
            shown = f"{before}{shown}{after}"
        cells.append(fill + shown if column.right else shown + fill)
    return cells


def wrapped(text: str, width: int, indent: str = "") -> list[str]:
    """A paragraph of untrusted text as lines no wider than `width` columns."""
    text = _paper.get(_ORDINARY).shown(text)
    return textwrap.wrap(text, width, initial_indent=indent, subsequent_indent=indent) or [indent.rstrip()]
