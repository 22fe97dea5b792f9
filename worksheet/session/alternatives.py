"""What else a sheet could be, for both front ends: its variants, a sweep, the front of current against area."""

from __future__ import annotations

import datetime
from dataclasses import dataclass
from pathlib import Path

from worksheet.model.problem import Problem
from worksheet.model.text import clean, nearest
from worksheet.project.case import Case, CaseError
from worksheet.project.evaluate import Evaluator
from worksheet.review import swept
from worksheet.review.chained import ChainReview
from worksheet.review.front import Front, front
from worksheet.review.results import Review
from worksheet.review.review import solve as solve_points
from worksheet.review.sweep import DEFAULT_POINTS, Sweep, grid, sweep, wanted
from worksheet.review.variants import SideBySide, side_by_side
from worksheet.session.needs import problems_of
from worksheet.session.workbook import Workbook, project_of_sheet

ASKED = "command line"
"""What problems with a question, not with a file, are said of."""


@dataclass(frozen=True, slots=True)
class SweepAsked:
    """A sweep as a user asks for it.

    Attributes:
        of: Name of what is swept.
        low, high: Ends as typed; None for a decade either way.
        points: How many.
        logarithmic: Equal ratios instead of equal steps.
        metrics: Metrics or figures; all targets where empty.
    """

    of: str
    low: str | None = None
    high: str | None = None
    points: int = DEFAULT_POINTS
    logarithmic: bool = False
    metrics: tuple[str, ...] = ()


def opened(path: Path) -> tuple[Evaluator, str] | list[Problem]:
    """The project of a sheet and the sheet's name, or everything that is wrong with it.

    Args:
        path: PROJECT/sheets/NAME.toml.
    """
    place = project_of_sheet(path)
    if isinstance(place, Problem):
        return [place]
    root, name = place
    workbook = Workbook.read(root)
    problems = problems_of(workbook, name)
    if problems or workbook.evaluator is None:
        return problems
    return workbook.evaluator, name


def solved(evaluator: Evaluator, name: str) -> Case | list[Problem]:
    """A sheet with numbers for everything, or why there are none."""
    points, problems = solve_points(evaluator, name)
    return problems if points is None else points.case


def variants_of(evaluator: Evaluator, name: str, today: datetime.date) -> SideBySide | list[Problem]:
    """A sheet and its variants, or why it cannot be reviewed as it stands."""
    found = side_by_side(evaluator, name, today)
    first = found.columns[0]
    return list(first.problems) if first.review is None else found


def front_of(evaluator: Evaluator, name: str) -> Front | list[Problem]:
    """The front of a sheet, or why it cannot be looked for."""
    case = solved(evaluator, name)
    if isinstance(case, list):
        return case
    try:
        return front(case)
    except CaseError as error:
        return [error.problem]


def sweep_of(evaluator: Evaluator, name: str, asked: SweepAsked) -> Sweep | list[Problem]:
    """A sweep of a sheet, or what is wrong with it or with the question."""
    case = solved(evaluator, name)
    if isinstance(case, list):
        return case
    key = "of"
    try:
        axis = swept.find(case, asked.of)
        key = "metric"
        curves = wanted(case, asked.metrics)
        key = "from"
        low = None if asked.low is None else axis.read(asked.low)
        key = "to"
        high = None if asked.high is None else axis.read(asked.high)
        key = "points"
        values = grid(axis, low, high, asked.points, logarithmic=asked.logarithmic)
        return sweep(case, axis, values, curves, logarithmic=asked.logarithmic)
    except (LookupError, ValueError) as error:
        said = error.args[0] if error.args else str(error)
        return [Problem(ASKED, None, key, str(said))]
    except CaseError as error:
        return [error.problem]


def chains_of(review: Review, name: str | None) -> tuple[tuple[ChainReview, ...], tuple[Problem, ...]]:
    """The chains of a review, or the one that is named, and what is wrong."""
    if name is None or any(chain.chain.name == name for chain in review.chains):
        return tuple(chain for chain in review.chains if name in (None, chain.chain.name)), review.problems
    known = [chain.chain.name for chain in review.chains]
    near = nearest(name, known)
    hint = f"did you mean {near}?" if near else f"expected one of {', '.join(known)}." if known else "there is none."
    unknown = Problem(ASKED, None, "chain", f"Found the unknown chain {clean(name)}; {hint}")
    return (), (*review.problems, unknown)
