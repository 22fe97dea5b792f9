"""The user's document edited in place: one statement at a time, and no byte beside it.

An edit is a value; `apply` gives the new text. Where a statement exists, that statement alone goes through tomlkit,
which keeps its spacing, quotes and comment; the rest of the document is never taken apart, so nothing in it can be
lost. New statements are lines put in after the last one of their table. Before a text is handed out it is read again
with tomllib and compared, types included, with the data that the edits should give; where the two differ it is refused.
"""

from __future__ import annotations

import re
import struct
import tomllib
from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from typing import Any

from tomlkit.exceptions import TOMLKitError

from worksheet.model.keys import ANNOTATIONS
from worksheet.model.text import clean
from worksheet.sheetfile.document import Document, KeyPath, WriteRefusedError
from worksheet.sheetfile.locate import NestedTooDeeplyError, dotted
from worksheet.sheetfile.render import Stated, plain
from worksheet.sheetfile.source import BYTE_ORDER_MARK

Values = Mapping[str, Any]
"""What a new table holds."""

_VALUE, _FORMULA = "value", "formula"
_EITHER = {_VALUE: _FORMULA, _FORMULA: _VALUE}
_NOTES = {key.name for key in ANNOTATIONS.keys} - {_VALUE, _FORMULA}


@dataclass(frozen=True, slots=True)
class SetValue:
    """State a value, new or in place of another.

    A number set on a value with annotations leaves these as they are; a note (source, low, trust, ...) set on a bare
    value makes it a table; a formula takes the place of a value and the other way round. A table that does not exist is
    made; a mapping is written as an inline table and must be new.
    """

    path: KeyPath
    value: Stated


@dataclass(frozen=True, slots=True)
class RemoveKey:
    """Take out a key with the comment on its line, a table, or an entry of an array of tables."""

    path: KeyPath


@dataclass(frozen=True, slots=True)
class AddEntry:
    """One more [[array]] table after the others."""

    array: str
    values: Values


@dataclass(frozen=True, slots=True)
class AddTable:
    """A new [table]; a path of several parts makes [device.nfet]."""

    path: tuple[str, ...]
    values: Values


Edit = SetValue | RemoveKey | AddEntry | AddTable


def apply(text: str, edits: Iterable[Edit]) -> str:
    """The text after some edits, in their order.

    Args:
        text: A TOML document as it was read, with its byte-order mark and line ends.
        edits: What to change.

    Raises: WriteRefusedError, where an edit names something that does not exist, or the result would not say exactly
        what was asked for.
    """
    mark = BYTE_ORDER_MARK if text.startswith(BYTE_ORDER_MARK) else ""
    body = text.removeprefix(BYTE_ORDER_MARK)
    carriage = "\r\n" in body and not re.search(r"(?<!\r)\n", body)
    data = _read(body)
    for edit in edits:
        where = clean(dotted(edit.path if not isinstance(edit, AddEntry) else (edit.array,)))
        try:
            body = _make(Document(body), data, edit)
        except WriteRefusedError as error:
            raise WriteRefusedError(f"The change at {where} cannot be made: {error}.") from None
        except (TOMLKitError, LookupError, TypeError, ValueError) as error:
            raise WriteRefusedError(f"The change at {where} cannot be made: {clean(str(error))}.") from error
        if carriage:
            body = re.sub(r"(?<!\r)\n", "\r\n", body)
        if not _same(_read(body), data):
            raise WriteRefusedError(f"The change at {where} cannot be made in this layout; edit the file by hand.")
    return mark + body


def _make(document: Document, data: dict[str, Any], edit: Edit) -> str:
    """Make one edit: in the text, which is returned, and in the data, which is changed."""
    match edit:
        case SetValue(path, value):
            return _set(document, data, path, value)
        case RemoveKey(path):
            return _remove(document, data, path)
        case AddEntry(array, values):
            entries = data.setdefault(array, [])
            if not isinstance(entries, list):
                raise WriteRefusedError(f"{array} is no list of tables")
            entries.append(plain(values))
            return document.add_table((array,), values, array=True)
        case AddTable(path, values):
            return _add_table(document, data, path, values)


