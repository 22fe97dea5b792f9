"""A project reviewed: every sheet at every condition, budgets, and whatever is wrong, side by side."""

from __future__ import annotations

import datetime
from collections.abc import Callable, Collection, Iterator, Mapping, Sequence
from dataclasses import dataclass, field
from typing import TYPE_CHECKING

from worksheet.model.problem import Problem
from worksheet.model.sheet import Chain, Sheet
from worksheet.project.case import CaseError
from worksheet.project.discover import Project
from worksheet.project.evaluate import Evaluator
from worksheet.review import budgets
from worksheet.review.late import late_problems
from worksheet.review.results import Review, SheetReview
from worksheet.review.sheet_review import level_problems, review_points
from worksheet.review.solved import Points, solved_points, with_ranges

if TYPE_CHECKING:
    from worksheet.review.chained import ChainReview


@dataclass(frozen=True, eq=False, slots=True)
class Reviewed:
    """One sheet solved and reviewed, or why it cannot be. `spent` is what it takes of each budget."""

    result: SheetReview | None
    spent: Mapping[str, budgets.Spent] = field(default_factory=dict)
    problems: tuple[Problem, ...] = ()


Reviewer = Callable[[Evaluator, Sequence[str], datetime.date], Mapping[str, Reviewed]]
"""Solves and reviews the sheets of those names."""

Chainer = Callable[[Evaluator, Mapping[str, Chain], Collection[str]], "tuple[ChainReview, ...]"]
"""Reviews chains, given the names of sheets that have problems."""


def reviewed(evaluator: Evaluator, names: Sequence[str], today: datetime.date) -> dict[str, Reviewed]:
    """Solve and review sheets, those of one circuit in one batch."""
    found: dict[str, Reviewed] = {}
    for name, points, problems in _solved(evaluator, names):
        try:
            if points is None:
                found[name] = Reviewed(None, problems=problems)
            else:
                found[name] = Reviewed(review_points(points, today), budgets.spent(points))
        except CaseError as error:  # a figure whose formula has no value
            found[name] = Reviewed(None, problems=(error.problem,))
    return found


def solve(evaluator: Evaluator, name: str) -> tuple[Points | None, list[Problem]]:
    """Solve one sheet over its points, or say why it cannot be."""
    _, points, problems = next(iter(_solved(evaluator, (name,))))
    return points, list(problems)


_Solved = tuple[str, Points | None, tuple[Problem, ...]]


def _solved(evaluator: Evaluator, names: Sequence[str]) -> Iterator[_Solved]:
    """Sheets over their points, or why they cannot be solved."""
    evaluator.find_links(names)
    stated, held = [], []
    for name in names:
        try:
            case = evaluator.case(name)
            problems, ranged = tuple(late_problems(case)), with_ranges(case)
        except CaseError as error:
            yield name, None, (_of(evaluator.project.sheets[name], error.problem),)
            continue
        if problems:
            yield name, None, problems
        else:
            stated.append(case)
            held.append(ranged)
    for points in solved_points(stated, held):
        problems = tuple(level_problems(points))
        yield points.case.sheet.name, None if problems else points, problems


def _of(sheet: Sheet, problem: Problem) -> Problem:
    """A sheet's own problem, or that it takes values from a sheet that has one, which is told there."""
    if problem.file == sheet.file:
        return problem
    other = problem.file.rpartition("/")[2].removesuffix(".toml")
    return Problem(sheet.file, None, "", f"this sheet takes values from {other!r}, which has problems of its own")


def chained(evaluator: Evaluator, chains: Mapping[str, Chain], bad: Collection[str]) -> tuple[ChainReview, ...]:
    """Review the chains of a project; what that takes is loaded only where there are any."""
    if not chains:
        return ()
    from worksheet.review.chains import review_chains

    return review_chains(evaluator, chains, bad)


def review(
    project: Project,
    evaluator: Evaluator | None,
    today: datetime.date,
    reviewer: Reviewer = reviewed,
    chainer: Chainer = chained,
) -> Review:
    """Review a project.

    Args:
        project: As its files state it.
        evaluator: Its evaluator; None where the project file or process cannot be read.
        today: For waivers with an end.
        reviewer: How sheets are reviewed; a session hands out again what did not change.
        chainer: How chains are.
    Returns: Review; a bad sheet is among the problems and hides no other
    """
    if evaluator is None or project.file is None:
        return Review("", problems=project.problems, bad=project.bad)
    found = reviewer(evaluator, tuple(project.sheets), today)
    every = [found[name] for name in project.sheets]
    problems = [*project.problems, *(problem for one in every for problem in one.problems)]
    bad = (*project.bad, *(name for name in project.sheets if found[name].result is None))
    nominal = project.file.nominal
    return Review(
        title=project.file.title,
        sheets=tuple(one.result for one in every if one.result is not None),
        budgets=budgets.review_budgets(
            project.file.budgets, [one.spent for one in every if one.spent], complete=not bad
        ),
        problems=tuple(problems),
        conditions=len(project.file.processes) * len(project.file.temperatures) * len(project.file.supplies),
        nominal=nominal,
        bad=bad,
        uncovered=uncovered(project),
        chains=chainer(evaluator, project.file.chains, frozenset(bad)),
    )


def uncovered(project: Project) -> Mapping[str, str]:
    """Requirements of the project file whose number is no target's id, of a sheet or a chain, by number.

    Targets of a sheet that cannot be read cover nothing.
    """
    if project.file is None:
        return {}
    stated = [holder.targets for holder in project.sheets.values()]
    stated += [holder.targets for holder in project.file.chains.values()]
    covered = {target.id for targets in stated for target in targets.values()}
    return {number: text for number, text in project.file.requirements.items() if number not in covered}
