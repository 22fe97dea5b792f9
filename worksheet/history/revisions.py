"""Revisions read: which there are, what a name stands for, and the files of one or of many.

The list of revisions takes one call of git, the files of a revision two, however many there are of either. What comes
out of a repository is foreign text and foreign bytes: text is made harmless here, and a file that is too large, or is
none, is named and not read.
"""

from __future__ import annotations

import datetime
import os
import re
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from types import MappingProxyType

from worksheet.history.outcome import Entry, LeftOut, Refused, RefusedError, Why
from worksheet.history.own import EVIDENCE, LARGEST, PARTS, is_own
from worksheet.history.repository import Repository
from worksheet.model.text import clean

LARGEST_TEXT = 2_000_000
"""Largest TOML file that is read from a revision. [bytes]"""

LARGEST_WHOLE = 500_000_000
"""Most that is read from one revision. [bytes]"""

_LAYOUT = "%x00%H%x00%aI%x00%cI%x00%an%x00%B"
_FIELDS = 5
_ID = re.compile(rb"[0-9a-f]{40}(?:[0-9a-f]{24})?")
_BATCH = 100  # revisions whose files are read at once


@dataclass(frozen=True, slots=True)
class Revision:
    """One revision that touched the project.

    Attributes:
        revision: Full id.
        dated: When it was made: ISO 8601 with the offset from universal time, "" where the revision does not say.
        by: Who made it.
        note: The first line of its message.
        body: The rest of the message.
        paths: The project's own files that it changed, sorted; of a merge, those that differ from every parent.
    """

    revision: str
    dated: str
    by: str
    note: str
    body: str
    paths: tuple[str, ...]


@dataclass(frozen=True, slots=True)
class Files:
    """The project's own files in one revision.

    Attributes:
        files: Bytes by path relative to the project.
        left_out: What was not read, and why.
    """

    files: Mapping[str, bytes]
    left_out: tuple[LeftOut, ...] = ()


def history(
    repository: Repository, path: str | None = None, *, revision: str = "HEAD", limit: int | None = None
) -> tuple[Revision, ...] | Refused:
    """The revisions that touched the project, newest first.

    Args:
        repository: From find or create.
        path: One of the project's own files; only revisions that touched it.
        revision: Where to begin.
        limit: At most so many.

    Returns: empty before the first revision.
    """
    try:
        start = repository.resolve(revision)
        if start is None:
            return () if revision == "HEAD" else _unknown(revision)
        parts = _asked(repository, start, path, limit)
        output = repository.log(start, parts, _LAYOUT, limit)
    except RefusedError as error:
        return error.refused
    found = (_revision(repository, fields, names) for fields, names in _commits(output) if names or parts)
    return tuple(one for one, foreign in found if not foreign)


def _asked(repository: Repository, start: str, path: str | None, limit: int | None) -> tuple[str, ...]:
    """The parts that the log is asked for; none where all can be had and sorted out here.

    Asked for parts, git compares every commit with its parent twice: to tell whether it belongs to their history, and
    to name the files. Where nothing was ever merged the second comparison tells the first, in two thirds of the time.
    """
    if path is not None:
        return (path,)
    alone = not repository.prefix and limit is None and repository.is_linear(start)
    return () if alone else PARTS


def resolve(repository: Repository, name: str) -> str | Refused:
    """The full id that a name stands for.

    Args:
        repository: From find or create.
        name: A hash or a prefix of one, a branch, a tag, HEAD~1.
    """
    try:
        return repository.resolve(name) or _unknown(name)
    except RefusedError as error:
        return error.refused


def read_files(repository: Repository, revision: str, *, evidence: bool = False) -> Files | Refused:
    """The project's own files in a revision.

    Args:
        repository: From find or create.
        revision: Full id, from resolve or history.
        evidence: Whether to read the files below evidence/ too.
    """
    return next(read_revisions(repository, (revision,), evidence=evidence))


def read_revisions(
    repository: Repository, revisions: Sequence[str], *, evidence: bool = False
) -> Iterator[Files | Refused]:
    """The project's own files in each of many revisions; a content that they share is read once and shared.

    Args:
        repository: From find or create.
        revisions: Full ids.
        evidence: Whether to read the files below evidence/ too.

    Yields: one result for each revision, in order.
    """
    known: dict[str, bytes] = {}
    for start in range(0, len(revisions), _BATCH):
        batch = revisions[start : start + _BATCH]
        trees = [_listed(repository, revision, evidence=evidence) for revision in batch]
        wanted = {
            entry.id for tree in trees if not isinstance(tree, Refused) for entry in tree[0].values()
        } - known.keys()
        refused = _fill(repository, sorted(wanted), known)
        for tree in trees:
            yield tree if isinstance(tree, Refused) else refused or _files(tree, known)


