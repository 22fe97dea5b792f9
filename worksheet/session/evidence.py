"""Evidence put into sheets: one piece, or a table of many, all or nothing; and the calculation beside it."""

from __future__ import annotations

import csv
import io
import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from worksheet.model.keys import Kind
from worksheet.model.problem import Problem
from worksheet.model.project_keys import CONDITION
from worksheet.model.sheet_keys import EVIDENCE
from worksheet.model.text import clean, nearest
from worksheet.session import fields
from worksheet.session.edits import AddEntry, ChangeSheet, Put
from worksheet.session.session import Session
from worksheet.session.snapshot import Snapshot

SHEET = "sheet"
"""The column that names the block."""

_AT = "at"
_LARGEST = 20_000_000
_KEYS = tuple(key.name for key in EVIDENCE.keys)
_SPLIT = tuple(f"{_AT}_{key.name}" for key in CONDITION.keys)
COLUMNS = (SHEET, *_KEYS, *_SPLIT)
"""What a table of evidence may hold: the keys of [[evidence]]; a condition in one column or in three."""


@dataclass(frozen=True, slots=True)
class Cells:
    """One piece of evidence as typed: the block, texts by key, and where they come from, for messages."""

    sheet: str
    texts: Mapping[str, str]
    file: str
    line: int | None


def read_table(path: Path) -> list[Cells] | list[Problem]:
    """The rows of a table of evidence with a header, or what is wrong with it."""
    shown = clean(str(path))
    try:
        with path.open("rb") as file:
            raw = file.read(_LARGEST + 1)
        text = raw.decode("utf-8-sig")
    except (OSError, ValueError) as error:
        return [
            Problem(shown, None, "", f"cannot be read: {getattr(error, 'strerror', None) or 'it is no UTF-8 text'}")
        ]
    if len(raw) > _LARGEST:
        return [Problem(shown, None, "", f"Found more than {_LARGEST // 1_000_000} MB, expected a table of evidence.")]
    try:
        lines = list(csv.reader(io.StringIO(text), strict=True))
    except csv.Error as error:
        return [Problem(shown, None, "", f"Found no table with commas: {clean(str(error))}")]
    if not lines:
        return [Problem(shown, 1, "", f"Found an empty table, expected a header with {', '.join(COLUMNS[:4])}.")]
    header = [cell.strip() for cell in lines[0]]
    problems = [_unknown(shown, name) for name in header if name not in COLUMNS]
    problems += [
        Problem(shown, 1, name, f"The column is missing; expected {name} in every row.")
        for name in (SHEET, "metric", "value", "found_by")
        if name not in header
    ]
    found = []
    for number, cells in enumerate(lines[1:], 2):
        if not any(cell.strip() for cell in cells):
            continue
        if len(cells) != len(header):
            problems.append(Problem(shown, number, "", f"Found {len(cells)} columns, expected {len(header)}."))
            continue
        row = {name: cell.strip() for name, cell in zip(header, cells, strict=True) if cell.strip()}
        at = [row.pop(name) for name in _SPLIT if name in row]
        if at:
            row[_AT] = ", ".join(at)
        found.append(Cells(row.pop(SHEET, ""), row, shown, number))
    return problems or found


def _unknown(shown: str, name: str) -> Problem:
    near = nearest(name, COLUMNS)
    hint = f"did you mean {near}?" if near else f"expected some of {', '.join(COLUMNS)}."
    return Problem(shown, 1, clean(name), f"Found the unknown column {clean(name)}; {hint}")


def put(session: Session, every: Sequence[Cells], bases: Mapping[str, str]) -> list[Problem]:
    """Put evidence into its sheets; where anything is wrong with a piece of it, nothing is written.

    Args:
        session: The book.
        every: The pieces.
        bases: The present digest of every sheet, which evidence without a basis of its own is tied to.
    Returns: every problem
    """
    snapshot = session.snapshot()
    problems: list[Problem] = []
    entries: dict[str, list[AddEntry]] = {}
    for one in every:
        if one.sheet not in snapshot.project.sheets:
            problems.append(_no_sheet(snapshot, one))
            continue
        found = _entry(snapshot, one, bases.get(one.sheet, ""))
        if isinstance(found, list):
            problems += found
        else:
            entries.setdefault(one.sheet, []).append(AddEntry(EVIDENCE.name, found))
    if problems:
        return problems
    for done, (name, pieces) in enumerate(entries.items()):
        said = "evidence" if len(pieces) == 1 else f"{len(pieces)} pieces of evidence"
        outcome = session.apply(ChangeSheet(name, tuple(pieces), said))
        if not outcome.accepted:
            for _ in range(done):
                session.undo()
            return list(outcome.problems)
    return []


def _no_sheet(snapshot: Snapshot, one: Cells) -> Problem:
    near = nearest(one.sheet, snapshot.names)
    hint = f"did you mean {near}?" if near else f"expected one of {', '.join(snapshot.names)}."
    return Problem(one.file, one.line, SHEET, f"Found no readable sheet {clean(one.sheet)}; {hint}")


def _entry(snapshot: Snapshot, one: Cells, basis: str) -> dict[str, Any] | list[Problem]:
    """The values of one [[evidence]], or what is wrong with its texts."""
    texts = {"basis": basis, **one.texts}
    problems = []
    values: dict[str, Any] = {}
    for key in EVIDENCE.keys:
        text = texts.get(key.name, "")
        if not text:
            if key.required:
                problems.append(
                    Problem(one.file, one.line, key.name, f"Nothing is stated; expected {key.title.lower()}.")
                )
            continue
        place = fields.coming(snapshot, one.sheet, (EVIDENCE.name, 0, key.name), texts.get("metric", ""))
        if place is None:
            continue
        if key.name == "metric" and text not in place.known:
            near = nearest(text, place.known)
            hint = f"did you mean {near}?" if near else "expected a metric, a target or DEVICE.VALUE."
            problems.append(Problem(one.file, one.line, key.name, f"Found {clean(text)}; {hint}"))
            continue
        number = _bare(text) if key.kind is Kind.QUANTITY else None
        if number is not None:  # a bare number is SI, as in the files
            values[key.name] = number
            continue
        found = fields.read(place, text)
        if isinstance(found, str):
            problems.append(Problem(one.file, one.line, key.name, found))
            continue
        for piece in found:
            if isinstance(piece, Put):
                values[key.name] = piece.value
    return problems or values


def _bare(text: str) -> float | None:
    """A number without a unit, None where the text is none."""
    try:
        number = float(text)
    except ValueError:
        return None
    return number if math.isfinite(number) else None
