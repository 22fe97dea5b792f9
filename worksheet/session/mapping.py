"""The map of a sheet's window, for whoever draws it: the plane of bias current and load capacitance."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

from worksheet.model.problem import Problem
from worksheet.project.case import CaseError
from worksheet.review.review import solve as solve_points
from worksheet.session.session import Session
from worksheet.session.snapshot import Snapshot
from worksheet.solver import needed
from worksheet.solver import plane as planes
from worksheet.solver.plane import Plane, Span
from worksheet.solver.trials import Trials

ACROSS, UP = "bias_current", "load_capacitance"
"""The variables of the map."""


@dataclass(frozen=True, eq=False)
class Mapped:
    """A map and the sheet's constraints behind it."""

    plane: Plane
    trials: Trials

    def missed(self, across: float, up: float) -> tuple[str, ...]:
        """What does not hold at a place. [A] and [F]"""
        return planes.missed_at(self.trials, {ACROSS: across, UP: up})


def mapped(
    session: Session, snapshot: Snapshot, name: str, cells: tuple[int, int], frame: tuple[Span, Span] | None = None
) -> Mapped | tuple[Problem, ...]:
    """Look at a sheet's constraints over the map.

    Args:
        session: The book.
        snapshot: Its state.
        name: The sheet.
        cells: How many across and up.
        frame: What to look at; None for the surroundings of the present point and of the bounds near it.
    Returns: the map, or why there is none
    """
    evaluator = session.evaluator(snapshot)
    if evaluator is None or name not in snapshot.project.sheets:
        return snapshot.problems_of(name) or snapshot.project.problems
    points, problems = solve_points(evaluator, name)
    if points is None:
        return tuple(problems)
    trials = needed.trials_of(points.case)
    try:
        across, up = frame or _frame(trials)
        return Mapped(planes.plane(trials, ACROSS, across, cells[0], UP, up, cells[1]), trials)
    except CaseError as error:
        return (error.problem,)


def _frame(trials: Trials) -> tuple[Span, Span]:
    bounds: Mapping[str, tuple[float, ...]] = {
        name: tuple(bound.value for bound in window.bounds) for name, window in needed.windows(trials).items()
    }
    return planes.around(trials, ACROSS, bounds), planes.around(trials, UP, bounds)