def read_versions(repository: Repository, path: str, revisions: Sequence[str]) -> tuple[bytes | None, ...] | Refused:
    """The bytes of one file in each of many revisions, through one call; None where it has none or is too large.

    Args:
        repository: From find or create.
        path: One of the project's own files.
        revisions: Full ids.
    """
    place = repository.prefix + path
    if "\n" in place:
        return Refused(Why.FAILED, f"The path {clean(place)} holds a line break; git cannot be asked about it.")
    try:
        found = repository.objects(f"{revision}:{place}" for revision in revisions)
    except RefusedError as error:
        return error.refused
    return tuple(one[1] if one and one[0] == "blob" and len(one[1]) <= LARGEST_TEXT else None for one in found)


def _unknown(name: str) -> Refused:
    message = (
        f"There is no revision {clean(name)[:80]} in this repository; expected a hash or the first digits of one,"
        " a branch, a tag, or HEAD~1."
    )
    return Refused(Why.UNKNOWN, message)


def _commits(output: bytes) -> Iterator[tuple[list[str], list[str]]]:
    """Take the output of the log apart: the fields and the changed paths of each commit.

    Every commit begins with an empty part and its id, and its fields have a fixed number. The first path follows a line
    break. A path is never empty, and what else separates the paths of a merge holds no id; so whatever a message or
    the name of a file holds, nothing is mistaken.
    """
    parts = output.split(b"\0")
    fields: list[str] = []
    names: list[str] = []
    place, end = 0, len(parts)
    while place < end:
        if not parts[place - 1] and _ID.fullmatch(parts[place]):
            if fields:
                yield fields, names
            fields = [part.decode("utf-8", "replace") for part in parts[place : place + _FIELDS]]
            names = []
            place += _FIELDS
            if place < end and parts[place].startswith(b"\n"):
                names.append(os.fsdecode(parts[place][1:]))
                place += 1
            continue
        if parts[place]:
            names.append(os.fsdecode(parts[place]))
        place += 1
    if fields:
        yield fields, names


def _revision(repository: Repository, fields: Sequence[str], names: Sequence[str]) -> tuple[Revision, bool]:
    """One revision, and whether it touched nothing of the project but files that are none of its own."""
    revision, authored, committed, by, message = fields
    first, _, rest = clean(message, lines=True).strip("\n").partition("\n")
    paths = sorted(path for name in names if is_own(path := name.removeprefix(repository.prefix)))
    dated = _dated(authored) or _dated(committed)
    return Revision(revision, dated, clean(by), first, rest.strip("\n"), tuple(paths)), bool(names) and not paths


def _dated(text: str) -> str:
    """A time with its offset as digits, "" for what is none."""
    try:
        return datetime.datetime.fromisoformat(text).isoformat()
    except ValueError:
        return ""


def _listed(
    repository: Repository, revision: str, *, evidence: bool
) -> tuple[dict[str, Entry], tuple[LeftOut, ...]] | Refused:
    """The entries of a revision that can be read, and what cannot."""
    try:
        tree = repository.tree(revision, PARTS if evidence else [part for part in PARTS if part != EVIDENCE])
    except RefusedError as error:
        return error.refused
    left_out, entries, whole = [], {}, 0
    for path, entry in tree.items():
        if not is_own(path):
            continue
        most = LARGEST if path.startswith(EVIDENCE) else LARGEST_TEXT
        if entry.kind != "blob":
            left_out.append(LeftOut(path, "it is a repository of its own"))
        elif entry.mode == "120000":
            left_out.append(LeftOut(path, "it is a symbolic link"))
        elif entry.size > most:
            left_out.append(LeftOut(path, f"it has {entry.size} bytes; at most {most} are read"))
        elif whole + entry.size > LARGEST_WHOLE:
            left_out.append(LeftOut(path, f"the files of the revision are larger than {LARGEST_WHOLE} bytes together"))
        else:
            whole += entry.size
            entries[path] = entry
    return entries, tuple(left_out)


def _fill(repository: Repository, ids: Sequence[str], known: dict[str, bytes]) -> Refused | None:
    """Read contents that are not known yet."""
    if not ids:
        return None
    try:
        found = repository.objects(ids)
    except RefusedError as error:
        return error.refused
    known.update((name, one[1]) for name, one in zip(ids, found, strict=True) if one is not None)
    return None


def _files(tree: tuple[dict[str, Entry], tuple[LeftOut, ...]], known: Mapping[str, bytes]) -> Files:
    entries, left_out = tree
    missing = [LeftOut(path, "the repository does not hold it") for path, e in entries.items() if e.id not in known]
    files = {path: known[entry.id] for path, entry in entries.items() if entry.id in known}
    return Files(MappingProxyType(files), (*left_out, *missing))
