"""The edits that make one piece of a file say what another one says, comments kept where they can be.

Merging uses them to bring in what the other side changed, and settling to put one side in the place of another.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from typing import Any

from worksheet.compare.same import FORMULA, TARGET, VALUE, same, stated
from worksheet.model.sheet_keys import SHEET
from worksheet.sheetfile.document import KeyPath
from worksheet.sheetfile.edit import AddEntry, AddTable, Edit, RemoveKey, SetValue, find

_ARRAYS = {table.name for table in SHEET.tables if table.repeated}
_OTHER_WAY = {VALUE: FORMULA, FORMULA: VALUE}


def edits(path: KeyPath, ours: Any, theirs: Any) -> Iterator[Edit]:
    """The edits that make what stands at a path say what the other side says.

    Args:
        path: Where.
        ours: What stands there, None for nothing.
        theirs: What is to stand there, None for nothing.
    """
    if same(path, ours, theirs):
        return
    if theirs is None:
        yield RemoveKey(path)
    elif ours is None:
        yield _new(path, theirs)
    elif isinstance(ours, dict) and isinstance(theirs, dict):
        yield from _table(path, ours, theirs)
    elif isinstance(ours, dict) and stated(path, ours):
        yield from _table(path, ours, {VALUE: theirs})
    elif isinstance(theirs, dict) and stated(path, theirs):
        yield from _beside(path, ours, theirs)
    elif isinstance(ours, dict) or isinstance(theirs, dict):
        yield from (RemoveKey(path), _new(path, theirs))
    else:
        yield SetValue(path, theirs)


def settling(data: Mapping[str, Any], path: KeyPath, ours: Any, wanted: Any) -> list[Edit]:
    """The edits that put a value in the place where a collision stands.

    Args:
        data: The file.
        path: The collision's key.
        ours: What the collision says the file holds; among the entries of an array it tells which one.
        wanted: What is to stand there, None for nothing.
    """
    present = find(data, path)
    given = [one for one in (ours, wanted) if one is not None]
    if (
        len(path) != 1
        or not is_entries(given)
        or not (present is None or is_entries(present))
        or path[0] not in _ARRAYS
    ):
        return list(edits(path, present, wanted))
    name = str(path[0])
    place = next((number for number, one in enumerate(present or []) if same((), one, ours)), None)
    if place is not None:
        return list(edits((name, place), ours, wanted))
    return [] if wanted is None else [AddEntry(name, wanted)]


def is_entries(value: Any) -> bool:
    """Whether it is an array of tables."""
    return isinstance(value, list) and bool(value) and all(isinstance(one, dict) for one in value)


def _table(path: KeyPath, ours: Mapping[str, Any], theirs: Mapping[str, Any]) -> Iterator[Edit]:
    """Key by key; a value that becomes a formula, or the other way round, is one edit."""
    swapped = [key for key in theirs if len(path) > 1 and key not in ours and _OTHER_WAY.get(key) in ours]
    swapped = [key for key in swapped if _OTHER_WAY[key] not in theirs]
    for key in [*swapped, *(key for key in theirs if key not in swapped)]:
        yield from edits((*path, key), ours.get(key), theirs[key])
    gone = (key for key in ours if key not in theirs and _OTHER_WAY.get(key) not in swapped)
    yield from (RemoveKey((*path, key)) for key in gone)


def _beside(path: KeyPath, ours: Any, theirs: Mapping[str, Any]) -> Iterator[Edit]:
    """A bare value gets something beside it."""
    if FORMULA in theirs:
        yield SetValue((*path, FORMULA), theirs[FORMULA])
    elif not same((*path, VALUE), ours, theirs[VALUE]):
        yield SetValue(path, theirs[VALUE])
    yield from (SetValue((*path, key), theirs[key]) for key in theirs if key not in _OTHER_WAY)


def _new(path: KeyPath, value: Any) -> Edit:
    """Enter what did not exist: a table of its own as a table, anything else as a value."""
    names = tuple(part for part in path if isinstance(part, str))
    own_table = isinstance(value, dict) and not stated(path, value) and (path[0] != TARGET or len(path) == 1)
    return AddTable(names, value) if own_table and names == path else SetValue(path, value)
