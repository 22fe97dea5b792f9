"""Trial points: by how much every target and every limit is cleared when design variables are moved.

A sheet is solved for many trial points, all its conditions and the ends of its ranges in one batch; the worst of
them is what counts.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from worksheet.device.arrays import Array
from worksheet.engine.solution import NumericSolution
from worksheet.engine.validity import TOLERANCE as VOLTAGE_TOLERANCE
from worksheet.engine.validity import shortfalls
from worksheet.model.sheet import Condition, Target
from worksheet.solver import goals
from worksheet.solver.subject import Subject

SATURATION, MAX_VOLTAGE, PROCESS = "saturation", "max_voltage", "process"
"""What sets an end of a window besides a target."""

Mask = NDArray[np.bool_]
Index = NDArray[np.intp]

_VALIDITY = {"saturation": SATURATION, "range": SATURATION, "max_voltage": MAX_VOLTAGE}


@dataclass(frozen=True, slots=True)
class Constraint:
    """One side of a target, or a limit on validity (target None).

    `name` is the target's name or SATURATION or MAX_VOLTAGE; `side` is "low" for a minimum, "high" for a maximum.
    """

    name: str
    side: str
    target: Target | None = None


@dataclass(frozen=True, eq=False, slots=True)
class Cleared:
    """Slack of constraints at trial points.

    Attributes:
        slack: Shape (constraints, trials); positive where cleared, see goals.slack. [-] or [V]
        worst: Index of the point (ends of ranges times conditions) that is worst, same shape.
    """

    slack: Array
    worst: Index

    @property
    def least(self) -> Array:
        """The least slack of all constraints, shape (trials,)."""
        return np.asarray(np.min(self.slack, axis=0))


class Trials:
    """Solves a subject at trial points and tells the slack of its constraints."""

    def __init__(self, subject: Subject, over: str, vertices: Mapping[str, Array], waived: Sequence[str] = ()) -> None:
        """Take a subject whose values all have numbers.

        Args:
            subject: The sheet.
            over: "all" or "nominal": the conditions that count.
            vertices: Values of ranged assumptions, shape (vertices, 1), the stated ones first; empty for none.
            waived: Targets that bind nothing.
        """
        self.subject = subject
        self.over = over
        self.vertices = dict(vertices) if over == "all" else {}
        self.waived = tuple(waived)
        targets = [t for t in subject.sheet.targets.values() if t.name not in waived]
        self.constraints: tuple[Constraint, ...] = (
            *(
                Constraint(t.name, side, t)
                for t in targets
                for side, limit in zip(goals.SIDES, goals.limits(t), strict=True)
                if limit is not None
            ),
            Constraint(SATURATION, "low"),
            Constraint(MAX_VOLTAGE, "low"),
        )

    @property
    def target_count(self) -> int:
        """How many of the constraints belong to targets; they come first."""
        return len(self.constraints) - 2

    def points(self) -> tuple[int, int]:
        """(ends of ranges, conditions) that are solved for one trial."""
        return max((len(v) for v in self.vertices.values()), default=1), len(self.subject.conditions)

    def condition(self, point: int) -> Condition:
        """The condition of a point."""
        return self.subject.conditions.conditions[point % len(self.subject.conditions)]

    def solve(self, moves: Mapping[str, Array]) -> tuple[Subject, NumericSolution]:
        """The subject moved to trial points, and its solution.

        Args:
            moves: Values by name, each of shape (trials,).
        """
        shaped = {name: np.asarray(v)[:, None, None] for name, v in moves.items()}
        moved = self.subject.moved({**self.vertices, **shaped})
        return moved, moved.solution

    def clear(self, moves: Mapping[str, Array], only: Sequence[int] | None = None) -> Cleared:
        """Slack of constraints at trial points.

        Args:
            moves: Values by name, each of shape (trials,).
            only: Indices of the constraints wanted; all where None.
        Returns: Cleared, rows in the order of `only`
        """
        count = len(next(iter(moves.values())))
        moved, solution = self.solve(moves)
        rows, worst = [], []
        with np.errstate(all="ignore"):
            for index in range(len(self.constraints)) if only is None else only:
                values = self._slack(self.constraints[index], moved, solution, count)
                place = np.argmin(values, axis=1)
                rows.append(values[np.arange(count), place])
                worst.append(place)
        return Cleared(np.array(rows), np.array(worst))

    def _slack(self, constraint: Constraint, moved: Subject, solution: NumericSolution, count: int) -> Array:
        """Slack over (trials, points)."""
        shape = (count, *self.points())
        if constraint.target is None:
            room = np.full(shape, np.inf)
            for shortfall in shortfalls(solution):
                if _VALIDITY[shortfall.what] == constraint.name:
                    room = np.minimum(room, VOLTAGE_TOLERANCE - shortfall.short_by)
            values = np.broadcast_to(np.where(np.isnan(room), -goals.FAR, room), shape)
        else:
            low, high = goals.limits(constraint.target)
            limit = low if constraint.side == "low" else high
            assert limit is not None  # a constraint is made for limits that exist only
            measured = goals.measure(moved, constraint.target, solution)
            values = np.broadcast_to(goals.slack(measured, limit, constraint.side), shape)
        nominal_only = self.over == "nominal" or (constraint.target is not None and constraint.target.at == "nominal")
        return (values[:, :1, :1] if nominal_only else values).reshape(count, -1)


def holds(constraints: Sequence[Constraint], slack: Array) -> Mask:
    """Where constraints count as met: within the verdict's tolerance, exactly for a limit of 0. Shape of `slack`."""
    allowed = tolerances(constraints).reshape(-1, *([1] * (slack.ndim - 1)))
    return np.asarray(slack >= -allowed, dtype=np.bool_)


def tolerances(constraints: Sequence[Constraint]) -> Array:
    """How far below zero the slack of each constraint may be. [-]"""
    return np.array([_tolerance(c) for c in constraints])


def _tolerance(constraint: Constraint) -> float:
    if constraint.target is None:
        return 0.0
    low, high = goals.limits(constraint.target)
    return goals.TOLERANCE if (low if constraint.side == "low" else high) else 0.0
