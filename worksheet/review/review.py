"""A project reviewed: every sheet at every condition, budgets, and whatever is wrong, side by side."""

from __future__ import annotations

import datetime
from collections.abc import Callable, Mapping
from dataclasses import dataclass

from worksheet.model.problem import Problem
from worksheet.project.case import CaseError
from worksheet.project.discover import Project
from worksheet.project.evaluate import Evaluator
from worksheet.review import budgets
from worksheet.review.late import late_problems
from worksheet.review.results import Review, SheetReview
from worksheet.review.sheet_review import Points, level_problems, points_of, review_points


@dataclass(frozen=True, eq=False, slots=True)
class Reviewed:
    """One sheet solved and reviewed, or why it cannot be."""

    points: Points | None
    result: SheetReview | None
    problems: tuple[Problem, ...] = ()


Reviewer = Callable[[Evaluator, str, datetime.date], Reviewed]
"""Solves and reviews the sheet of that name."""


def reviewed(evaluator: Evaluator, name: str, today: datetime.date) -> Reviewed:
    """Solve and review one sheet."""
    points, problems = solve(evaluator, name)
    return Reviewed(points, None if points is None else review_points(points, today), tuple(problems))


def review(
    project: Project, evaluator: Evaluator | None, today: datetime.date, reviewer: Reviewer = reviewed
) -> Review:
    """Review a project.

    Args:
        project: As its files state it.
        evaluator: Its evaluator; None where the project file or process cannot be read.
        today: For waivers with an end.
        reviewer: How a sheet is reviewed; a session hands out again what did not change.
    Returns: Review; a bad sheet is among the problems and hides no other
    """
    if evaluator is None or project.file is None:
        return Review("", problems=project.problems, bad=project.bad)
    every = [reviewer(evaluator, name, today) for name in project.sheets]
    problems = [*project.problems, *(problem for one in every for problem in one.problems)]
    solved = [one.points for one in every if one.points is not None]
    reviews = [one.result for one in every if one.result is not None]
    bad = (*project.bad, *(name for name in project.sheets if name not in {p.case.sheet.name for p in solved}))
    nominal = project.file.nominal
    return Review(
        title=project.file.title,
        sheets=tuple(reviews),
        budgets=budgets.review_budgets(project.file.budgets, solved, complete=not bad),
        problems=tuple(problems),
        conditions=len(project.file.processes) * len(project.file.temperatures) * len(project.file.supplies),
        nominal=nominal,
        bad=bad,
        uncovered=uncovered(project),
    )


def uncovered(project: Project) -> Mapping[str, str]:
    """Requirements of the project file whose number is no target's id, by number.

    Targets of a sheet that cannot be read cover nothing.
    """
    if project.file is None:
        return {}
    covered = {target.id for sheet in project.sheets.values() for target in sheet.targets.values()}
    return {number: text for number, text in project.file.requirements.items() if number not in covered}


def solve(evaluator: Evaluator, name: str) -> tuple[Points | None, list[Problem]]:
    """Solve one sheet over its points, or say why it cannot be."""
    try:
        points = points_of(evaluator.case(name))
        problems = [*late_problems(points.case), *level_problems(points)]
    except CaseError as error:
        return None, [error.problem]
    return (None, problems) if problems else (points, [])
