"""Sheets of one circuit, of either polarity, solved in one evaluation: their values stacked along a first axis.

An evaluation costs much the same for one sheet as for fifty, so sheets that differ in numbers only share it. Every
operation of the engine is elementwise; what a sheet gets from a batch is to the bit what it would get alone.
"""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Mapping, Sequence
from functools import cached_property
from typing import Any

import numpy as np
from numpy.typing import NDArray

from worksheet.device.arrays import Array, Number
from worksheet.engine.measured import Measured
from worksheet.engine.solution import NumericSolution
from worksheet.model.process_keys import CORNER_CHANGES
from worksheet.project.case import Case
from worksheet.project.conditions import ConditionSet
from worksheet.project.numbers import OPTIONAL, inputs_of
from worksheet.stages.circuit import Circuit
from worksheet.stages.stage import Transistor

_UNCHANGED: dict[str, Any] = {key.name: key.default for key in CORNER_CHANGES}

MOST_POINTS = 16_384
"""Points that are solved at once: as many as keep the arrays in the processor's cache."""


class Batch:
    """Cases of one circuit over equally many conditions, as one.

    Each case takes as many rows as its moves have (the ends of its ranges, trials), one where nothing is moved; columns
    run over conditions. A batch has values by name, as a case has.
    """

    def __init__(self, cases: Sequence[Case]) -> None:
        """Take the cases.

        Args:
            cases: Of equal circuit but for its polarity, of equal conditions, with moves of shape (rows, 1) or
                (rows, conditions), or plain numbers.
        """
        self.cases = tuple(cases)
        self.circuit: Circuit = cases[0].circuit.drawn
        self.conditions: ConditionSet = cases[0].conditions
        self.rows = [rows_of(case) for case in cases]
        self.starts = np.concatenate([[0], np.cumsum(self.rows)]).tolist()
        self.shifts: Mapping[str, Number] = {}
        self.factors: Mapping[str, Number] = {}
        self._stacked: dict[str, Number] = {}
        self._measured: dict[str, Measured] = {}

    @property
    def shape(self) -> tuple[int, int]:
        """(rows, conditions) of all cases."""
        return int(self.starts[-1]), len(self.conditions)

    @cached_property
    def upside_down(self) -> NDArray[np.bool_]:
        """Rows of cases of p-channel devices."""
        return np.repeat([case.circuit.polarity == "p" for case in self.cases], self.rows)[:, None]

    @property
    def nominal_temperature(self) -> float:
        """At which the bias current is stated. [K]"""
        return self.conditions.nominal.temperature

    @property
    def reference_temperature(self) -> float:
        """At which the process values hold. [K]"""
        return self.conditions.process.reference_temperature

    @cached_property
    def solution(self) -> NumericSolution:
        """All cases solved."""
        return NumericSolution(inputs_of(self))

    def place(self, case: int) -> slice:
        """The rows of a case."""
        return slice(self.starts[case], self.starts[case + 1])

    def table(self, values: Number) -> Array:
        """Values over (rows, conditions), from any shape that broadcasts to it."""
        return np.broadcast_to(np.asarray(values), self.shape)

    def measure(self, key: str) -> Measured:
        """A metric over (rows, conditions). KeyError for an unknown one."""
        if key not in self._measured:
            measured = self.solution.measure(key)
            reasons = None if measured.reasons is None else np.broadcast_to(measured.reasons, self.shape)
            self._measured[key] = Measured(self.table(measured.values), reasons)
        return self._measured[key]

    def value(self, name: str) -> Number:
        """A value by name over (rows, conditions or 1); of conditions that nothing moves, over (conditions,)."""
        if name not in self._stacked:
            self._stacked[name] = self._value(name)
        return self._stacked[name]

    def _value(self, name: str) -> Number:
        if name in ("supply", "temperature") and not any(name in case.moves for case in self.cases):
            return self.cases[0].value(name)
        return self._stack([case.value(name) for case in self.cases])

    def given(self, name: str) -> Number | None:
        """A value that may be left out: NaN (of a step 0) for the cases that do, None where all do."""
        values = [case.given(name) for case in self.cases]
        if all(value is None for value in values):
            return None
        none = 0.0 if name == OPTIONAL[0] else np.nan
        return self._stack([none if value is None else value for value in values])

    def process(self, device: Transistor) -> tuple[Mapping[str, Number], Mapping[str, Array]]:
        """A transistor's process values and what the corners change of them, of each row's own type."""
        kinds: dict[tuple[int, int], int] = {}  # most cases share what their type of device has
        kind_of, found = [], list[tuple[Mapping[str, Number], Mapping[str, Array]]]()
        for numbers, changes in (case.process(device) for case in self.cases):
            kind = kinds.setdefault((id(numbers), id(changes)), len(found))
            if kind == len(found):
                found.append((numbers, changes))
            kind_of.append(kind)
        if len(found) == 1:
            return found[0]
        if any(isinstance(value, np.ndarray) for numbers, _ in found for value in numbers.values()):
            stacked: dict[str, Number] = {n: self._stack([found[k][0][n] for k in kind_of]) for n in found[0][0]}
        else:
            rows = np.repeat(kind_of, self.rows)
            stacked = {n: np.array([numbers[n] for numbers, _ in found])[rows][:, None] for n in found[0][0]}
        names = dict.fromkeys(name for _, changes in found for name in changes)
        none = np.ones(len(self.conditions))
        changed = {n: np.array([changes.get(n, _UNCHANGED[n] * none) for _, changes in found]) for n in names}
        return stacked, {name: table[np.repeat(kind_of, self.rows)] for name, table in changed.items()}

    def _stack(self, values: Sequence[Number]) -> Array:
        if all(isinstance(value, (float, int)) for value in values):
            return np.repeat(np.array(values, dtype=np.float64), self.rows)[:, None]
        parts = [np.atleast_2d(np.asarray(value, dtype=np.float64)) for value in values]
        width = max(part.shape[1] for part in parts)
        return np.concatenate(
            [np.broadcast_to(part, (rows, width)) for part, rows in zip(parts, self.rows, strict=True)]
        )


