"""Merging by value, as git calls for it, and its installation in a clone."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path

from worksheet.compare.merge import merge_bytes
from worksheet.history import driver
from worksheet.history.outcome import RefusedError
from worksheet.model.problem import Problem
from worksheet.session.revisions import refusal, repository_of

_LARGEST = 100_000_000


@dataclass(frozen=True, slots=True)
class Merged:
    """What a merge came to: whether nothing is left to settle, and the keys or places that are."""

    clean: bool
    left: tuple[str, ...]


def merge(base: Path, ours: Path, theirs: Path, name: str) -> Merged | Problem:
    """Merge three versions of one file by value, into the second.

    Args:
        base, ours, theirs: Files with the three versions; the result is written over `ours`.
        name: The path of the file in its repository, for messages.
    """
    versions = []
    for path in (base, ours, theirs):
        try:
            with path.open("rb") as file:
                versions.append(file.read(_LARGEST + 1))
        except (OSError, ValueError) as error:
            return Problem(str(path), None, "", f"cannot be read: {getattr(error, 'strerror', None) or error}")
    if any(len(version) > _LARGEST for version in versions):
        return Problem(name, None, "", f"has more than {_LARGEST // 1_000_000} MB and is left as it is")
    done = merge_bytes(versions[0], versions[1], versions[2], name)
    try:
        ours.write_bytes(done.content)
    except OSError as error:
        return Problem(str(ours), None, "", f"cannot be written: {error.strerror}")
    return Merged(done.clean, tuple(one.key for one in done.collisions))


def install(root: Path, command: str) -> bool | Problem:
    """Have git merge this project's files by value, in this clone.

    Args:
        root: The project folder.
        command: The shell command that git runs.
    Returns: whether anything had to be written
    """
    found = repository_of(root)
    if isinstance(found, Problem):
        return found
    try:
        return driver.install(found, command)
    except RefusedError as error:
        return refusal(error.refused, root)
    except OSError as error:
        return Problem(str(root), None, "", f"git's folder cannot be written: {error.strerror}")
