"""Sheets solved in a batch, and the part of one sheet in it: what reviews read off, worked out once for the batch."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from functools import cached_property
from math import isfinite
from typing import Any

import numpy as np

from worksheet.device.arrays import Array, Number
from worksheet.engine.measured import Measured
from worksheet.engine.solution import NumericSolution
from worksheet.engine.validity import Shortfall, shortfalls
from worksheet.model import metrics, operating
from worksheet.model.metrics import Reason
from worksheet.model.sheet import Condition, Target
from worksheet.project.batch import Batch, Share, batches
from worksheet.project.case import Case
from worksheet.review.judge import Mask
from worksheet.solver import goals, ranges

_REASONS = {reason.value: reason.text or None for reason in Reason}


class Solved:
    """A batch of sheets solved over their conditions, times the ends of their assumptions' ranges."""

    def __init__(self, batch: Batch) -> None:
        """Take the batch; nothing is computed yet."""
        self.batch = batch
        self._firsts: dict[str, list[float | None]] = {}

    @property
    def solution(self) -> NumericSolution:
        """All sheets solved."""
        return self.batch.solution

    @cached_property
    def shortfalls(self) -> tuple[tuple[Shortfall, Mask], ...]:
        """Everything that can fail to hold, over (rows, conditions), and where it does."""
        found = [Shortfall(s.device, s.what, self.batch.table(s.short_by)) for s in shortfalls(self.solution)]
        return tuple((shortfall, shortfall.broken) for shortfall in found)

    @cached_property
    def valid(self) -> Mask:
        """Where everything holds, over (rows, conditions)."""
        broken = np.zeros(self.batch.shape, dtype=np.bool_)
        for _, where in self.shortfalls:
            broken |= where
        return ~broken

    def firsts(self, name: str, values: Number) -> list[float | None]:
        """The nominal number of every sheet for a value of the solution, kept by name; None where it is not finite."""
        if name not in self._firsts:
            numbers = self._first_column(values)
            if not all(map(isfinite, numbers)):
                numbers = [number if isfinite(number) else None for number in numbers]
            self._firsts[name] = numbers
        return self._firsts[name]

    def _first_column(self, values: Any) -> list[Any]:
        """The number of every sheet where all is stated and nominal."""
        array = np.asarray(values)
        if array.ndim == 2 and len(array) > 1:
            found: list[Any] = array[self.batch.starts[:-1], 0].tolist()
            return found
        return [array.reshape(-1)[0].item()] * len(self.batch.cases)

    @cached_property
    def operating(self) -> dict[str, dict[str, list[float | None]]]:
        """Nominal operating points: by device, by key, one number a sheet."""
        return {
            name: {
                value.key: self.firsts(f"{name}.{value.key}", getattr(device, value.key))
                for value in operating.OPERATING_POINT
            }
            for name, device in self.solution.devices.items()
        }

    @cached_property
    def metrics(self) -> dict[str, tuple[list[float | None], list[str | None]]]:
        """Nominal metrics that the stage has, by key: one number a sheet, and one reason where there is none."""
        found = {}
        for metric in metrics.all_metrics():
            if self.batch.circuit.stage.absent_metric(metric.key) is None:
                measured = self.solution.measure(metric.key)
                found[metric.key] = self.firsts(metric.key, measured.values), self._reasons(measured)
        return found

    def _reasons(self, measured: Measured) -> list[str | None]:
        if measured.reasons is None:
            return [None] * len(self.batch.cases)
        return [_REASONS[number] for number in self._first_column(measured.reasons)]

    def greatest(self, values: Number) -> list[float]:
        """The greatest of a value over the points of every sheet; what is not finite counts as 0."""
        table = self.batch.table(values)
        rows = np.where(np.isfinite(table), table, 0.0).max(axis=1)
        found: list[float] = np.maximum.reduceat(rows, self.batch.starts[:-1]).tolist()
        return found

    @cached_property
    def reverse_shares(self) -> dict[str, list[float]]:
        """By device, the greatest reverse share of every sheet. [-]"""
        return {name: self.greatest(device.reverse_share) for name, device in self.solution.devices.items()}

    @cached_property
    def beyond_pole(self) -> list[float]:
        """The greatest ratio of bandwidth to pole frequency of every sheet. [-]"""
        with np.errstate(all="ignore"):
            return self.greatest(self.solution["bandwidth"] / self.solution["pole_frequency"])

    def points(self, stated: Sequence[Case]) -> Iterator[Points]:
        """The part of each sheet, for the cases without their ranges."""
        for number, case in enumerate(stated):
            yield Points(case, self, number)


