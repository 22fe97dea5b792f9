"""Targets where single inputs are moved to single values: many moves, of many sheets of one circuit, at once.

Each move is a row of its own. A row knows the place that it belongs to (a sheet at one condition), the input that is
moved and where to; every other value is the place's, and formulas follow.
"""

from __future__ import annotations

from collections.abc import Callable, Collection, Iterator, Mapping, Sequence
from dataclasses import dataclass
from functools import cached_property
from typing import Any

import numpy as np

from worksheet.device.arrays import Array, Number
from worksheet.engine.inputs import Inputs
from worksheet.engine.levels import Levels
from worksheet.engine.measured import Measured
from worksheet.engine.solution import NumericSolution
from worksheet.model import metrics
from worksheet.model.metrics import Reason
from worksheet.model.process_keys import CORNER_CHANGES
from worksheet.model.sheet import Target
from worksheet.project.batch import MOST_POINTS
from worksheet.project.case import Case
from worksheet.project.numbers import OPTIONAL, inputs_of
from worksheet.review.inputs import Input
from worksheet.solver import goals
from worksheet.solver.trials import Index, Mask
from worksheet.stages.circuit import Circuit
from worksheet.stages.stage import Transistor

_OF_CONDITION = ("temperature", "supply")
_UNCHANGED: dict[str, Any] = {key.name: key.default for key in CORNER_CHANGES}
_COUPLED = 1.0 + 1e-12


@dataclass(frozen=True, eq=False)
class Place:
    """One sheet at one of its conditions.

    Attributes:
        case: The sheet over its conditions.
        index: The condition's place among these.
        pair: The sheet over the nominal condition and this one, for formulas.
        inputs: What may be moved, with the values that hold there.
        targets: What is looked at.
    """

    case: Case
    index: int
    pair: Case
    inputs: tuple[Input, ...]
    targets: tuple[Target, ...]

    @cached_property
    def formulas(self) -> Mapping[str, frozenset[str]]:
        """Values that have a formula, by name, and every name that such a value follows."""
        sheet = self.case.sheet
        direct: dict[str, tuple[str, ...]] = {}
        for prefix, values in (("", sheet.assume), ("", sheet.own), ("", sheet.choose), ("bias.", sheet.bias.values)):
            for name, value in values.items():
                if value.formula is not None:
                    direct[prefix + name] = value.formula.names
        return {name: frozenset(_followed(direct, name)) for name in direct}


def _followed(direct: Mapping[str, tuple[str, ...]], name: str) -> Iterator[str]:
    for used in direct.get(name, ()):
        yield used
        yield from _followed(direct, used)  # values form no loop


@dataclass(frozen=True, eq=False, slots=True)
class Seen:
    """What was found for rows.

    Attributes:
        targets: By name of the target, over rows; rows of places that do not have it hold nothing of meaning.
        room: By how much kappa and drain coupling stay below 1 together; below 0 there are no such devices.
    """

    targets: Mapping[str, Measured]
    room: Array


