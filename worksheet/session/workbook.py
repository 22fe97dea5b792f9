"""A project opened: its files, its evaluator, and what both front ends ask of them."""

from __future__ import annotations

import datetime
from functools import cached_property
from pathlib import Path
from typing import TYPE_CHECKING

from worksheet.model.problem import Problem
from worksheet.project.discover import SHEETS, Project, load
from worksheet.project.evaluate import Evaluator
from worksheet.review.results import Review
from worksheet.review.review import review

if TYPE_CHECKING:
    from collections.abc import Mapping

    from worksheet.project.case import Case
    from worksheet.review.deeper import Deeper, Wanted


class Workbook:
    """One state of a project on disk; a changed project gets a new workbook."""

    def __init__(self, project: Project) -> None:
        """Take a project that was read."""
        self.project = project

    @classmethod
    def read(cls, root: Path) -> Workbook:
        """Read a project folder."""
        return cls(load(root))

    @cached_property
    def evaluator(self) -> Evaluator | None:
        """The project's evaluator; None where the project or process file cannot be read."""
        if self.project.file is None or self.project.process is None:
            return None
        return Evaluator(self.project, _proposed)

    def review(self, today: datetime.date) -> Review:
        """Every sheet at every condition. `today` decides which waivers have ended."""
        return review(self.project, self.evaluator, today)

    def deeper(self, result: Review, wanted: Wanted) -> Deeper:
        """Fragility and yield beside a review of this workbook."""
        from worksheet.review.deeper import deeper  # most reviews want neither

        return deeper(result, self.evaluator, wanted)


def _proposed(case: Case) -> Mapping[str, float]:
    from worksheet.solver.propose import propose  # few sheets leave something open

    return propose(case)


def project_of_sheet(path: Path) -> tuple[Path, str] | Problem:
    """The project folder and the sheet's name for a path to sheets/NAME.toml, or what is wrong with the path."""
    try:
        there = path.exists()
    except (OSError, ValueError) as error:
        return Problem(str(path), None, "", f"found a path that cannot be looked at ({error})")
    if path.suffix != ".toml" or path.parent.name not in (SHEETS, "") or not there:
        what = "no such file" if not there else "no sheet of a project"
        return Problem(str(path), None, "", f"found {what}; expected PROJECT/{SHEETS}/NAME.toml")
    folder = path.resolve().parent
    if folder.name != SHEETS:
        return Problem(str(path), None, "", f"found no sheet of a project; expected PROJECT/{SHEETS}/NAME.toml")
    return folder.parent, path.stem
