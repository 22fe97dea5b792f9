"""Changes put on the disk: file by file, each whole or not at all, and those before one that fails put back."""

from __future__ import annotations

import stat
from collections.abc import Sequence
from pathlib import Path

from worksheet.model.problem import Problem
from worksheet.session.edits import FileChange


class Writer:
    """Writes to one project; files that it takes away and brings back keep their permissions."""

    def __init__(self, root: Path) -> None:
        """Take the project's folder."""
        self._root = root
        self._modes: dict[str, int] = {}

    def write(self, made: Sequence[FileChange]) -> tuple[Problem, ...]:
        """Write files in their order; where one cannot be written, nothing is changed and it is said why.

        Raises: ChangedOnDiskError, nothing being changed, where a file is not what the change starts from.
        """
        from worksheet.sheetfile.write import ChangedOnDiskError

        done: list[FileChange] = []
        for change in made:
            try:
                self._put(change)
            except ValueError as error:
                stuck = self._put_back(done)
                if isinstance(error, ChangedOnDiskError) and not stuck:
                    raise
                return (Problem(change.file, None, "", str(error)), *stuck)
            done.append(change)
        return ()

    def _put_back(self, done: Sequence[FileChange]) -> tuple[Problem, ...]:
        stuck = []
        for change in reversed(done):
            try:
                self._put(FileChange(change.file, change.after, change.before))
            except ValueError as error:
                message = f"It was changed already and could not be put back: {error}"
                stuck.append(Problem(change.file, None, "", message))
        return tuple(stuck)

    def _put(self, change: FileChange) -> None:
        from worksheet.sheetfile import write

        path = self._root / change.file
        if change.after is None:
            self._remember(change.file)
            write.remove(path, read=change.before or b"", root=self._root)
        elif change.before is None:
            if change.like:
                self._remember(change.like)
            mode = self._modes.get(change.like or change.file)
            write.create(path, change.after.decode("utf-8"), root=self._root, mode=mode)
        else:
            write.save(path, read=change.before, new=change.after.decode("utf-8"), root=self._root)

    def _remember(self, file: str) -> None:
        try:
            self._modes[file] = stat.S_IMODE((self._root / file).stat().st_mode)
        except OSError:
            self._modes.pop(file, None)