class Probe:
    """Places of one circuit, and what their targets come to where inputs are moved."""

    def __init__(self, places: Sequence[Place]) -> None:
        """Take the places; all of the same circuit."""
        self.places = tuple(places)
        self.circuit: Circuit = places[0].case.circuit.drawn
        self.upside_down = np.array([place.case.upside_down for place in places])
        self.names: dict[str, int] = {}
        self.name_of = [np.array([self._number(item.move) for item in place.inputs]) for place in places]
        self.targets = tuple(dict.fromkeys(target.name for place in places for target in place.targets))
        self._bases: dict[tuple[str, bool], Array | None] = {}
        self._types: dict[str, _Types] = {}

    def _number(self, name: str) -> int:
        return self.names.setdefault(name, len(self.names))

    def see(self, place: Index, name: Index, values: Array, targets: Collection[str] | None = None) -> Seen:
        """Look at rows.

        Args:
            place: The place of each row; rows of one place stand together where its targets have formulas.
            name: The number of the input that is moved (see `names`), -1 for none.
            values: Where it is moved to. [unit of the input]
            targets: Names of those wanted; all where None.
        """
        wanted = [name for name in self.targets if targets is None or name in targets]
        parts = [slice(k, k + MOST_POINTS) for k in range(0, len(place), MOST_POINTS)]
        seen = [self._see(_Rows(self, place[p], name[p], values[p]), wanted) for p in parts]
        if len(seen) == 1:
            return seen[0]
        joined = {key: _joined([s.targets[key] for s in seen]) for key in wanted}
        return Seen(joined, np.concatenate([s.room for s in seen]))

    def room(self, place: Index, name: Index, values: Array) -> Array:
        """Seen.room of rows alone."""
        rows = _Rows(self, place, name, values)
        return _room(inputs_of(rows), rows.count)

    def _see(self, rows: _Rows, wanted: Sequence[str]) -> Seen:
        solution = NumericSolution(inputs_of(rows), rows.levels_at_nominal)
        targets = {name: self._target(name, rows, solution) for name in wanted}
        return Seen(targets, _room(solution.inputs, rows.count))

    def _target(self, name: str, rows: _Rows, solution: NumericSolution) -> Measured:
        metric = metrics.find(name)
        if metric is None:
            return self._figure(name, rows, solution)
        if not metric.of_yield:
            return rows.column(solution.measure(name))
        base = rows.column(solution.measure(metric.of_yield))
        return Measured(base.values * self._deviations(name)[rows.place], base.reasons)

    def _deviations(self, name: str) -> Array:
        stated = [place.case.sheet.targets.get(name) for place in self.places]
        shares = [None if target is None else target.yield_fraction for target in stated]
        return np.array([metrics.deviations(metrics.DEFAULT_YIELD if s is None else s) for s in shares])

    def _figure(self, name: str, rows: _Rows, solution: NumericSolution) -> Measured:
        values = np.full(rows.count, np.nan)
        reasons = np.full(rows.count, Reason.NOT_A_NUMBER, dtype=np.int8)
        for number in np.flatnonzero(np.bincount(rows.place)).tolist():
            target = self.places[number].case.sheet.targets.get(name)
            if target is not None and target.formula is not None:
                mine = np.flatnonzero(rows.place == number)
                moved = self.places[number].pair.moved(rows.moves(number, mine, target.formula.names))
                part = _Part(rows, mine, solution)
                found = goals.measure(moved, target, part)
                values[mine] = np.broadcast_to(found.values, (len(mine), part.width))[:, -1]
                absent = 0 if found.reasons is None else np.broadcast_to(found.reasons, (len(mine), part.width))[:, -1]
                reasons[mine] = absent
        return Measured(values, reasons if reasons.any() else None)

    @cached_property
    def following(self) -> Mapping[str, list[int]]:
        """Places in which a value has a formula, by its name."""
        found: dict[str, list[int]] = {}
        for number, place in enumerate(self.places):
            for name in place.formulas:
                found.setdefault(name, []).append(number)
        return found

    def types(self, device: Transistor) -> _Types:
        """The process file's devices behind a transistor of the circuit."""
        if device.name not in self._types:
            self._types[device.name] = _types(self.places, device)
        return self._types[device.name]

    def base(self, name: str, nominal: bool, value: Callable[[Case, str], Number | None]) -> Array | None:
        """A value of every place, shape (places,); None where no place has it, NaN (of a step 0) where one has not."""
        key = name, nominal
        if key not in self._bases:
            found = [_picked(value(place.case, name), 0 if nominal else place.index) for place in self.places]
            none = 0.0 if name == OPTIONAL[0] else np.nan
            self._bases[key] = (
                None if all(v is None for v in found) else np.array([none if v is None else v for v in found])
            )
        return self._bases[key]


