"""Trial points: by how much every target and every limit is cleared when design variables are moved.

A sheet is solved for many trial points, all its conditions and the ends of its ranges in one batch; the worst of
them is what counts.
"""

from __future__ import annotations

from collections.abc import Collection, Mapping, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from worksheet.device.arrays import Array
from worksheet.engine.inputs import at_conditions
from worksheet.engine.solution import NumericSolution
from worksheet.engine.validity import TOLERANCE as VOLTAGE_TOLERANCE
from worksheet.engine.validity import shortfalls
from worksheet.model import metrics
from worksheet.model.sheet import TOLERANCE, Condition, Target
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
    """Solves a subject at trial points and tells the slack of its constraints.

    Attributes:
        binding: Points that were seen to be the worst for some constraint; what a search looks at first.
        surveys: Slack over places that several searches ask for, by what they are.
    """

    def __init__(
        self,
        subject: Subject,
        over: str,
        vertices: Mapping[str, Array],
        waived: Sequence[str] = (),
        conditions: Sequence[int] | None = None,
    ) -> None:
        """Take a subject whose values all have numbers.

        Args:
            subject: The sheet.
            over: "all" or "nominal": the conditions that count.
            vertices: Values of ranged assumptions, shape (vertices, 1), the stated ones first; empty for none.
            waived: Targets that bind nothing.
            conditions: Indices of the conditions that are solved, 0 first; all where None.
        """
        self.subject = subject
        self.over = over
        self.vertices = dict(vertices) if over == "all" else {}
        self.waived = tuple(waived)
        self._only = None if conditions is None else np.asarray(conditions)
        self.binding: set[int] = set()
        self.surveys: dict[Any, Array] = {}
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
        conditions = len(self.subject.conditions) if self._only is None else len(self._only)
        return max((len(v) for v in self.vertices.values()), default=1), conditions

    def condition(self, point: int) -> Condition:
        """The condition of a point."""
        place = point % self.points()[1]
        return self.subject.conditions.conditions[place if self._only is None else int(self._only[place])]

    @property
    def divisible(self) -> bool:
        """Whether conditions can be solved apart: a figure may take values that are stated over all of them."""
        figures = [c.target.formula for c in self.constraints if c.target is not None and c.target.formula is not None]
        return all(metrics.find(name) is not None or _single(self.subject, name) for f in figures for name in f.names)

    def at_points(self, points: Collection[int]) -> Trials:
        """The same at some of the points alone, and at all that share an end of the ranges and a condition with them.

        Args:
            points: As in Cleared.worst; the first point of all is always among them.
        """
        ends, conditions = self.points()
        kept = sorted({0, *(p // conditions for p in points)})
        chosen = sorted({0, *(p % conditions for p in points)})
        if not self.divisible or (len(kept) == ends and len(chosen) == conditions):
            return self
        vertices = {name: values[kept] for name, values in self.vertices.items()}
        return Trials(self.subject, self.over, vertices, self.waived, chosen)

    def with_range(self, name: str, values: Array) -> Array:
        """Values of something that may have a range, its ends moving along; shape (trials,) or (trials, ends)."""
        if name not in self.vertices:
            return values
        ends = self.vertices[name][:, 0]
        return np.asarray(values[:, None] * (ends / ends[0] if ends[0] else 1.0))

    def solve(self, moves: Mapping[str, Array]) -> tuple[Subject, NumericSolution]:
        """The subject moved to trial points, and its solution.

        Args:
            moves: Values by name, each of shape (trials,), or (trials, ends) where they go with the ends of ranges.
        """
        shaped = {name: np.asarray(v).reshape(len(v), -1, 1) for name, v in moves.items()}
        moved = self.subject.moved({**self.vertices, **shaped})
        with np.errstate(all="ignore"):  # what is tried may be out of all bounds
            if self._only is None:
                return moved, moved.solution
            return moved, NumericSolution(at_conditions(moved.inputs, self._only))

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
        wanted = range(len(self.constraints)) if only is None else only
        with np.errstate(all="ignore"):
            limits = _rooms(solution) if any(self.constraints[k].target is None for k in wanted) else {}
            for index in wanted:
                values = self._slack(self.constraints[index], moved, solution, count, limits)
                place = np.argmin(values, axis=1)
                rows.append(values[np.arange(count), place])
                worst.append(place)
        return Cleared(np.array(rows), np.array(worst))

    def every(self, moves: Mapping[str, Array], only: Sequence[int]) -> Array:
        """Slack of constraints at trial points, each point by itself; shape (constraints times points, trials).

        Args:
            moves: Values by name, each of shape (trials,).
            only: Indices of the constraints wanted.
        """
        count = len(next(iter(moves.values())))
        moved, solution = self.solve(moves)
        with np.errstate(all="ignore"):
            limits = _rooms(solution) if any(self.constraints[k].target is None for k in only) else {}
            rows = [self._slack(self.constraints[k], moved, solution, count, limits).T for k in only]
        return np.concatenate(rows)

    def _slack(
        self,
        constraint: Constraint,
        moved: Subject,
        solution: NumericSolution,
        count: int,
        limits: Mapping[str, Array],
    ) -> Array:
        """Slack over (trials, points)."""
        shape = (count, *self.points())
        if constraint.target is None:
            room = limits[constraint.name]
            values = np.broadcast_to(np.where(np.isnan(room), -goals.FAR, room), shape)
        else:
            low, high = goals.limits(constraint.target)
            limit = low if constraint.side == "low" else high
            assert limit is not None  # a constraint is made for limits that exist only
            measured = goals.measure(moved, constraint.target, solution)
            values = np.broadcast_to(goals.slack(measured, limit, constraint.side), shape)
        nominal_only = self.over == "nominal" or (constraint.target is not None and constraint.target.at == "nominal")
        return (values[:, :1, :1] if nominal_only else values).reshape(count, -1)


def _rooms(solution: NumericSolution) -> dict[str, Array]:
    """By how much all devices are saturated, and all voltages below their ratings. [V], over (trials, points)"""
    rooms: dict[str, Array] = {SATURATION: np.asarray(np.inf), MAX_VOLTAGE: np.asarray(np.inf)}
    for shortfall in shortfalls(solution):
        name = _VALIDITY[shortfall.what]
        rooms[name] = np.minimum(rooms[name], VOLTAGE_TOLERANCE - shortfall.short_by)
    return rooms


def _single(subject: Subject, name: str) -> bool:
    """Whether a name of a figure stands for one number in all conditions."""
    return "." not in name and np.size(subject.value(name)) == 1


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
    return TOLERANCE if (low if constraint.side == "low" else high) else 0.0
