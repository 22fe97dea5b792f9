"""A book that is open: every accepted change on disk at once, a way back, other people's changes taken in.

A front end asks and is handed outcomes and frozen snapshots. All methods may be called from any thread; they take
turns.
"""

from __future__ import annotations

import datetime
import threading
from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace
from pathlib import Path

from worksheet.model.problem import Problem
from worksheet.model.text import clean
from worksheet.project.discover import PROJECT_FILE, Project, load
from worksheet.project.evaluate import Evaluator
from worksheet.review.results import Review
from worksheet.session.edits import (
    ChangeSheet,
    FileChange,
    KeyPath,
    RefusedError,
    Request,
    changes,
    name_of,
    title_of,
    value_at,
)
from worksheet.session.judging import formula_problems, new_problems, unused_names
from worksheet.session.reading import FileReading, Shelf, Signature, signature
from worksheet.session.reviewing import Reviewing
from worksheet.session.snapshot import Snapshot, file_of
from worksheet.session.turns import turn
from worksheet.session.undoing import Step, moved_by, patch_of, step_back
from worksheet.session.writing import Writer
from worksheet.sheetfile import source

READ_ONLY = "The book is opened for reading only."
AWAY = "The project's folder is gone or cannot be reached; nothing is written until it is back."
_TRIES = 5
"""How often a change is made anew where somebody else writes the same file at that moment."""


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
        self._writer = Writer(root)
        self._reviewing = Reviewing()
        self._undo: list[Step] = []
        self._redo: list[Step] = []
        self._signature: Signature = {}
        self._unsure: set[str] = set()
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
            if not force and self._as_left(signature(self.root)):
                return False
            return self._take_in()

    def _as_left(self, present: Signature) -> bool:
        """Whether no file has changed, those that were just written compared by their bytes."""
        if any(
            self._signature.get(file) != present.get(file)
            for file in self._signature.keys() | present.keys()
            if file not in self._unsure
        ):
            return False
        for file in self._unsure:
            content = source.load(self.root / file, file)
            if (None if isinstance(content, Problem) else content) != self._snapshot.contents.get(file):
                return False
        self._signature = present
        self._unsure.clear()
        return True

    def _take_in(self) -> bool:
        stamp = signature(self.root)
        reading = FileReading(self._shelf)
        project = load(self.root, reading)
        self._signature = stamp
        self._unsure.clear()
        before = self._snapshot
        away = PROJECT_FILE in before.contents and not (self.root / PROJECT_FILE).exists()
        if away:  # a share that is gone, a branch that is being changed: the last state stays in sight
            where = Problem(clean(str(self.root)), None, "", AWAY)
            project = replace(before.project, problems=(where, *(p for p in before.project.problems if p != where)))
            reading.contents = dict(before.contents)
        elif before.away:
            before = replace(before, away=False)
        same = reading.contents == before.contents and project.problems == before.project.problems
        if before.revision and same and away == self._snapshot.away:
            return False
        self._show(replace(before, project=project, contents=reading.contents, away=away))
        return True

    def _show(self, snapshot: Snapshot) -> None:
        self._snapshot = Snapshot(
            self._snapshot.revision + 1,
            snapshot.project,
            snapshot.contents,
            undo=self._undo[-1].title if self._undo else "",
            redo=self._redo[-1].title if self._redo else "",
            read_only=self._read_only,
            away=snapshot.away,
        )

    # What can be done

    def apply(self, request: Request) -> Outcome:
        """Make a change: on disk and in the snapshot when this returns, or not at all."""
        return self._again(lambda: self._apply(request))

    def _apply(self, request: Request) -> Outcome:
        collision = self._collision(request)
        if collision is not None:
            return Outcome(collision=collision)
        try:
            made = changes(request, self._snapshot)
        except (RefusedError, ValueError) as error:
            return Outcome(problems=(_problem(request, error),))
        outcome = self._commit(title_of(request), made, request)
        if outcome.accepted:
            self._undo.append(Step(outcome.done, tuple(map(patch_of, made)), moved_by(made)))
            self._redo.clear()
            self._show(self._snapshot)
        return outcome

    def _again(self, change: Callable[[], Outcome]) -> Outcome:
        """Make a change on the files as they stand; anew where somebody else was writing one of them just then."""
        from worksheet.sheetfile.write import ChangedOnDiskError

        if self._read_only:
            return Outcome(problems=(Problem("", None, "", READ_ONLY),))
        with self._lock, turn(self.root):
            for _ in range(_TRIES):
                self.refresh()
                if self._snapshot.away:
                    return Outcome(problems=self._snapshot.project.problems[:1])
                try:
                    return change()
                except ChangedOnDiskError as error:
                    self._signature = {}
                    said = str(error)
            return Outcome(problems=(Problem("", None, "", said),))

    def undo(self) -> Outcome:
        """Take the last change back."""
        return self._again(lambda: self._step(self._undo, self._redo, "taken back: "))

    def redo(self) -> Outcome:
        """Make the change again that was taken back last."""
        return self._again(lambda: self._step(self._redo, self._undo, "made again: "))

    def _step(self, source: list[Step], target: list[Step], said: str) -> Outcome:
        if not source:
            return Outcome()
        step = source[-1].inverse
        try:
            made = step_back(step, self._snapshot)
        except (RefusedError, ValueError) as error:
            source.pop()  # it can never be taken back any more; what lies before it may be
            self._show(self._snapshot)
            return Outcome(problems=(Problem("", None, "", str(error)),))
        outcome = self._commit(said + step.title, made)
        if outcome.accepted:
            source.pop()
            target.append(Step(step.title, tuple(map(patch_of, made)), step.moved))
            self._show(self._snapshot)
        return outcome

    def copy_to(self, folder: Path) -> tuple[Problem, ...]:
        """Write the files as they were last seen into another folder; what stands there already stays.

        Returns: what could not be written.
        """
        made = [FileChange(file, None, content) for file, content in self.snapshot().contents.items()]
        return Writer(folder).write(made)

    # How it is done

    def _collision(self, request: Request) -> Collision | None:
        if isinstance(request, ChangeSheet) and request.expected:
            data = self._snapshot.data(request.sheet)
            for path, expected in request.expected.items():
                found = value_at(data, path)
                if found != expected:
                    return Collision(path, found)
        return None

    def _commit(self, title: str, made: Sequence[FileChange], request: Request | None = None) -> Outcome:
        """Hold what a request makes of the files against the whole project, write it, take it in.

        A way back has no request and is held against nothing: it leads to what was there.
        """
        reading = FileReading(self._shelf, {change.file: change.after for change in made})
        project = load(self.root, reading)
        if request is not None:
            wrong = new_problems(self._snapshot.project, project, request)
            evaluator = self._reviewing.evaluator(project) if not wrong else None
            if evaluator is not None:
                wrong = formula_problems(evaluator, request)
            if wrong:
                return Outcome(problems=tuple(wrong), unused=unused_names(wrong, request))
        stuck = self._writer.write(made)
        self._unsure |= {change.file for change in made}  # others may have written them since
        if stuck:
            return Outcome(problems=stuck)
        self._show(replace(self._snapshot, project=project, contents=reading.contents))
        return Outcome(done=title)


def _problem(request: Request, error: Exception) -> Problem:
    return Problem(file_of(clean(name_of(request))), None, getattr(error, "key", ""), str(error))
