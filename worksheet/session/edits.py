"""What a user can ask to have changed, as frozen values, and what each request makes of the files.

A request becomes contents of files, before and after, so every change has its inverse: the way back returns every byte.
Nothing is written here.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass, field
from typing import Any

from worksheet.model import formula
from worksheet.model.sheet import Sheet
from worksheet.project import links
from worksheet.session.snapshot import Snapshot, file_of

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


Request = ChangeSheet | NewSheet | DuplicateSheet | RenameSheet | DeleteSheet


@dataclass(frozen=True, slots=True)
class FileChange:
    """A file before and after; None where it does not exist."""

    file: str
    before: bytes | None
    after: bytes | None


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
            return (FileChange(_free(snapshot, copy), None, _content(snapshot, name)),)
        case RenameSheet(name, new):
            return _renamed(snapshot, name, new)
        case DeleteSheet(name):
            return (FileChange(file_of(name), _content(snapshot, name), None),)


def changed(snapshot: Snapshot, sheet: str, pieces: tuple[Piece, ...]) -> bytes:
    """A sheet's content after some pieces. WriteRefusedError where one cannot be made."""
    from worksheet.sheetfile import edit

    made: list[edit.Edit] = []
    for piece in pieces:
        match piece:
            case Put(path, value):
                made.append(edit.SetValue(path, value))
            case TakeOut(path):
                made.append(edit.RemoveKey(path))
            case AddEntry(array, values):
                made.append(edit.AddEntry(array, values))
    return edit.apply(_content(snapshot, sheet).decode("utf-8"), made).encode("utf-8")


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
    content = _content(snapshot, name)
    target = _free(snapshot, new)
    others = []
    for other in snapshot.project.sheets.values():
        pieces = tuple(_following(other, name, new))
        if pieces and other.name != name:
            before = _content(snapshot, other.name)
            others.append(FileChange(file_of(other.name), before, changed(snapshot, other.name, pieces)))
    return (FileChange(target, None, content), *others, FileChange(file_of(name), content, None))


def _following(sheet: Sheet, name: str, new: str) -> Iterator[Piece]:
    """Formulas that name a sheet, with its new name."""
    for key, found, _ in links.formulas_of(sheet):
        text = formula.rename(found.text, name, new)
        if text != found.text:
            yield Put((*key.split("."), "formula"), text)


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
    "NewSheet",
    "Piece",
    "Put",
    "RefusedError",
    "RenameSheet",
    "Request",
    "TakeOut",
    "changes",
    "title_of",
    "value_at",
]
