"""A book that is open: every accepted change on disk at once, a way back, other people's changes taken in.

A front end asks and is handed outcomes and frozen snapshots. All methods may be called from any thread; they take
turns.
"""

from __future__ import annotations

import datetime
import threading
from collections.abc import Sequence
from dataclasses import dataclass, replace
from pathlib import Path

from worksheet.model.problem import Problem
from worksheet.model.text import clean
from worksheet.project.case import CaseError
from worksheet.project.discover import Project, load
from worksheet.project.evaluate import Evaluator
from worksheet.review.results import Review
from worksheet.session.edits import (
    ChangeSheet,
    FileChange,
    KeyPath,
    Put,
    RefusedError,
    Request,
    changes,
    title_of,
    value_at,
)
from worksheet.session.reading import FileReading, Shelf, data_of, signature
from worksheet.session.reviewing import Reviewing
from worksheet.session.snapshot import Snapshot, file_of
from worksheet.session.undoing import Step, moved_by, patch_of, step_back

READ_ONLY = "The book is opened for reading only."


@dataclass(frozen=True, slots=True)
class Collision:
    """Somebody else changed the value that was about to be changed: what stands there now, None for nothing."""

    path: KeyPath
    found: object


@dataclass(frozen=True, slots=True)
class Outcome:
    """What came of a request.

    Attributes:
        done: In words, what was changed; "" where nothing was.
        problems: Why nothing was.
        collision: Set where the user has to decide first; the request may then be made again without `expected`.
        unused: Own names that the change would leave without a formula, which a sheet must not have.
    """

    done: str = ""
    problems: tuple[Problem, ...] = ()
    collision: Collision | None = None
    unused: tuple[str, ...] = ()

    @property
    def accepted(self) -> bool:
        """Whether the change is on disk."""
        return bool(self.done)


