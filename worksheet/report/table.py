"""Rows that every format shares, and how they stand in columns of a terminal."""

from __future__ import annotations

import textwrap
import unicodedata
from collections.abc import Sequence
from dataclasses import dataclass

from worksheet.model.text import clean

GAP = "  "


@dataclass(frozen=True, slots=True)
class Column:
    """One column: its heading, which side its cells lean to, and how it gives way when space is short.

    A flexible column is cut; one that wraps goes on below, so that nothing is lost. Only the last column may wrap.
    """

    title: str
    right: bool = False
    flexible: bool = False
    wraps: bool = False


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
    return kept + "…"


def lines(table: Table, width: int, indent: str = "") -> list[str]:
    """A table as lines no wider than `width` columns; columns that wrap or are flexible give way.

    Args:
        table: What to show.
        width: Columns of the terminal.
        indent: Put before every line.
    """
    rows = [tuple(clean(cell) for cell in row) for row in table.rows]
    widths = [max([width_of(c.title), *(width_of(row[k]) for row in rows)]) for k, c in enumerate(table.columns)]
    room = width - len(indent) - len(GAP) * (len(widths) - 1)
    excess = sum(widths) - room
    for k, column in enumerate(table.columns):
        if excess > 0 and (column.flexible or column.wraps):
            give = min(excess, max(widths[k] - max(6, width_of(column.title)), 0))
            widths[k] -= give
            excess -= give
    heading = tuple(column.title for column in table.columns)
    shown = (part for row in (heading, *rows) for part in _parts(table, row, widths))
    return [(indent + GAP.join(_cells(table, part, widths))).rstrip() for part in shown]


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
        cells.append(fill + shown if column.right else shown + fill)
    return cells


def wrapped(text: str, width: int, indent: str = "") -> list[str]:
    """A paragraph of untrusted text as lines no wider than `width` columns."""
    return textwrap.wrap(clean(text), width, initial_indent=indent, subsequent_indent=indent) or [indent.rstrip()]
