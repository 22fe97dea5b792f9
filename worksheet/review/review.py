"""A project reviewed: every sheet at every condition, budgets, and whatever is wrong, side by side."""

from __future__ import annotations

import datetime

from worksheet.model.problem import Problem
from worksheet.project.case import CaseError
from worksheet.project.discover import Project
from worksheet.project.evaluate import Evaluator
from worksheet.review import budgets
from worksheet.review.late import late_problems
from worksheet.review.results import Review, SheetReview
from worksheet.review.sheet_review import Points, level_problems, points_of, review_points


def review(project: Project, evaluator: Evaluator | None, today: datetime.date) -> Review:
    """Review a project.

    Args:
        project: As its files state it.
        evaluator: Its evaluator; None where the project file or process cannot be read.
        today: For waivers with an end.
    Returns: Review; a bad sheet is among the problems and hides no other
    """
    if evaluator is None or project.file is None:
        return Review("", problems=project.problems, bad=project.bad)
    problems: list[Problem] = list(project.problems)
    solved: list[Points] = []
    for name in project.sheets:
        points, found = solve(evaluator, name)
        problems += found
        if points is not None:
            solved.append(points)
    reviews: list[SheetReview] = [review_points(points, today) for points in solved]
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
    )


def solve(evaluator: Evaluator, name: str) -> tuple[Points | None, list[Problem]]:
    """Solve one sheet over its points, or say why it cannot be."""
    try:
        points = points_of(evaluator.case(name))
        problems = [*late_problems(points.case), *level_problems(points)]
    except CaseError as error:
        return None, [error.problem]
    return (None, problems) if problems else (points, [])
