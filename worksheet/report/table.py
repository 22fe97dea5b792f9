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
    """One column: its heading, which side its cells lean to, and whether it may be cut when space is short."""

    title: str
    right: bool = False
    flexible: bool = False


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
    """A table as lines no wider than `width` columns; flexible columns give way first.

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
        if excess > 0 and column.flexible:
            give = min(excess, max(widths[k] - max(6, width_of(column.title)), 0))
            widths[k] -= give
            excess -= give
    heading = tuple(column.title for column in table.columns)
    return [(indent + GAP.join(_cells(table, row, widths))).rstrip() for row in (heading, *rows)]


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
