"""What a user can ask to have changed, as frozen values, and what each request makes of the files.

A request becomes contents of files, before and after, so every change has its inverse: the way back returns every byte.
Nothing is written here.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass, field
from typing import TYPE_CHECKING, Any

from worksheet.compare import conflict
from worksheet.model import formula
from worksheet.model.problem import Problem
from worksheet.project.discover import PROJECT_FILE
from worksheet.session.reading import data_of
from worksheet.session.snapshot import Snapshot, file_of

if TYPE_CHECKING:  # what edits a text comes with a library that nothing needs before the first edit
    from worksheet.compare.settle import Side
    from worksheet.sheetfile.edit import Edit

KeyPath = tuple[str | int, ...]


@dataclass(frozen=True, slots=True)
class Put:
    """State a value at a path of a sheet, new or in place of another."""

    path: KeyPath
    value: Any


@dataclass(frozen=True, slots=True)
class TakeOut:
    """Take a key, a table or an entry of a list of tables out."""

    path: KeyPath


@dataclass(frozen=True, slots=True)
class AddEntry:
    """One more [[evidence]] or [[waiver]]."""

    array: str
    values: Mapping[str, Any]


Piece = Put | TakeOut | AddEntry


@dataclass(frozen=True, slots=True)
class ChangeSheet:
    """Change values of one sheet.

    Attributes:
        sheet: Its name.
        pieces: What changes, in order.
        title: In words, for undo.
        expected: What stood at a path when the user began to change it; another value there now is asked about.
    """

    sheet: str
    pieces: tuple[Piece, ...]
    title: str
    expected: Mapping[KeyPath, Any] = field(default_factory=dict)


@dataclass(frozen=True, slots=True)
class NewSheet:
    """Start a sheet."""

    name: str
    stage: str
    device: str
    title: str = ""


@dataclass(frozen=True, slots=True)
class DuplicateSheet:
    """Copy a sheet under another name."""

    name: str
    copy: str


@dataclass(frozen=True, slots=True)
class RenameSheet:
    """Give a sheet another name; formulas of other sheets follow."""

    name: str
    new: str


@dataclass(frozen=True, slots=True)
class DeleteSheet:
    """Take a sheet out of the project."""

    name: str


@dataclass(frozen=True, slots=True)
class SettleCollision:
    """Settle a collision that a merge left in a sheet.

    Attributes:
        name: The sheet.
        number: Of the collision in the sheet, counted from 0.
        side: "standing" for what the sheet says by now, "ours", "theirs", or "base" for what both started from.
    """

    name: str
    number: int
    side: Side


@dataclass(frozen=True, slots=True)
class TakeSide:
    """Take one side of a sheet that holds a merge's conflict markers: "ours" or "theirs"."""

    name: str
    side: str


@dataclass(frozen=True, slots=True)
class TakeBack:
    """Make files what they were at another time.

    Attributes:
        name: The sheet; "" for several files.
        files: Contents by path within the project; None for a file that is not to be there.
        what: In words, for undo.
    """

    name: str
    files: Mapping[str, bytes | None]
    what: str


Request = ChangeSheet | NewSheet | DuplicateSheet | RenameSheet | DeleteSheet | SettleCollision | TakeSide | TakeBack


def name_of(request: Request) -> str:
    """The sheet that a request is about."""
    return request.sheet if isinstance(request, ChangeSheet) else request.name


@dataclass(frozen=True, slots=True)
class FileChange:
    """A file before and after; None where it does not exist.

    `like` names the file whose permissions a new one takes; "" for the usual ones.
    """

    file: str
    before: bytes | None
    after: bytes | None
    like: str = ""


class RefusedError(Exception):
    """A request that cannot be met; str() is a sentence, `key` what it is about."""

    def __init__(self, key: str, message: str) -> None:
        super().__init__(message)
        self.key = key


def title_of(request: Request) -> str:
    """A request in words, for undo and messages."""
    match request:
        case ChangeSheet(sheet, _, title):
            return f"{title} in {sheet}"
        case NewSheet(name):
            return f"new sheet {name}"
        case DuplicateSheet(name, copy):
            return f"copy of {name} as {copy}"
        case RenameSheet(name, new):
            return f"{name} renamed {new}"
        case DeleteSheet(name):
            return f"{name} taken out"
        case SettleCollision(name):
            return f"collision settled in {name}"
        case TakeSide(name, side):
            return f"{side} taken for {name}"
        case TakeBack(_, _, what):
            return what


def changes(request: Request, snapshot: Snapshot) -> tuple[FileChange, ...]:
    """What a request makes of the files.

    Raises: RefusedError, WriteRefusedError (a ValueError).
    """
    match request:
        case ChangeSheet(sheet, pieces):
            return (FileChange(file_of(sheet), _content(snapshot, sheet), changed(snapshot, sheet, pieces)),)
        case NewSheet():
            return (FileChange(_free(snapshot, request.name), None, _new(request).encode()),)
        case DuplicateSheet(name, copy):
            content = _following(_content(snapshot, name), file_of(name), name, copy)
            return (FileChange(_free(snapshot, copy), None, content, like=file_of(name)),)
        case RenameSheet(name, new):
            return _renamed(snapshot, name, new)
        case DeleteSheet(name):
            return (FileChange(file_of(name), _content(snapshot, name), None),)
        case TakeBack(_, files):
            present = snapshot.contents
            found = [FileChange(file, present.get(file), content) for file, content in files.items()]
            return tuple(one for one in found if one.before != one.after)
        case SettleCollision() | TakeSide():
            before = _content(snapshot, request.name)
            text = before.decode("utf-8")
            after = _settled(request, text) if isinstance(request, SettleCollision) else _one_side(request, text)
            return (FileChange(file_of(request.name), before, after.encode()),)