def _set(document: Document, data: dict[str, Any], path: KeyPath, value: Stated) -> str:
    """State a value, by what stands there and above it."""
    if not path:
        raise WriteRefusedError("a value needs a key")
    present, holder, above, key = find(data, path), find(data, path[:-1]), path[:-1], path[-1]
    single = not isinstance(value, Mapping)
    if single and present is not None and _same(present, plain(value)):
        return "".join(document.lines)  # in whatever writing it stands
    if isinstance(present, dict):
        if single and (_VALUE in present or _FORMULA in present):
            return _set(document, data, (*path, _VALUE), value)
        raise WriteRefusedError("it is a table, whose keys are set one by one")
    if holder is None and above:
        inner = {str(key): value}
        return _set(document, data, above, inner) if len(above) > 1 else _add_table(document, data, above, inner)
    if isinstance(holder, dict) and isinstance(key, str):
        other = _EITHER.get(key, key)
        new = plain(value)
        if present is None and other in holder and single:
            holder[key] = new
            del holder[other]
            return document.swap((*above, other), key, value)
        holder[key] = new
        return document.replace(path, value) if present is not None else document.add(path, value)
    if isinstance(holder, list) and isinstance(key, int):
        if key >= len(holder):
            raise WriteRefusedError(f"there is no entry {key}")
        holder[key] = plain(value)
        return document.replace(path, value)
    outer = find(data, above[:-1])
    if single and isinstance(outer, dict) and isinstance(key, str) and not isinstance(holder, list):
        return _annotate(document, outer, above, key, value)
    raise WriteRefusedError(f"there is no place for {key}")


def _annotate(document: Document, outer: Any, path: KeyPath, key: str, value: Stated) -> str:
    """Set a key of a value that is bare so far."""
    bare = outer[path[-1]]
    if key == _VALUE:
        outer[path[-1]] = plain(value)
        return document.replace(path, value)
    if key == _FORMULA:
        outer[path[-1]] = {key: plain(value)}
        return document.replace(path, {key: value})
    if key not in _NOTES:
        raise WriteRefusedError(f"a value takes no {key}")
    outer[path[-1]] = {_VALUE: bare, key: plain(value)}
    return document.wrap(path, _VALUE, {key: value})


def _add_table(document: Document, data: dict[str, Any], path: KeyPath, values: Values) -> str:
    """A new table."""
    names = tuple(map(str, path))
    holder: Any = data
    for part in names[:-1]:
        holder = holder.setdefault(part, {}) if isinstance(holder, dict) else None
    if not isinstance(holder, dict):
        raise WriteRefusedError("what stands above it is no table")
    if names[-1] in holder:
        raise WriteRefusedError("the table exists already")
    holder[names[-1]] = plain(values)
    return document.add_table(names, values)


def _remove(document: Document, data: dict[str, Any], path: KeyPath) -> str:
    """Take something out; tables that only it implied go with it."""
    if not path or find(data, path) is None:
        raise WriteRefusedError("it does not exist")
    text = document.remove(path)
    del find(data, path[:-1])[path[-1]]
    for end in range(len(path) - 1, 0, -1):
        if find(data, path[:end]) or document.stands(path[:end]):
            break
        del find(data, path[: end - 1])[path[end - 1]]
    return text


def find(data: Any, path: KeyPath) -> Any:
    """What stands at a path in plain data, None where nothing does."""
    for part in path:
        if isinstance(data, dict):
            data = data.get(str(part)) if isinstance(part, str) else None
        elif isinstance(data, list) and isinstance(part, int) and 0 <= part < len(data):
            data = data[part]
        else:
            return None
    return data


def _read(text: str) -> dict[str, Any]:
    """The data of a text."""
    try:
        Document(text)
        return tomllib.loads(text)
    except (NestedTooDeeplyError, RecursionError, ValueError) as error:
        raise WriteRefusedError(f"The text is not valid TOML: {clean(str(error))}.") from error


def _same(one: Any, other: Any) -> bool:
    """Whether two pieces of data are equal, types and signs of zero included; the order of keys does not count."""
    if type(one) is not type(other):
        return False
    if isinstance(one, dict):
        return one.keys() == other.keys() and all(_same(value, other[key]) for key, value in one.items())
    if isinstance(one, list):
        return len(one) == len(other) and all(map(_same, one, other))
    if isinstance(one, float):
        return struct.pack("d", one) == struct.pack("d", other)
    return bool(one == other)