class Session:
    """One project, open."""

    def __init__(self, root: Path, *, read_only: bool = False) -> None:
        """Read the project; what is wrong with it is among the snapshot's problems."""
        self.root = root
        self._read_only = read_only
        self._lock = threading.RLock()
        self._shelf = Shelf()
        self._reviewing = Reviewing()
        self._undo: list[Step] = []
        self._redo: list[Step] = []
        self._signature: object = None
        self._snapshot = Snapshot(0, Project(root, None, None), {}, read_only=read_only)
        self._take_in()

    # What there is

    def snapshot(self) -> Snapshot:
        """The book as it stands."""
        with self._lock:
            return self._snapshot

    def evaluator(self, snapshot: Snapshot) -> Evaluator | None:
        """The evaluator of a snapshot; None where project or process file cannot be read."""
        return self._reviewing.evaluator(snapshot.project)

    def review(self, snapshot: Snapshot, today: datetime.date) -> Review:
        """A snapshot's results. `today` decides which waivers have ended."""
        return self._reviewing.review(snapshot.project, self.evaluator(snapshot), today)

    def refresh(self, *, force: bool = False) -> bool:
        """Take in what others changed. Whether anything differs."""
        with self._lock:
            if not force and signature(self.root) == self._signature:
                return False
            return self._take_in()

    def _take_in(self) -> bool:
        stamp = signature(self.root)
        reading = FileReading(self._shelf)
        project = load(self.root, reading)
        self._signature = stamp
        before = self._snapshot
        if before.revision and reading.contents == before.contents and project.problems == before.project.problems:
            return False
        self._show(replace(before, project=project, contents=reading.contents))
        return True

    def _show(self, snapshot: Snapshot) -> None:
        self._snapshot = Snapshot(
            self._snapshot.revision + 1,
            snapshot.project,
            snapshot.contents,
            undo=self._undo[-1].title if self._undo else "",
            redo=self._redo[-1].title if self._redo else "",
            read_only=self._read_only,
        )

    # What can be done

    def apply(self, request: Request) -> Outcome:
        """Make a change: on disk and in the snapshot when this returns, or not at all."""
        if self._read_only:
            return Outcome(problems=(Problem("", None, "", READ_ONLY),))
        with self._lock:
            self.refresh()
            collision = self._collision(request)
            if collision is not None:
                return Outcome(collision=collision)
            try:
                made = changes(request, self._snapshot)
            except (RefusedError, ValueError) as error:
                return Outcome(problems=(_problem(request, error),))
            moved = moved_by(request, *self._data(request, made))
            outcome = self._commit(title_of(request), made, checked=True, request=request)
            if outcome.accepted:
                self._undo.append(Step(outcome.done, tuple(map(patch_of, made)), moved))
                self._redo.clear()
                self._show(self._snapshot)
            return outcome

    def undo(self) -> Outcome:
        """Take the last change back."""
        return self._step(self._undo, self._redo, "taken back: ")

    def redo(self) -> Outcome:
        """Make the change again that was taken back last."""
        return self._step(self._redo, self._undo, "made again: ")

    def _step(self, source: list[Step], target: list[Step], said: str) -> Outcome:
        with self._lock:
            if not source or self._read_only:
                return Outcome()
            self.refresh()
            step = source[-1].inverse
            try:
                made = step_back(step, self._snapshot)
            except (RefusedError, ValueError) as error:
                source.pop()  # it can never be taken back any more; what lies before it may be
                self._show(self._snapshot)
                return Outcome(problems=(Problem("", None, "", str(error)),))
            outcome = self._commit(said + step.title, made, checked=False)
            if outcome.accepted:
                source.pop()
                target.append(Step(step.title, tuple(map(patch_of, made)), step.moved))
                self._show(self._snapshot)
            return outcome

    # How it is done

    def _collision(self, request: Request) -> Collision | None:
        if isinstance(request, ChangeSheet) and request.expected:
            data = self._snapshot.data(request.sheet)
            for path, expected in request.expected.items():
                found = value_at(data, path)
                if found != expected:
                    return Collision(path, found)
        return None

    def _data(self, request: Request, made: Sequence[FileChange]) -> tuple[dict[str, object], dict[str, object]]:
        if not isinstance(request, ChangeSheet):
            return {}, {}
        (change,) = made
        return dict(self._snapshot.data(request.sheet)), data_of(change.after or b"", change.file)

    def _commit(
        self, title: str, made: Sequence[FileChange], *, checked: bool, request: Request | None = None
    ) -> Outcome:
        """Hold a change against the whole project, write it, take it in."""
        reading = FileReading(self._shelf, {change.file: change.after for change in made})
        project = load(self.root, reading)
        if checked:
            wrong = self._new_problems(project, request)
            if wrong:
                return Outcome(problems=wrong, unused=_unused(wrong, request))
        wrong = self._write(made)
        if wrong:
            return Outcome(problems=wrong)
        self._signature = signature(self.root)
        self._show(replace(self._snapshot, project=project, contents=reading.contents))
        return Outcome(done=title)

    def _new_problems(self, project: Project, request: Request | None) -> tuple[Problem, ...]:
        """What would be wrong that is not wrong now."""
        known = {(p.file, p.key, p.message) for p in self._snapshot.project.problems}
        found = [p for p in project.problems if (p.file, p.key, p.message) not in known]
        if not found and isinstance(request, ChangeSheet) and request.sheet in project.sheets:
            found = self._formula_problems(project, request)
        return tuple(found)

    def _formula_problems(self, project: Project, request: ChangeSheet) -> list[Problem]:
        """Formulas that give no number in their range, which no reader of the text can see."""
        evaluator = self._reviewing.evaluator(project)
        if evaluator is None:
            return []
        for piece in request.pieces:
            if isinstance(piece, Put) and len(piece.path) == 3 and piece.path[-1] == "formula":
                table, name, _ = piece.path
                if table in ("assume", "choose", "own"):
                    try:
                        evaluator.case(request.sheet).value(str(name))
                    except CaseError as error:
                        return [error.problem]
        return []

    def _write(self, made: Sequence[FileChange]) -> tuple[Problem, ...]:
        """Write files one by one; where one fails, those before it are put back."""
        done: list[FileChange] = []
        for change in made:
            try:
                self._put(change)
            except ValueError as error:
                for earlier in reversed(done):
                    try:
                        self._put(FileChange(earlier.file, earlier.after, earlier.before))
                    except ValueError as worse:
                        return (Problem(change.file, None, "", str(error)), Problem(earlier.file, None, "", str(worse)))
                return (Problem(change.file, None, "", str(error)),)
            done.append(change)
        return ()

    def _put(self, change: FileChange) -> None:
        from worksheet.sheetfile import write

        path = self.root / change.file
        if change.after is None:
            write.remove(path, read=change.before or b"", root=self.root)
        elif change.before is None:
            write.create(path, change.after.decode("utf-8"), root=self.root)
        else:
            write.save(path, read=change.before, new=change.after.decode("utf-8"), root=self.root)


def _problem(request: Request, error: Exception) -> Problem:
    name = request.sheet if isinstance(request, ChangeSheet) else request.name
    return Problem(file_of(clean(name)), None, getattr(error, "key", ""), str(error))


def _unused(problems: Sequence[Problem], request: Request | None) -> tuple[str, ...]:
    """Own names that are left unused, where nothing else is wrong."""
    if not isinstance(request, ChangeSheet):
        return ()
    found = [
        p.key.removeprefix("own.") for p in problems if p.key.startswith("own.") and "used by no formula" in p.message
    ]
    return tuple(found) if len(found) == len(problems) else ()
