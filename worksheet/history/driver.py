"""The merge driver's place in a clone: a line of git's configuration and a line of its attributes, both local to it.

Nothing of the user's files is touched, and nothing travels: whoever clones the project installs it once.
"""

from __future__ import annotations

import os
import re
import tempfile
from pathlib import Path

from worksheet.history.own import PARTS
from worksheet.history.repository import Repository

NAME = "biasbook"
_SPECIAL = re.compile(r'([\\*?\[\]"!#])')
_PATTERNS = (PARTS[0], *(f"{part}/*.toml" for part in PARTS[1:3]))


def install(repository: Repository, command: str) -> bool:
    """Have git merge the project's files by value.

    Args:
        repository: That encloses the project.
        command: A shell command; git puts base, ours, theirs and the name after it.
    Returns: whether anything had to be written
    Raises: RefusedError where git refuses; OSError where its folder cannot be written.
    """
    wanted = {
        f"merge.{NAME}.name": "calculation sheets by value",
        f"merge.{NAME}.driver": f"{command} %O %A %B %P",
    }
    changed = False
    for key, value in wanted.items():
        if repository.settings.get(key) != value:
            repository.run("config", "--local", "--replace-all", key, value)
            changed = True
    place = repository.top / os.fsdecode(repository.run("rev-parse", "--git-path", "info/attributes").rstrip(b"\n"))
    present = place.read_text("utf-8", "surrogateescape") if place.exists() else ""
    wanted_lines = [_line(repository.prefix, pattern) for pattern in _PATTERNS]
    lines = [line for line in wanted_lines if line not in present.splitlines()]
    if lines:
        _write(place, present, lines)
    return changed or bool(lines)


def _line(prefix: str, pattern: str) -> str:
    """One line of attributes; a name is quoted as in C where it holds what a pattern would read as more than itself."""
    escaped = _SPECIAL.sub(r"\\\1", prefix)
    path = f"/{escaped}{pattern}"
    if any(character.isspace() or character in '"\\' for character in path):
        path = '"' + path.replace("\\", "\\\\").replace('"', '\\"').replace("\t", "\\t") + '"'
    return f"{path} merge={NAME}"


def _write(place: Path, present: str, lines: list[str]) -> None:
    text = present + ("" if not present or present.endswith("\n") else "\n") + "".join(f"{line}\n" for line in lines)
    place.parent.mkdir(parents=True, exist_ok=True)
    descriptor, beside = tempfile.mkstemp(dir=place.parent, prefix="attributes.")
    try:
        with os.fdopen(descriptor, "w", encoding="utf-8", errors="surrogateescape") as file:
            file.write(text)
            file.flush()
            os.fsync(file.fileno())
        Path(beside).chmod(0o644)
        Path(beside).replace(place)
    finally:
        Path(beside).unlink(missing_ok=True)
