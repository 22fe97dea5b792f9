"""The folder of hand-offs: files put in place whole, and a record of what they are.

The record tells which files in the folder are ours and untouched, so that nothing of anybody else's is overwritten,
and what the last hand-off was made from, so that the next one can say what moved.
"""

from __future__ import annotations

import datetime
import json
from collections.abc import Mapping
from dataclasses import dataclass
from hashlib import sha256
from pathlib import Path
from typing import Any

from worksheet.model.problem import Problem
from worksheet.model.text import clean
from worksheet.report.handoff.material import Origin

RECORD = "handoff-record.json"
"""What the folder keeps about its hand-offs."""

_SCHEMA = 1


@dataclass(frozen=True, slots=True)
class Written:
    """What was written: the files' names, and what is wrong with the project, which the pages say too."""

    files: tuple[str, ...]
    problems: tuple[Problem, ...] = ()


class Record:
    """What a folder of hand-offs keeps: of every page what it was made from, and of every file its digest."""

    def __init__(self, folder: Path, pages: dict[str, Any], files: dict[str, str]) -> None:
        self._folder, self._pages, self._files = folder, pages, files
        self._before = dict(pages)

    @classmethod
    def read(cls, folder: Path) -> Record | Problem:
        """The record of a folder, an empty one where there is none, or why the folder cannot be used."""
        shown = clean(str(folder))
        path = folder / RECORD
        try:
            if folder.exists() and not folder.is_dir():
                return Problem(shown, None, "-o", "found a file, expected a folder or a name that is free")
            if path.is_symlink():
                return Problem(shown, None, RECORD, "found a link, expected the record of a hand-off")
            content = path.read_bytes() if path.exists() else None
        except (OSError, ValueError) as error:
            return Problem(shown, None, "-o", f"found a folder that cannot be used: {clean(str(error))}")
        if content is None:
            return cls(folder, {}, {})
        try:
            data = json.loads(content)
            pages, files = dict(data["pages"]), {str(k): str(v) for k, v in dict(data["files"]).items()}
            known = data["schema"] == _SCHEMA
        except (ValueError, KeyError, TypeError, RecursionError):
            message = "found something else than the record of a hand-off; choose another folder"
            return Problem(shown, None, RECORD, message)
        if not known:
            return Problem(shown, None, RECORD, "found a record of another version; choose another folder")
        return cls(folder, pages, files)

    def since(self, stem: str) -> tuple[Origin, str] | None:
        """What the last hand-off of a page was made from, and its day; None where there was none."""
        page = self._pages.get(stem)
        if not isinstance(page, Mapping):
            return None
        return Origin(str(page.get("revision", "")), bool(page.get("changed", False))), str(page.get("dated", ""))

    def note(self, stem: str, origin: Origin, today: datetime.date) -> None:
        """Keep what a page is made from."""
        self._pages[stem] = {"revision": origin.revision, "changed": origin.changed, "dated": today.isoformat()}

    def put(self, pages: Mapping[str, bytes]) -> Written | list[Problem]:
        """Write files, each whole or not at all; none where something foreign is in the way of one."""
        from worksheet.sheetfile.write import put

        problems = [problem for name in pages if (problem := self._foreign(name)) is not None]
        if problems:
            return problems
        made = {name: sha256(content).hexdigest() for name, content in pages.items()}
        either = {name: f"{self._files.get(name, '')} {digest}".strip() for name, digest in made.items()}
        try:
            self._folder.mkdir(parents=True, exist_ok=True)
            # while files are being written both contents are ours, should this run be cut off
            self._keep(self._before, {**self._files, **either})
            for name, content in pages.items():
                put(self._folder / name, content, root=self._folder)
            self._keep(self._pages, {**self._files, **made})
        except (OSError, ValueError) as error:
            return [Problem(clean(str(self._folder)), None, "-o", f"could not be written: {clean(str(error))}")]
        return Written(tuple(pages))

    def _keep(self, pages: Mapping[str, Any], files: Mapping[str, str]) -> None:
        """Write the record."""
        from worksheet.sheetfile.write import put

        data = {"schema": _SCHEMA, "pages": pages, "files": files}
        put(self._folder / RECORD, (json.dumps(data, indent=1, sort_keys=True) + "\n").encode(), root=self._folder)

    def _foreign(self, name: str) -> Problem | None:
        """Why a file may not be written: something stands there that is not what we wrote."""
        path = self._folder / name
        shown = clean(str(path))
        try:
            if not path.exists() and not path.is_symlink():
                return None
            ours = path.is_file() and not path.is_symlink()
            if ours and sha256(path.read_bytes()).hexdigest() in self._files.get(name, "").split():
                return None
        except OSError as error:
            return Problem(shown, None, "-o", f"found a file that cannot be read: {clean(str(error))}")
        what = "that was changed since it was written" if name in self._files else "that no hand-off wrote"
        return Problem(shown, None, "-o", f"found a file {what}; move it away, or choose another folder")
