"""Whether a change may enter the files: what would be wrong with the project that was right before.

Only what stands in the files is judged. A number that does not come out (a level that is sought in an empty range) is
no fault of the text and is shown with the results.
"""

from __future__ import annotations

import re
from collections.abc import Sequence

from worksheet.model.problem import Problem
from worksheet.project.case import CaseError
from worksheet.project.discover import SHEETS, Project
from worksheet.project.evaluate import Evaluator
from worksheet.session.edits import (
    AddEntry,
    ChangeSheet,
    DuplicateSheet,
    KeyPath,
    Put,
    RenameSheet,
    Request,
    name_of,
)

_LINE = re.compile(r"\bline \d+")
_FORMULAS = ("assume", "choose", "own")


def new_problems(before: Project, after: Project, request: Request) -> list[Problem]:
    """What a request would break.

    Args:
        before, after: The project without and with it.
        request: What is asked for.

    Returns: problems of sheets that were right before and, of the sheet that is changed, those at the keys that are
        changed. What was wrong before and what only comes to light because something else is put right bars nothing.
    """
    known = {_told(problem) for problem in before.problems}
    changed = [_dotted(path) for path in _paths(request)]
    wrong_already = {*before.bad, *_taken_along(request, before)}
    found = []
    for problem in after.problems:
        if _told(problem) in known:
            continue
        name = _sheet(problem)
        meant = name == name_of(request) and any(_within(problem.key, key) for key in changed)
        if meant or name not in wrong_already:
            found.append(problem)
    return found


def _taken_along(request: Request, before: Project) -> tuple[str, ...]:
    """The name under which a sheet with problems goes on."""
    match request:
        case RenameSheet(name, new) if name in before.bad:
            return (new,)
        case DuplicateSheet(name, copy) if name in before.bad:
            return (copy,)
    return ()


def formula_problems(evaluator: Evaluator, request: Request) -> list[Problem]:
    """Formulas of a request that give no number in their range, which no reader of the text can see."""
    if not isinstance(request, ChangeSheet) or request.sheet not in evaluator.project.sheets:
        return []
    for piece in request.pieces:
        if isinstance(piece, Put) and len(piece.path) == 3 and piece.path[-1] == "formula":
            table, name, _ = piece.path
            if table in _FORMULAS:
                try:
                    evaluator.case(request.sheet).value(str(name))
                except CaseError as error:
                    return [error.problem]
    return []


def unused_names(problems: Sequence[Problem], request: Request) -> tuple[str, ...]:
    """Own names that a request leaves without a formula, where nothing else is wrong."""
    if not isinstance(request, ChangeSheet):
        return ()
    found = [
        p.key.removeprefix("own.") for p in problems if p.key.startswith("own.") and "used by no formula" in p.message
    ]
    return tuple(found) if len(found) == len(problems) else ()


def _told(problem: Problem) -> tuple[str, str, str]:
    """A problem without the lines, which move when anything above it changes."""
    return problem.file, problem.key, _LINE.sub("line", problem.message)


def _sheet(problem: Problem) -> str:
    """The sheet that a problem is about, "" where it is about another file."""
    folder, _, name = problem.file.partition("/")
    return name.removesuffix(".toml") if folder == SHEETS else ""


def _paths(request: Request) -> list[KeyPath]:
    if not isinstance(request, ChangeSheet):
        return []
    return [(piece.array,) if isinstance(piece, AddEntry) else piece.path for piece in request.pieces]


def _dotted(path: KeyPath) -> str:
    return ".".join(str(part) for part in path)


def _within(key: str, changed: str) -> bool:
    """Whether one key lies in the other."""
    return key == changed or key.startswith(f"{changed}.") or changed.startswith(f"{key}.")
