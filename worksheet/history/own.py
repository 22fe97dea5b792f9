"""Which files are the project's own, and their bytes: all that a revision may carry.

A revision is made of files in a folder that may have come from anywhere, so a file counts only where its name fits,
where it is an ordinary file, and where no symbolic link and no other repository lies between it and the project.
"""

from __future__ import annotations

import os
import re
import stat
from collections.abc import Iterator
from pathlib import Path

PARTS = ("biasbook.toml", "process", "sheets", "evidence")
"""What a project holds, at its top."""

EVIDENCE = "evidence"

LARGEST = 100_000_000
"""Largest file that a revision takes. [bytes]"""

_OWN = re.compile(r"biasbook\.toml|(?:process|sheets)/[^./][^/]*\.toml|evidence(?:/[^./][^/]*)+", re.DOTALL)


def is_own(path: str) -> bool:
    """Whether a path relative to the project is one of its own files: the three kinds of TOML files, and evidence.

    Hidden files are nobody's calculation: editors and file managers make them.
    """
    return _OWN.fullmatch(path) is not None


def own_files(folder: Path) -> tuple[str, ...]:
    """The project's own ordinary files as they stand, relative to the folder and sorted."""
    return tuple(sorted(path for path in _walk(folder) if is_own(path)))


def _walk(folder: Path) -> Iterator[str]:
    if (folder / PARTS[0]).is_file() and not (folder / PARTS[0]).is_symlink():
        yield PARTS[0]
    for part in PARTS[1:]:
        if (folder / part).is_symlink():
            continue
        for place, inner, names in os.walk(folder / part):
            if part != EVIDENCE:
                inner.clear()
            inner[:] = [name for name in inner if not os.path.lexists(Path(place, name, ".git"))]
            below = Path(place).relative_to(folder).as_posix()
            for name in names:
                try:
                    status = Path(place, name).lstat()
                except OSError:
                    continue
                if stat.S_ISREG(status.st_mode):
                    yield f"{below}/{name}"


def read_own(folder: Path, path: str) -> bytes | str:
    """The bytes of one of the project's own files, or why a revision cannot take it.

    Args:
        folder: The project.
        path: Relative to it.
    """
    place = folder
    for part in path.split("/")[:-1]:
        place = place / part
        if place.is_symlink():
            return "it lies behind a symbolic link"
        if os.path.lexists(place / ".git"):
            return "it lies in a repository of its own"
    try:
        descriptor = os.open(folder / path, os.O_RDONLY | os.O_NOFOLLOW | os.O_NONBLOCK | os.O_CLOEXEC)
    except OSError as error:
        if (folder / path).is_symlink():
            return "it is a symbolic link"
        return f"it cannot be read: {(error.strerror or str(error)).lower()}"
    with os.fdopen(descriptor, "rb") as file:
        if not stat.S_ISREG(os.fstat(descriptor).st_mode):
            return "it is no ordinary file"
        content = file.read(LARGEST + 1)
    return f"it is larger than {LARGEST // 1_000_000} MB" if len(content) > LARGEST else content