@dataclass(frozen=True, eq=False, slots=True)
class _Types:
    """Devices of the process file behind one transistor: their names, the one of each place, stated values, changes."""

    names: list[str]
    number: Index
    stated: Mapping[str, Array]
    there: Mapping[str, Array]
    at_nominal: Mapping[str, Array]


def _types(places: Sequence[Place], device: Transistor) -> _Types:
    models = [place.case.model(device).name for place in places]
    names = list(dict.fromkeys(models))
    number = np.array([names.index(model) for model in models])
    stated = [places[models.index(model)].case.conditions.numbers(model) for model in names]
    columns = {key: np.array([values[key] for values in stated]) for key in stated[0]}
    changes = [place.case.conditions.changes(model) for place, model in zip(places, models, strict=True)]
    keys = dict.fromkeys(key for one in changes for key in one)

    def at(indices: Sequence[int]) -> dict[str, Array]:
        return {
            key: np.array([c[key][k] if key in c else _UNCHANGED[key] for c, k in zip(changes, indices, strict=True)])
            for key in keys
        }

    return _Types(names, number, columns, at([p.index for p in places]), at([0] * len(places)))


class _Rows:
    """Rows as values by name, at their own condition or (`nominal`) at the nominal one."""

    shifts: Mapping[str, Number] = {}
    factors: Mapping[str, Number] = {}

    def __init__(self, probe: Probe, place: Index, name: Index, values: Array, nominal: bool = False) -> None:
        self.probe, self.place, self.name, self.values, self._nominal = probe, place, name, values, nominal
        self.circuit = probe.circuit
        self.count = len(place)
        self._first, self._last = (int(place.min()), int(place.max())) if len(place) else (0, -1)
        order = np.argsort(name, kind="stable")
        numbers = name[order]
        starts = np.searchsorted(numbers, np.arange(len(probe.names) + 1))
        self._moved = [order[starts[k] : starts[k + 1]] for k in range(len(probe.names))]

    @property
    def upside_down(self) -> Mask:
        """Rows of places of p-channel devices."""
        down: Mask = self.probe.upside_down[self.place][:, None]
        return down

    @property
    def reference_temperature(self) -> float:
        """At which the process values hold. [K]"""
        return self.probe.places[0].case.reference_temperature

    @property
    def nominal_temperature(self) -> Array:
        """At which the bias current is stated. [K]"""
        return np.array([p.case.nominal_temperature for p in self.probe.places])[self.place][:, None]

    def levels_at_nominal(self) -> Levels:
        """Levels of the same rows at the nominal condition."""
        return Levels(inputs_of(_Rows(self.probe, self.place, self.name, self.values, nominal=True)))

    def moved(self, name: str) -> Index:
        """Rows that move an input."""
        number = self.probe.names.get(name)
        return np.zeros(0, dtype=np.intp) if number is None else self._moved[number]

    def value(self, name: str) -> Number:
        """A value over rows, shape (rows, 1)."""
        found = self._over_rows(name, Case.value)
        assert found is not None
        return found

    def given(self, name: str) -> Number | None:
        """A value that may be left out; see Batch.given."""
        return self._over_rows(name, Case.given)

    def _over_rows(self, name: str, value: Callable[[Case, str], Number | None]) -> Array | None:
        base = self.probe.base(name, self._nominal, value)
        if base is None:
            return None
        rows = self._held(name, self.moved(name))
        column: Array = base[self.place]
        column[rows] = self.values[rows]
        for number in self.probe.following.get(name, ()):
            if self._first <= number <= self._last:
                self._follow(name, number, self.probe.places[number], column)
        return column[:, None]

    def _held(self, name: str, rows: Index) -> Index:
        """Temperature and supply move at a row's own condition; the nominal one keeps its own."""
        if not self._nominal or name not in _OF_CONDITION or not len(rows):
            return rows
        own = np.array([place.index == 0 for place in self.probe.places])
        kept: Index = rows[own[self.place[rows]]]
        return kept

    def _follow(self, name: str, number: int, place: Place, column: Array) -> None:
        """Work out a value with a formula where something that it follows is moved."""
        for used in place.formulas[name]:
            rows = self.moved(used)
            rows = rows[self.place[rows] == number]
            if len(rows):
                found = np.asarray(place.pair.moved(self.moves(number, rows, (used,))).value(name))
                at = 0 if self._nominal else -1
                column[rows] = np.broadcast_to(found, (len(rows), len(place.pair.conditions)))[:, at]

    def moves(self, number: int, rows: Index, names: Sequence[str]) -> dict[str, Array]:
        """Moves of a place's pair for some of its rows, of inputs that move one of the names or what it follows."""
        place = self.probe.places[number]
        wanted = {*names, *(used for name in names for used in place.formulas.get(name, ()))}
        found: dict[str, Array] = {}
        for item, k in zip(place.inputs, self.probe.name_of[number].tolist(), strict=True):
            mine = self.name[rows] == k
            if item.move in wanted and mine.any():
                column = np.full((len(rows), 1), item.value)
                column[mine, 0] = self.values[rows[mine]]
                found[item.move] = self._per_condition(item, column, place.pair)
        return found

    def _per_condition(self, item: Input, column: Array, pair: Case) -> Array:
        if item.name not in _OF_CONDITION or len(pair.conditions) == 1:
            return column
        own = getattr(pair.conditions.nominal, item.name)
        return np.concatenate([np.full_like(column, own), column], axis=1)

    def process(self, device: Transistor) -> tuple[Mapping[str, Number], Mapping[str, Array]]:
        """A transistor's process values over rows, and what the corners change of them."""
        types = self.probe.types(device)
        kind = types.number[self.place]
        numbers: dict[str, Number] = {}
        for name, column in types.stated.items():
            moved = [self.moved(f"process.{model}.{name}") for model in types.names]
            if len(column) == 1 and not len(moved[0]):
                numbers[name] = float(column[0])
                continue
            over = column[kind]
            for number, rows in enumerate(moved):
                mine = rows[kind[rows] == number]  # a device of another type is not moved
                over[mine] = self.values[mine]
            numbers[name] = over[:, None]
        changes = types.at_nominal if self._nominal else types.there
        return numbers, {name: column[self.place][:, None] for name, column in changes.items()}

    def column(self, measured: Measured) -> Measured:
        """A measured number over rows, shape (rows,)."""
        values = np.broadcast_to(measured.values, (self.count, 1))[:, 0]
        if measured.reasons is None:
            return Measured(values)
        return Measured(values, np.broadcast_to(measured.reasons, (self.count, 1))[:, 0])