class Share:
    """One case's part of a solved batch: metrics by key over (rows, conditions) of that case."""

    def __init__(self, batch: Batch, case: int) -> None:
        """Take the batch and the number of the case in it."""
        self._batch, self._place = batch, batch.place(case)

    def measure(self, key: str) -> Measured:
        """One metric with the reasons where it does not exist. KeyError for an unknown metric."""
        return part_of(self._batch.measure(key), self._place)

    def __getitem__(self, key: str) -> Array:
        return self.measure(key).values


def part_of(measured: Measured, place: slice) -> Measured:
    """Some rows of a number that was measured over (rows, conditions)."""
    values = measured.values[place]
    if measured.reasons is None:
        return Measured(values)
    reasons = measured.reasons[place]
    return Measured(values, reasons if reasons.any() else None)


def batches(cases: Iterable[Case]) -> Iterator[Batch]:
    """Cases sorted into batches, each of a size that is solved fast; the order within a batch is that of the cases."""
    groups: dict[tuple[Circuit, int], list[Case]] = {}
    for case in cases:
        groups.setdefault((case.circuit.drawn, id(case.conditions)), []).append(case)
    for group in groups.values():
        part: list[Case] = []
        points = 0
        for case in group:
            more = rows_of(case) * len(case.conditions)
            if part and points + more > MOST_POINTS:
                yield Batch(part)
                points, part = 0, []
            points += more
            part.append(case)
        yield Batch(part)


def rows_of(case: Case) -> int:
    """How many rows a case's moves take, 1 where nothing is moved along a first axis."""
    return max(
        (len(value) for value in case.moves.values() if isinstance(value, np.ndarray) and value.ndim > 1), default=1
    )