def _settled(request: SettleCollision, text: str) -> str:
    from worksheet.compare.settle import settle

    found = settle(text, request.number, request.side, file_of(request.name))
    if isinstance(found, Problem):
        raise RefusedError(found.key, found.message)
    return found


def _one_side(request: TakeSide, text: str) -> str:
    sides = conflict.split(text)
    if sides is None or request.side not in ("ours", "theirs"):
        raise RefusedError("", f"{request.name} holds no two sides to choose from.")
    return sides.ours if request.side == "ours" else sides.theirs


def changed(snapshot: Snapshot, sheet: str, pieces: Sequence[Piece]) -> bytes:
    """A sheet's content after some pieces. WriteRefusedError where one cannot be made."""
    return changed_content(_content(snapshot, sheet), pieces)


def changed_content(content: bytes, pieces: Sequence[Piece]) -> bytes:
    """A content after some pieces. WriteRefusedError where one cannot be made."""
    from worksheet.sheetfile import edit

    made: list[Edit] = []
    for piece in pieces:
        match piece:
            case Put(path, value):
                if isinstance(value, Mapping) and value_at(data_of(content, ""), path) is not None:
                    made.append(edit.RemoveKey(path))
                made.append(edit.SetValue(path, value))
            case TakeOut(path):
                made.append(edit.RemoveKey(path))
            case AddEntry(array, values):
                made.append(edit.AddEntry(array, values))
    return edit.apply(content.decode("utf-8"), made).encode("utf-8")


def _content(snapshot: Snapshot, name: str) -> bytes:
    content = snapshot.contents.get(file_of(name))
    if content is None:
        raise RefusedError("", f"There is no sheet {name} any more.")
    return content


def _free(snapshot: Snapshot, name: str) -> str:
    """The file of a new sheet."""
    from worksheet.sheetfile.names import sheet_name_problem

    wrong = sheet_name_problem(name)
    if wrong:
        raise RefusedError("name", wrong)
    if name in snapshot.names:
        raise RefusedError("name", f"There is a sheet {name} already.")
    return file_of(name)


def _new(request: NewSheet) -> str:
    from worksheet.session.starter import sheet_text
    from worksheet.sheetfile.edit import SetValue, apply
    from worksheet.stages import catalogue

    stage = catalogue.find(request.stage)
    if stage is None:
        raise RefusedError("stage", f"There is no stage {request.stage}; there are {', '.join(catalogue.keys())}.")
    title = request.title or request.name.replace("_", " ").capitalize()
    return apply(sheet_text(stage), [SetValue(("device",), request.device), SetValue(("title",), title)])


def _renamed(snapshot: Snapshot, name: str, new: str) -> tuple[FileChange, ...]:
    """The new file first and the old one last, so that every formula finds its sheet at any moment."""
    content = _content(snapshot, name)
    target, source = _free(snapshot, new), file_of(name)
    others = []
    for other in snapshot.names:
        shown = file_of(other)
        before = snapshot.contents.get(shown)
        after = None if before is None or other == name else _following(before, shown, name, new)
        if after != before and after is not None:
            others.append(FileChange(shown, before, after))
    others += _chains_following(snapshot, name, new)
    own = FileChange(target, None, _following(content, source, name, new), like=source)
    return (own, *others, FileChange(source, content, None))


def _following(content: bytes, shown: str, name: str, new: str) -> bytes:
    """A sheet whose formulas name another sheet by its new name; one that is no TOML stays as it is."""
    pieces = list(_formulas(data_of(content, shown), (), name, new))
    return changed_content(content, pieces) if pieces else content


def _chains_following(snapshot: Snapshot, name: str, new: str) -> list[FileChange]:
    """The project file with a sheet's new name in every chain that it lies in; no change where it lies in none."""
    before = snapshot.contents.get(PROJECT_FILE)
    chains = None if before is None else data_of(before, PROJECT_FILE).get("chain")
    pieces = []
    for chain, stated in (chains if isinstance(chains, dict) else {}).items():
        sheets = stated.get("sheets") if isinstance(stated, dict) else None
        if isinstance(sheets, list) and name in sheets:
            renamed = [new if one == name else one for one in sheets]
            pieces.append(Put(("chain", chain, "sheets"), renamed))
    return [FileChange(PROJECT_FILE, before, changed_content(before, pieces))] if before is not None and pieces else []


def _formulas(data: Mapping[str, Any], path: KeyPath, name: str, new: str) -> Iterator[Piece]:
    for key, value in data.items():
        if isinstance(value, dict):
            yield from _formulas(value, (*path, key), name, new)
        elif key == "formula" and isinstance(value, str):
            text = formula.rename(value, name, new)
            if text != value:
                yield Put((*path, key), text)


def value_at(data: Any, path: KeyPath) -> Any:
    """What stands at a path in plain data; the number of an annotated value for the value itself; None for nothing."""
    for part in path:
        if isinstance(data, Mapping) and isinstance(part, str):
            data = data.get(part)
        elif isinstance(data, list) and isinstance(part, int) and 0 <= part < len(data):
            data = data[part]
        else:
            return None
    return data


__all__ = [
    "AddEntry",
    "ChangeSheet",
    "DeleteSheet",
    "DuplicateSheet",
    "FileChange",
    "KeyPath",
    "NewSheet",
    "Piece",
    "Put",
    "RefusedError",
    "RenameSheet",
    "Request",
    "SettleCollision",
    "TakeBack",
    "TakeOut",
    "TakeSide",
    "changed",
    "changed_content",
    "changes",
    "name_of",
    "title_of",
    "value_at",
]
