"""The repository around a project and its revisions: what listing them needs, and nothing that computes."""

from __future__ import annotations

from pathlib import Path

from worksheet.history import repository, revisions
from worksheet.history.outcome import Refused, RefusedError
from worksheet.history.repository import Repository
from worksheet.history.revisions import Revision
from worksheet.model.problem import Problem
from worksheet.model.text import clean, nearest


def refusal(found: Refused, root: Path) -> Problem:
    """A refusal of git as a problem."""
    return Problem(str(root), None, "", found.message)


def repository_of(root: Path) -> Repository | Problem:
    """The repository that encloses a project, or why there is none to use."""
    try:
        found = repository.find(root)
    except (OSError, ValueError) as error:  # no folder can have such a name
        return Problem(str(root), None, "", f"found no folder that can be read: {getattr(error, 'strerror', error)}")
    if found is None:
        message = "there is no git repository around this project yet; `biasbook record` makes one"
        return Problem(str(root), None, "", message)
    return refusal(found, root) if isinstance(found, Refused) else found


def history(root: Path, sheet: str | None = None) -> tuple[Revision, ...] | Problem:
    """Revisions of a project or of one of its sheets, newest first."""
    found = repository_of(root)
    if isinstance(found, Problem):
        return found
    file = None if sheet is None else f"sheets/{sheet}.toml"
    listed = revisions.history(found, file)
    if isinstance(listed, Refused):
        return refusal(listed, root)
    if file is not None and not listed and not (root / file).exists():
        near = nearest(sheet or "", [path.stem for path in (root / "sheets").glob("*.toml")])
        hint = f"; did you mean {near}?" if near else ""
        return Problem(clean(file), None, "", f"there is no such sheet, and no revision had one{hint}")
    return listed


def names(root: Path) -> tuple[str, ...]:
    """Branches and tags of the repository around a project; none where there is no repository to ask."""
    found = repository_of(root)
    if isinstance(found, Problem):
        return ()
    try:
        return tuple(found.names())
    except RefusedError:
        return ()