@dataclass(frozen=True, eq=False)
class Points:
    """One sheet solved over points: its conditions, times the ends of its assumptions' ranges.

    Arrays that it gives have shape (points,): the stated values at the nominal condition first, conditions running
    fastest. `number` is that of the sheet in its batch.
    """

    case: Case
    solved: Solved
    number: int

    @cached_property
    def place(self) -> slice:
        """Rows of the batch."""
        return self.solved.batch.place(self.number)

    @property
    def moves(self) -> Mapping[str, Number]:
        """Values of ranged assumptions over the rows."""
        return self.solved.batch.cases[self.number].moves

    @cached_property
    def shape(self) -> tuple[int, int]:
        """(ends of ranges, conditions)"""
        return self.place.stop - self.place.start, len(self.case.conditions)

    @property
    def solution(self) -> NumericSolution:
        """The batch's; `spread` takes this sheet's part of an array of it."""
        return self.solved.solution

    @cached_property
    def share(self) -> Share:
        """Metrics of this sheet over (ends of ranges, conditions)."""
        return Share(self.solved.batch, self.number)

    def spread(self, values: Number) -> Array:
        """An array of the solution over this sheet's points."""
        return self.solved.batch.table(values)[self.place].reshape(-1)

    def measured(self, key: str) -> Measured:
        """A metric over this sheet's points."""
        return self._flat(self.share.measure(key))

    def target(self, target: Target) -> Measured:
        """What a target is about, over this sheet's points."""
        return self._flat(goals.measure(self.solved.batch.cases[self.number], target, self.share))

    def _flat(self, measured: Measured) -> Measured:
        values: Array = measured.values
        if values.shape != self.shape:
            values = np.broadcast_to(values, self.shape)
        if measured.reasons is None:
            return Measured(values.reshape(-1))
        return Measured(values.reshape(-1), np.broadcast_to(measured.reasons, self.shape).reshape(-1))

    @cached_property
    def valid(self) -> Mask:
        """Points at which everything holds."""
        return self.solved.valid[self.place].reshape(-1)

    @cached_property
    def all_valid(self) -> bool:
        """Whether everything holds everywhere."""
        return bool(self.valid.all())

    def broken(self) -> Iterator[Shortfall]:
        """What does not hold somewhere, over (ends of ranges, conditions)."""
        if not self.all_valid:
            for shortfall, where in self.solved.shortfalls:
                if where[self.place].any():
                    yield Shortfall(shortfall.device, shortfall.what, shortfall.short_by[self.place])

    def condition(self, point: int) -> Condition:
        """The condition of a point."""
        return self.case.conditions.conditions[point % self.shape[1]]

    def moved(self, point: int) -> dict[str, float]:
        """Assumptions at an end of their range at a point, by name."""
        vertex = point // self.shape[1]
        columns = {name: np.asarray(values) for name, values in self.moves.items()}
        return {name: float(v[vertex, 0]) for name, v in columns.items() if v[vertex, 0] != v[0, 0]}


def with_ranges(case: Case) -> Case:
    """The case at the ends of its ranges too, every value found. CaseError where one does not resolve."""
    moves = ranges.worst_points(case)
    held = case.held(moves) if moves else case
    held.resolve()
    return held


def solved_points(stated: Sequence[Case], held: Sequence[Case]) -> Iterator[Points]:
    """Solve sheets in batches.

    Args:
        stated: Their cases.
        held: The same with_ranges.
    """
    behind = {id(one): case for one, case in zip(held, stated, strict=True)}
    for batch in batches(held):
        yield from Solved(batch).points([behind[id(one)] for one in batch.cases])
