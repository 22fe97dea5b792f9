"""What another revision stated, taken back as an edit: one value, one sheet, or the whole project."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from worksheet.session.edits import ChangeSheet, KeyPath, Piece, Put, TakeBack, TakeOut, value_at
from worksheet.session.reading import data_of
from worksheet.session.snapshot import Snapshot, file_of

Files = Mapping[str, bytes]
"""Contents of a project's files at a revision, by path."""

_ENTRIES = ("evidence", "waiver", "remark", "acceptance", "collision")


def value(snapshot: Snapshot, then: Files, sheet: str, key: str, revision: str) -> ChangeSheet | None:
    """The edit that makes one value of a sheet what it was.

    Args:
        snapshot: The book as it stands.
        then: The project's files at the revision.
        sheet: The sheet, there in both.
        key: The dotted key, as comparisons name it.
        revision: For undo.
    Returns: None where the value is what it was, or where either state does not have the sheet
    """
    shown = file_of(sheet)
    if shown not in then or shown not in snapshot.contents:
        return None
    path = _path(key)
    was, now = value_at(data_of(then[shown], shown), path), value_at(snapshot.data(sheet), path)
    if was == now:
        return None
    if path[0] in _ENTRIES:  # the place of an entry means nothing, so a single entry is not taken back by its place
        return None
    return ChangeSheet(sheet, tuple(_pieces(path, was, now)), f"{key} as in {revision}")


def _pieces(path: KeyPath, was: Any, now: Any) -> list[Piece]:
    if was is None:
        return [TakeOut(path)]
    if isinstance(was, Mapping):
        if isinstance(now, Mapping):  # what stands beside the value stays as it is
            inner = "formula" if "formula" in was else "value"
            return [Put((*path, inner), was[inner])] if inner in was else [Put(path, was)]
        return [*([TakeOut(path)] if now is not None else []), Put(path, dict(was))]
    return [Put(path, was)]


def _path(key: str) -> KeyPath:
    return tuple(int(part) if part.isdigit() else part for part in key.split("."))


def sheet(then: Files, name: str, revision: str) -> TakeBack:
    """The edit that makes one sheet what it was; one that was not there yet goes."""
    file = file_of(name)
    return TakeBack(name, {file: then.get(file)}, f"{name} as in {revision}")


def project(snapshot: Snapshot, then: Files, revision: str) -> TakeBack:
    """The edit that makes every sheet, the process file and the project's own file what they were."""
    gone = [file for file in snapshot.contents if file not in then]
    return TakeBack("", {**dict.fromkeys(gone), **then}, f"the project as in {revision}")
