"""A collision that a merge left in a sheet, settled by its reader: an edit like any other."""

from __future__ import annotations

from typing import Any, Literal

from worksheet.compare.taking import settling
from worksheet.model.problem import Problem
from worksheet.model.sheet_keys import COLLISION
from worksheet.sheetfile import source
from worksheet.sheetfile.document import WriteRefusedError
from worksheet.sheetfile.edit import Edit, RemoveKey, apply
from worksheet.sheetfile.locate import split
from worksheet.sheetfile.source import Source

Side = Literal["standing", "base", "ours", "theirs"]
"""What a collision is settled for: what the file says by now, or what one side gave, or what both started from."""

_X = "x"


def settle_edits(text: str, number: int, side: Side, name: str) -> tuple[Edit, ...] | Problem:
    """The edits that settle one collision and take it out of the sheet.

    Args:
        text: The sheet.
        number: Of the collision among those of the sheet, counted from 0.
        side: What the key is to say.
        name: What a message calls the sheet.
    """
    read = source.parse(text, name)
    if not isinstance(read, Source):
        return read[0]
    entries = read.data.get(COLLISION.name)
    if not isinstance(entries, list) or not 0 <= number < len(entries) or not isinstance(entries[number], dict):
        return Problem(name, None, COLLISION.name, f"There is no collision {number + 1} in this sheet.")
    entry = entries[number]
    line = read.places.line(f"{COLLISION.name}.{number}")
    out = RemoveKey((COLLISION.name, number))
    if side == "standing":
        return (out,)
    path = tuple(split(entry["key"])) if isinstance(entry.get("key"), str) else ()
    values = [_value(entry.get(key)) for key in ("ours", side)]
    if not path or path[0] == COLLISION.name or any(isinstance(value, Problem) for value in values):
        message = "This collision cannot be read; settle it by hand and delete it."
        return Problem(name, line, f"{COLLISION.name}.{number}", message)
    return (*settling(read.data, path, values[0], values[1]), out)


def settle(text: str, number: int, side: Side, name: str) -> str | Problem:
    """The sheet with one collision settled; see settle_edits."""
    edits = settle_edits(text, number, side, name)
    if isinstance(edits, Problem):
        return edits
    try:
        return apply(text, edits)
    except WriteRefusedError as error:
        return Problem(name, None, f"{COLLISION.name}.{number}", str(error))


def _value(written: object) -> Any:
    """A value that stands in a collision as TOML; None where it has none, a Problem where it is not one value."""
    if written is None:
        return None
    read = source.parse(f"{_X} = {written}", "") if isinstance(written, str) else None
    if not isinstance(read, Source) or read.data.keys() != {_X}:
        return Problem("", None, "", "no value")
    return read.data[_X]