class _Part:
    """Metrics of some rows, for a figure of one place: shape (rows, 1)."""

    width = 2

    def __init__(self, rows: _Rows, mine: Index, solution: NumericSolution) -> None:
        self._rows, self._mine, self._solution = rows, mine, solution

    def measure(self, key: str) -> Measured:
        """One metric with the reasons where it does not exist."""
        found = self._rows.column(self._solution.measure(key))
        reasons = None if found.reasons is None else found.reasons[self._mine][:, None]
        return Measured(found.values[self._mine][:, None], reasons)

    def __getitem__(self, key: str) -> Array:
        return self.measure(key).values


def _room(inputs: Inputs, count: int) -> Array:
    room = np.full((count, 1), np.inf)
    for p in inputs.devices.values():
        room = np.minimum(room, _COUPLED - (p.kappa + p.drain_coupling))
    return room[:, 0]


def _picked(value: Number | None, index: int) -> float | None:
    if value is None:
        return None
    flat = np.asarray(value).reshape(-1)
    return float(flat[index] if len(flat) > 1 else flat[0])


def _joined(parts: Sequence[Measured]) -> Measured:
    values = np.concatenate([part.values for part in parts])
    if all(part.reasons is None for part in parts):
        return Measured(values)
    reasons = [np.zeros(len(p.values), dtype=np.int8) if p.reasons is None else p.reasons for p in parts]
    return Measured(values, np.concatenate(reasons))
