"""The way back: what a change did to files, kept small, and what undoes it.

A change is kept as the piece of each file that became another piece, with digests of the whole before and after, so
ten thousand steps of a sheet take no more than the characters that changed. Where a file is still what the change
left, every byte returns; where somebody else changed it since, the values are put back one by one as long as they are
still what the change left.
"""

from __future__ import annotations

import hashlib
from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from typing import Any

from worksheet.model.text import clean
from worksheet.session.edits import (
    AddEntry,
    FileChange,
    KeyPath,
    Piece,
    Put,
    RefusedError,
    TakeOut,
    changed_content,
    value_at,
)
from worksheet.session.reading import data_of
from worksheet.session.snapshot import Snapshot
from worksheet.sheetfile.locate import dotted

_EITHER: dict[str | int, str] = {"value": "formula", "formula": "value"}
_LARGEST = 4_000
"""Most characters of values that a step keeps beside its bytes."""


@dataclass(frozen=True, slots=True)
class Patch:
    """One file's change: `old` at byte `at` became `new`; digests of the whole, None where there is no file."""

    file: str
    at: int
    old: bytes
    new: bytes
    before: bytes | None
    after: bytes | None

    @property
    def inverse(self) -> Patch:
        """The way back."""
        return Patch(self.file, self.at, self.new, self.old, self.after, self.before)

    def fits(self, content: bytes | None) -> bool:
        """Whether the file is what this change starts from."""
        return digest(content) == self.before

    def made(self, content: bytes | None) -> FileChange:
        """The change to a file that fits."""
        if self.after is None:
            return FileChange(self.file, content, None)
        whole = content or b""
        after = whole[: self.at] + self.new + whole[self.at + len(self.old) :]
        return FileChange(self.file, content, after)


@dataclass(frozen=True, slots=True)
class Moved:
    """A value that a change moved, None where there was or is none; of an array of tables, one entry of it."""

    file: str
    path: KeyPath
    old: Any
    new: Any


@dataclass(frozen=True, slots=True)
class Step:
    """One accepted change: its title, its files, its values."""

    title: str
    patches: tuple[Patch, ...]
    moved: tuple[Moved, ...] = ()

    @property
    def inverse(self) -> Step:
        """The step back: files in the other order, so that nothing is missing in between."""
        return Step(
            self.title,
            tuple(patch.inverse for patch in reversed(self.patches)),
            tuple(Moved(one.file, one.path, one.new, one.old) for one in reversed(self.moved)),
        )


def digest(content: bytes | None) -> bytes | None:
    """Tells contents apart; None for no file."""
    return None if content is None else hashlib.blake2b(content, digest_size=16).digest()


def patch_of(change: FileChange) -> Patch:
    """A change of a file, kept as the piece that differs."""
    before, after = change.before or b"", change.after or b""
    shared = min(len(before), len(after))
    start = _same(before, after, shared)
    end = _same(before[::-1], after[::-1], shared - start)
    old, new = before[start : len(before) - end], after[start : len(after) - end]
    return Patch(change.file, start, old, new, digest(change.before), digest(change.after))


def _same(one: bytes, other: bytes, most: int) -> int:
    """How many bytes two contents share from their start."""
    low, high = 0, most
    while low < high:
        middle = (low + high + 1) // 2
        if one[:middle] == other[:middle]:
            low = middle
        else:
            high = middle - 1
    return low


def moved_by(made: Sequence[FileChange]) -> tuple[Moved, ...]:
    """The values that a change moves, for a way back that other people's changes beside them do not bar.

    None of files that come or go, and none at all where a text is too long to be kept twice: then every byte goes back
    or none.
    """
    found: list[Moved] = []
    for change in made:
        if change.before is None or change.after is None:
            continue
        before, after = data_of(change.before, change.file), data_of(change.after, change.file)
        found += _differences(change.file, (), before, after)
    return () if sum(len(repr(one.old)) + len(repr(one.new)) for one in found) > _LARGEST else tuple(found)


def _differences(file: str, path: KeyPath, before: Any, after: Any) -> Iterator[Moved]:
    if isinstance(before, dict) and isinstance(after, dict):
        for key in dict.fromkeys((*before, *after)):
            yield from _differences(file, (*path, key), before.get(key), after.get(key))
    elif len(path) == 1 and all(one is None or _is_entries(one) for one in (before, after)):
        old, new = list(before or ()), list(after or ())
        for entry in list(old):
            if entry in new:
                old.remove(entry)
                new.remove(entry)
        yield from (Moved(file, path, entry, None) for entry in old)
        yield from (Moved(file, path, None, entry) for entry in new)
    elif before != after:
        yield Moved(file, path, before, after)


def _is_entries(value: Any) -> bool:
    return isinstance(value, list) and all(isinstance(entry, dict) for entry in value)


def step_back(step: Step, snapshot: Snapshot) -> tuple[FileChange, ...]:
    """What taking a step does to the files as they stand; give it the inverse to go back.

    Raises: RefusedError where somebody else changed what the step would change; WriteRefusedError.
    """
    contents = snapshot.contents
    if all(patch.fits(contents.get(patch.file)) for patch in step.patches):
        return tuple(patch.made(contents.get(patch.file)) for patch in step.patches)
    made = []
    for patch in step.patches:
        content = contents.get(patch.file)
        moved = [one for one in step.moved if one.file == patch.file]
        if patch.fits(content):
            made.append(patch.made(content))
        elif content is None or not moved:
            raise RefusedError("", f"{step.title}: {clean(patch.file)} was changed by something else since.")
        else:
            made.append(FileChange(patch.file, content, _put_back(step.title, content, moved)))
    return tuple(made)


def _put_back(title: str, content: bytes, moved: Sequence[Moved]) -> bytes:
    """A file that somebody else changed too, with some values put back that are still what the step left."""
    pieces: list[Piece] = []
    arrays: dict[KeyPath, list[Any]] = {}
    data = data_of(content, moved[0].file)
    for one in moved:
        present = value_at(data, one.path)
        entries = arrays.setdefault(one.path, list(present)) if len(one.path) == 1 and _is_entries(present) else None
        if isinstance(one.old, dict) and len(one.path) == 1 and entries is not None and one.old in entries:
            number = entries.index(one.old)
            pieces.append(TakeOut((*one.path, number)))
            entries.pop(number)
        elif isinstance(one.new, dict) and len(one.path) == 1 and one.old is None:
            pieces.append(AddEntry(str(one.path[0]), one.new))
        elif present != one.old:
            raise RefusedError("", f"{title}: {clean(dotted(one.path))} was changed by something else since.")
        else:
            pieces += _stated(one.path, present, one.new)
    return changed_content(content, _swapped(pieces))


def _swapped(pieces: list[Piece]) -> list[Piece]:
    """A value that takes a formula's place, or the other way round, does so where it stands."""
    coming = {piece.path for piece in pieces if isinstance(piece, Put)}
    return [
        piece
        for piece in pieces
        if not isinstance(piece, TakeOut)
        or piece.path[-1] not in _EITHER
        or (*piece.path[:-1], _EITHER[piece.path[-1]]) not in coming
    ]


def _stated(path: KeyPath, present: Any, value: Any) -> list[Piece]:
    if value is None:
        return [TakeOut(path)]
    swapped = isinstance(present, dict) or (isinstance(value, dict) and present is not None)
    return [*([TakeOut(path)] if swapped else []), Put(path, value)]
