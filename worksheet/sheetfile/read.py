"""Files in: a sheet, a process file or a project file read into plain data, or every problem it has at once.

Reading a file has three steps, each in a module of its own: bytes to text and TOML data (source), single values by the
kind of their key (values), and the tables of each file (sheets, targets, processes, projects). What a file may hold
stands in the model's key descriptions alone.
"""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path
from typing import TypeVar

from worksheet.model.problem import Problem
from worksheet.model.sheet import Process, ProjectFile, Sheet
from worksheet.sheetfile import processes, projects, sheets, source
from worksheet.sheetfile.names import label_problem, sheet_name_problem
from worksheet.sheetfile.reader import Reader, found
from worksheet.sheetfile.source import Source

SCHEMA = 1
"""The version of the file format that this program reads and writes."""

_File = TypeVar("_File")


def read_sheet(path: Path, *, shown: str) -> tuple[Sheet | None, list[Problem]]:
    """Read sheets/NAME.toml.

    Args:
        path: The file; its stem is the sheet's name.
        shown: What messages call it.

    Returns: the sheet and no problem, or None and every problem.
    """
    return _read(path, shown, lambda content: parse_sheet(content, path.stem, shown))


def read_process(path: Path, *, shown: str) -> tuple[Process | None, list[Problem]]:
    """Read process/NAME.toml; as read_sheet."""
    return _read(path, shown, lambda content: parse_process(content, path.stem, shown))


def read_project(path: Path, *, shown: str) -> tuple[ProjectFile | None, list[Problem]]:
    """Read biasbook.toml; as read_sheet."""
    return _read(path, shown, lambda content: parse_project(content, shown))


def parse_sheet(content: bytes | str, name: str, shown: str) -> tuple[Sheet | None, list[Problem]]:
    """Read the content of a sheet, of a file or of a revision.

    Args:
        content: UTF-8 bytes, or text.
        name: The sheet's name.
        shown: What messages call it.

    Returns: the sheet and no problem, or None and every problem.
    """
    wrong = sheet_name_problem(name)
    named = [Problem(shown, None, "", wrong)] if wrong else []
    sheet, problems = _parse(content, shown, lambda reader, data: sheets.build(reader, data, name))
    return (None if named else sheet), named + problems


def parse_process(content: bytes | str, name: str, shown: str) -> tuple[Process | None, list[Problem]]:
    """Read the content of a process file; as parse_sheet."""
    wrong = label_problem(name)
    named = [Problem(shown, None, "", f"Found the file name {found(name)}: {wrong}.")] if wrong else []
    process, problems = _parse(content, shown, lambda reader, data: processes.build(reader, data, name))
    return (None if named else process), named + problems


def parse_project(content: bytes | str, shown: str) -> tuple[ProjectFile | None, list[Problem]]:
    """Read the content of a project file; as parse_sheet."""
    return _parse(content, shown, projects.build)


def _read(
    path: Path, shown: str, parse: Callable[[bytes], tuple[_File | None, list[Problem]]]
) -> tuple[_File | None, list[Problem]]:
    content = source.load(path, shown)
    return (None, [content]) if isinstance(content, Problem) else parse(content)


def _parse(
    content: bytes | str, shown: str, build: Callable[[Reader, Source], _File | None]
) -> tuple[_File | None, list[Problem]]:
    text = source.decode(content, shown) if isinstance(content, bytes) else content
    if isinstance(text, Problem):
        return None, [text]
    document = source.parse(text, shown)
    if not isinstance(document, Source):
        return None, document
    reader = Reader(shown, document.places)
    schema = document.data.get("schema")
    if isinstance(schema, int) and not isinstance(schema, bool) and schema > SCHEMA:
        reader.refuse("schema", schema, f"{SCHEMA}: the file was written for a newer version of this program")
        return None, reader.result()
    result = build(reader, document)
    problems = reader.result()
    return (None if problems else result), problems
