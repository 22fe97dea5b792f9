"""A revision made: the project's own files committed, and nothing else touched.

Everything that takes time (reading, storing) is done before the index is locked. Under the lock the commit is built in
an index of its own on top of whatever the branch is by then, so that a commit made meanwhile is built upon and not
undone; the user's index gets the same files entered and keeps everything else as it was.

git may have been told to convert, to ignore or to leave alone a file. Line ends are converted as git does it; a file
whose conversion needs a program is left out and named, because no program of a repository is run.
"""

from __future__ import annotations

import hashlib
import os
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass

from worksheet.history.lock import Work
from worksheet.history.outcome import Entry, Head, LeftOut, Person, Refused, RefusedError, Why
from worksheet.history.own import PARTS, is_own, read_own
from worksheet.history.repository import Repository

_TRIES = 5  # against others who move the branch without taking the lock
_FILE, _PROGRAM_FILE = "100644", "100755"
_LOOKED_AT = 8000  # where git looks for a zero byte to tell text from binary [bytes]


@dataclass(frozen=True, slots=True)
class Recorded:
    """A revision was made.

    Attributes:
        revision: Its full id.
        paths: What it changed, relative to the project.
        left_out: What it does not carry although it was asked to.
        remarks: What else there is to say.
    """

    revision: str
    paths: tuple[str, ...]
    left_out: tuple[LeftOut, ...] = ()
    remarks: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True)
class Unchanged:
    """The files are those of the newest revision; no revision was made. See Recorded."""

    left_out: tuple[LeftOut, ...] = ()
    remarks: tuple[str, ...] = ()


def record(
    repository: Repository,
    files: Sequence[str],
    deleted: Sequence[str] = (),
    *,
    note: str,
    body: str = "",
    person: Person | None = None,
) -> Recorded | Unchanged | Refused:
    """Commit the project's own files as they stand.

    Args:
        repository: From find or create.
        files: The project's own files, relative to the project (own.own_files).
        deleted: Those that are gone (gone).
        note: The first line of the message; text of several lines is taken apart into first line and rest.
        body: What follows it, such as a digest of what moved.
        person: Who records, where git does not know or is to be told otherwise.

    Returns: what was made, or that nothing changed, or why nothing was done.
    """
    message = _message(note, body)
    if not message.strip():
        return Refused(Why.FAILED, "A revision needs a note: say what changed and why.")
    problem = person.problem() if person else None
    if problem:
        return Refused(Why.NO_IDENTITY, problem)
    try:
        with Work(repository.index, lambda: repository.head().commit) as work:
            head = _free(repository)
            changes, left_out = _changes(repository, head, files, deleted, work)
            if not changes:
                return Unchanged(left_out)
            if person is None:
                repository.identity()
            work.take()
            for _ in range(_TRIES):
                made = _commit(repository, work, changes, message, person)
                if isinstance(made, Recorded):
                    return Recorded(made.revision, made.paths, left_out, tuple(work.remarks))
                if not made:
                    return Unchanged(left_out, tuple(work.remarks))
        return Refused(Why.LOCKED, "Others keep moving the branch; nothing was recorded. Try again.")
    except RefusedError as error:
        return error.refused


def gone(repository: Repository, files: Iterable[str]) -> tuple[str, ...] | Refused:
    """The project's own files that the newest revision has and that are not among those given, sorted."""
    try:
        head = repository.head()
        held = _own(repository.tree(head.commit, PARTS)) if head.commit else {}
    except RefusedError as error:
        return error.refused
    return tuple(sorted(held.keys() - set(files)))


def unrecorded(
    repository: Repository, files: Sequence[str], deleted: Sequence[str] = ()
) -> tuple[tuple[str, ...], tuple[LeftOut, ...]] | Refused:
    """What a revision made now would change, and what it would leave out; nothing is written.

    Args:
        repository: From find or create.
        files, deleted: As for record.
    """
    try:
        changes, left_out = _changes(repository, repository.head(), files, deleted, None)
    except RefusedError as error:
        return error.refused
    return tuple(sorted(changes)), left_out


def _message(note: str, body: str) -> str:
    """One commit message: a first line, an empty one, the rest."""
    first, _, rest = note.replace("\0", "").strip().partition("\n")
    parts = (first.strip(), rest.strip(), body.replace("\0", "").strip())
    return "\n\n".join(part for part in parts if part) + "\n"


def _free(repository: Repository) -> Head:
    """Where the repository stands.

    Raises: RefusedError, where something is in progress that a revision would spoil.
    """
    head = repository.head()
    if head.busy:
        raise RefusedError(Why.BUSY, head.busy)
    return head


def _own(entries: Mapping[str, Entry]) -> dict[str, Entry]:
    return {path: entry for path, entry in entries.items() if entry.kind == "blob" and is_own(path)}


