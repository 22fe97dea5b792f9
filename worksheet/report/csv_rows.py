"""Rows as lines of CSV (RFC 4180, UTF-8): plain numbers in SI units, an empty cell for one that does not exist."""

from __future__ import annotations

import csv
import io
import re
from collections.abc import Iterable, Iterator, Sequence
from typing import Any

from worksheet.model.text import clean

_ACTS = ("=", "+", "-", "@", "\t", "\r")
"""What makes a spreadsheet take a text for a formula."""

_PLAIN = re.compile(r"[+-][\d.]+[\w %/°]*")
"""A signed number with its unit, which is none."""


def csv_lines(rows: Iterable[Sequence[Any]]) -> Iterator[str]:
    """Lines without their ends."""
    for row in rows:
        held = io.StringIO()
        csv.writer(held, lineterminator="").writerow([_cell(value) for value in row])
        yield held.getvalue()


def _cell(value: Any) -> str:
    if value is None:
        return ""
    if isinstance(value, list):
        return " ".join(map(_cell, value))
    return harmless(value) if isinstance(value, str) else repr(value)


def harmless(text: str) -> str:
    """Text that no spreadsheet takes for a formula."""
    text = clean(text)
    return f"'{text}" if text.startswith(_ACTS) and not _PLAIN.fullmatch(text) else text
