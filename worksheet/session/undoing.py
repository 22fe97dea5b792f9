"""The way back: what a change did to files, kept small, and what undoes it.

A change is kept as the piece of each file that became another piece, with digests of the whole before and after, so
ten thousand steps of a sheet take no more than the characters that changed. Where a file is still what the change
left, every byte returns; where somebody else changed it since, the values are put back one by one as long as they are
still what the change left.
"""

from __future__ import annotations

import hashlib
from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

from worksheet.session.edits import (
    ChangeSheet,
    FileChange,
    KeyPath,
    Piece,
    Put,
    RefusedError,
    Request,
    TakeOut,
    changed,
    value_at,
)
from worksheet.session.snapshot import Snapshot, file_of


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
    """A value that a change moved, None where there was or is none."""

    sheet: str
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
            tuple(Moved(one.sheet, one.path, one.new, one.old) for one in reversed(self.moved)),
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


def moved_by(request: Request, before: Mapping[str, Any], after: Mapping[str, Any]) -> tuple[Moved, ...]:
    """The values that a request moves in one sheet, for a way back that other changes do not bar."""
    if not isinstance(request, ChangeSheet):
        return ()
    found = []
    for piece in request.pieces:
        if isinstance(piece, Put | TakeOut):
            old, new = value_at(before, piece.path), value_at(after, piece.path)
            if not isinstance(old, dict | list) and not isinstance(new, dict | list):
                found.append(Moved(request.sheet, piece.path, old, new))
    return tuple(found)


def step_back(step: Step, snapshot: Snapshot) -> tuple[FileChange, ...]:
    """What taking a step does to the files as they stand; give it the inverse to go back.

    Raises: RefusedError where somebody else changed what the step would change; WriteRefusedError.
    """
    contents = snapshot.contents
    if all(patch.fits(contents.get(patch.file)) for patch in step.patches):
        return tuple(patch.made(contents.get(patch.file)) for patch in step.patches)
    if not step.moved or len(step.patches) != 1:
        raise RefusedError("", f"{step.title}: the files were changed by something else since.")
    sheet = step.moved[0].sheet
    data = snapshot.data(sheet)
    pieces: list[Piece] = []
    for one in step.moved:
        if value_at(data, one.path) != one.old:
            raise RefusedError("", f"{step.title}: {_dotted(one.path)} was changed by something else since.")
        pieces.append(TakeOut(one.path) if one.new is None else Put(one.path, one.new))
    before = contents.get(file_of(sheet))
    return (FileChange(file_of(sheet), before, changed(snapshot, sheet, tuple(pieces))),)


def _dotted(path: KeyPath) -> str:
    return ".".join(str(part) for part in path)
