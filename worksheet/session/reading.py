"""Files of a project as a session reads them: each parsed once for its content, and read as if some were different.

What a session is about to write is held against the whole project before a byte of it is on the disk: `instead` gives
the content that some files would have.
"""

from __future__ import annotations

import contextlib
from collections.abc import Callable, Mapping
from functools import lru_cache
from pathlib import Path
from typing import Any, TypeVar

from worksheet.model.problem import Problem
from worksheet.model.sheet import Process, ProjectFile, Sheet
from worksheet.project.discover import PROCESSES, PROJECT_FILE, SHEETS, Reading
from worksheet.sheetfile import source
from worksheet.sheetfile.read import parse_process, parse_project, parse_sheet

_Parsed = TypeVar("_Parsed")


class Shelf:
    """Parsed files by their content, for the life of a session."""

    def __init__(self) -> None:
        self._known: dict[str, tuple[bytes, Any]] = {}

    def parsed(self, shown: str, content: bytes, parse: Callable[[bytes], _Parsed]) -> _Parsed:
        """What a content says, parsed once."""
        known = self._known.get(shown)
        if known is None or known[0] != content:
            known = (content, parse(content))
            self._known[shown] = known
        found: _Parsed = known[1]
        return found


class FileReading(Reading):
    """One reading of all files.

    Attributes:
        contents: What was read, by path within the project.
    """

    def __init__(self, shelf: Shelf, instead: Mapping[str, bytes | None] | None = None) -> None:
        """Take what is parsed already, and contents that some files would have; None for one that is not there."""
        self._shelf = shelf
        self._instead = instead or {}
        self.contents: dict[str, bytes] = {}

    def sheets(self, root: Path) -> list[Path]:
        """Files of the sheets, with those that are to come and without those that are to go."""
        inside = {shown: content for shown, content in self._instead.items() if shown.startswith(f"{SHEETS}/")}
        coming = {root / shown for shown, content in inside.items() if content is not None}
        going = {root / shown for shown, content in inside.items() if content is None}
        return sorted((coming | set(super().sheets(root))) - going)

    def project(self, path: Path, shown: str) -> tuple[ProjectFile | None, list[Problem]]:
        """biasbook.toml."""
        return self._read(path, shown, lambda content: parse_project(content, shown))

    def process(self, path: Path, shown: str) -> tuple[Process | None, list[Problem]]:
        """A process file."""
        return self._read(path, shown, lambda content: parse_process(content, path.stem, shown))

    def sheet(self, path: Path, shown: str) -> tuple[Sheet | None, list[Problem]]:
        """A sheet."""
        return self._read(path, shown, lambda content: parse_sheet(content, path.stem, shown))

    def _read(
        self, path: Path, shown: str, parse: Callable[[bytes], tuple[_Parsed | None, list[Problem]]]
    ) -> tuple[_Parsed | None, list[Problem]]:
        stated = self._instead.get(shown)
        content = source.load(path, shown) if stated is None else stated
        if isinstance(content, Problem):
            return None, [content]
        self.contents[shown] = content
        return self._shelf.parsed(shown, content, parse)


@lru_cache(maxsize=8)
def data_of(content: bytes, shown: str) -> dict[str, Any]:
    """The plain TOML data of a file, values as typed; empty where it is no TOML. To be read, not to be changed."""
    text = source.decode(content, shown)
    if isinstance(text, Problem):
        return {}
    parsed = source.parse(text, shown)
    return parsed.data if isinstance(parsed, source.Source) else {}


Signature = Mapping[str, tuple[int, int, int]]
"""What tells quickly whether a file may have changed: its size, time and number, by its path within the project."""


def signature(root: Path) -> Signature:
    """The signature of every file of a project."""
    found = {}
    for path in [root / PROJECT_FILE, *_listed(root / PROCESSES), *_listed(root / SHEETS)]:
        with contextlib.suppress(OSError):
            status = path.stat()
            shown = path.name if path.parent == root else f"{path.parent.name}/{path.name}"
            found[shown] = (status.st_size, status.st_mtime_ns, status.st_ino)
    return found


def _listed(folder: Path) -> list[Path]:
    try:
        return sorted(path for path in folder.iterdir() if path.suffix == ".toml")
    except OSError:
        return []