def _changes(
    repository: Repository, head: Head, files: Sequence[str], deleted: Sequence[str], work: Work | None
) -> tuple[dict[str, tuple[str, str] | None], tuple[LeftOut, ...]]:
    """What differs from the newest revision: mode and id by path, None for what is gone; and what is left out.

    Args:
        work: Where the new contents go on their way into the object store; None: they are not stored.
    """
    held = _own(repository.tree(head.commit, PARTS)) if head.commit else {}
    refused = {path: "it is none of the project's own files" for path in (*files, *deleted) if not is_own(path)}
    changed: dict[str, bytes] = {}
    folder = repository.folder
    for path in dict.fromkeys(files):
        if path in refused:
            continue
        content = read_own(folder, path)
        if isinstance(content, str):
            refused[path] = content
        elif path not in held or held[path].id != _id(repository, content) or held[path].mode == "120000":
            changed[path] = content
    removed = [path for path in dict.fromkeys(deleted) if path in held and path not in set(files)]
    if changed:
        _convert(repository, changed, held, refused)
        for path in repository.ignored(changed):
            refused[path] = "git is told to ignore it"
    if changed or removed:
        _heed_index(repository, [*changed, *removed], refused)
    kept = {path: content for path, content in changed.items() if path not in refused}
    ids = _store(repository, kept, work)
    entries: dict[str, tuple[str, str] | None] = dict.fromkeys(path for path in removed if path not in refused)
    for path, name in zip(kept, ids, strict=True):
        entries[path] = (_mode(repository, path, held.get(path)), name)
    return entries, tuple(LeftOut(path, refused[path]) for path in sorted(refused))


def _store(repository: Repository, contents: Mapping[str, bytes], work: Work | None) -> list[str]:
    """The ids of contents; stored through copies, so that what was compared is what is stored."""
    if work is None:
        return [_id(repository, content) for content in contents.values()]
    copies = []
    for number, content in enumerate(contents.values()):
        copy = work.folder / str(number)
        copy.write_bytes(content)
        copies.append(copy)
    return repository.store(copies) if copies else []


def _mode(repository: Repository, path: str, before: Entry | None) -> str:
    """The mode of a file: that of the newest revision, else as it stands."""
    if before is not None and before.mode in {_FILE, _PROGRAM_FILE}:
        return before.mode
    told = repository.settings.get("core.filemode", "true") == "true"
    return _PROGRAM_FILE if told and os.access(repository.folder / path, os.X_OK) else _FILE


def _id(repository: Repository, content: bytes) -> str:
    """The id that git gives a content."""
    digest = hashlib.new(repository.algorithm, usedforsecurity=False)
    digest.update(b"blob %d\0" % len(content))
    digest.update(content)
    return digest.hexdigest()


def _heed_index(repository: Repository, paths: Iterable[str], refused: dict[str, str]) -> None:
    """Note what the user told git to leave alone.

    Raises: RefusedError, where a file of the project has a conflict that is not settled.
    """
    tags = repository.index_tags(PARTS)
    for path in paths:
        tag = tags.get(path, "H")
        if tag == "M":
            message = (
                f"{path} has a conflict in the index that is not settled: settle it (git add {path}), then record."
            )
            raise RefusedError(Why.CONFLICT, message)
        if tag != "H":
            refused[path] = "git is told to leave it alone (sparse checkout, or assumed unchanged)"


def _convert(
    repository: Repository, changed: dict[str, bytes], held: Mapping[str, Entry], refused: dict[str, str]
) -> None:
    """Convert line ends as git would, and refuse what only a program or an encoding could convert.

    What then is as it was in the newest revision is no longer among the changed.
    """
    automatic = repository.settings.get("core.autocrlf", "").lower() in {"true", "input"}
    for path, told in repository.attributes(changed).items():
        for name in ("filter", "ident", "working-tree-encoding"):
            if told[name] not in {"unspecified", "unset"}:
                refused[path] = f"git is told to convert it ({name}), and nothing that a repository names is run"
        content = changed[path]
        if path in refused or b"\r\n" not in content or told["text"] == "unset":
            continue
        always = told["text"] == "set" or (told["text"] == "unspecified" and told["eol"] in {"lf", "crlf"})
        guess = told["text"] == "auto" or (told["text"] == "unspecified" and automatic)
        if always or (guess and _is_text(content) and not _had_returns(repository, held.get(path))):
            changed[path] = content.replace(b"\r\n", b"\n")
            if path in held and held[path].id == _id(repository, changed[path]):
                del changed[path]


def _is_text(content: bytes) -> bool:
    """Whether git would guess text: no zero byte near the start, and no carriage return but at line ends."""
    return b"\0" not in content[:_LOOKED_AT] and content.count(b"\r") == content.count(b"\r\n")


def _had_returns(repository: Repository, before: Entry | None) -> bool:
    """Whether the newest revision already holds carriage returns; git then leaves them."""
    (found,) = repository.objects([before.id]) if before else (None,)
    return found is not None and b"\r\n" in found[1]


def _commit(
    repository: Repository,
    work: Work,
    changes: Mapping[str, tuple[str, str] | None],
    message: str,
    person: Person | None,
) -> Recorded | bool:
    """Build the commit on the present branch and move it; the lock is held.

    Returns: True where the branch was moved by somebody meanwhile, False where nothing is left to change.
    """
    head = _free(repository)
    held = _own(repository.tree(head.commit, PARTS)) if head.commit else {}
    left = {
        path: entry
        for path, entry in changes.items()
        if (None if path not in held else (held[path].mode, held[path].id)) != entry
    }
    if not left:
        return False
    own_index, new_index = work.folder / "tree", work.folder / "next"
    repository.put(own_index, left, head.tree)
    commit = repository.commit(own_index, head.commit, message, person)
    if repository.index.exists():
        new_index.write_bytes(repository.index.read_bytes())
    repository.put(new_index, left)
    work.switch(new_index, commit)
    try:
        repository.move_head(
            commit, head.commit, f"record: {message.partition(chr(10))[0]}", person, keep=(work.descriptor,)
        )
    except RefusedError:
        now = repository.head().commit
        if now == commit:
            return Recorded(commit, tuple(sorted(left)))
        if now == head.commit:
            raise
        return True
    return Recorded(commit, tuple(sorted(left)))
