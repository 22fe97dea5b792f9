"""One sheet over conditions, its values resolved to numbers: the way from what a file states to the engine's inputs.

Any value may be moved: the solver, fragility, ranges of assumptions, samples and variants all ask the same case
for inputs with some values replaced by arrays, and formulas follow.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass, field, replace
from functools import cached_property
from typing import Any, Protocol

import numpy as np

from worksheet.device.arrays import Array, Number
from worksheet.engine.inputs import Inputs
from worksheet.engine.solution import NumericSolution
from worksheet.model import formula as formulas
from worksheet.model import metrics
from worksheet.model.formula import Formula, FormulaError
from worksheet.model.keys import Key
from worksheet.model.problem import Problem
from worksheet.model.sheet import DeviceModel, Sheet, Target, Value
from worksheet.model.sheet_keys import ASSUMPTIONS, BIAS_KEYS, GEOMETRY
from worksheet.project.conditions import ConditionSet
from worksheet.project.numbers import OPTIONAL, PLAIN, current_of, inputs_of
from worksheet.stages import catalogue
from worksheet.stages.circuit import Circuit, circuit_of
from worksheet.stages.stage import BIAS, Stage, Transistor


class Metrics(Protocol):
    """Metrics by key, over the points of a case."""

    def __getitem__(self, key: str) -> Array:
        """A metric's values, NaN where there is none. [unit of the metric]"""
        ...


Moves = Mapping[str, Number]
"""Values that replace a sheet's own: a sheet name ("width", an own name), "bias.KEY" or "process.DEVICE.PARAMETER"."""

External = Callable[[str, str], Array]
"""Gives SHEET.NAME of another sheet at a case's conditions."""

_DEFAULTS: dict[str, Key] = {key.name: key for key in ASSUMPTIONS}
_BIAS = {f"bias.{key.name}": key for key in BIAS_KEYS if key.dimension is not None}

FUNCTIONS: Mapping[str, Callable[..., Any]] = {
    "sqrt": np.sqrt,
    "log": np.log,
    "exp": np.exp,
    "abs": np.abs,
    "min": lambda *parts: _reduced(np.minimum, parts),
    "max": lambda *parts: _reduced(np.maximum, parts),
}
"""The functions of a formula, over arrays."""


def _reduced(law: Callable[[Any, Any], Any], parts: tuple[Any, ...]) -> Any:
    total = parts[0]
    for part in parts[1:]:
        total = law(total, part)
    return total


def _outside(key: Key, values: Array) -> Any:
    """Where values leave the range of their key."""
    flat = [key.outside(x) is not None for x in np.ravel(values).tolist()]
    return np.array(flat, dtype=bool).reshape(np.shape(values))


class CaseError(Exception):
    """A value of a sheet that does not resolve to a number in its range; carries the problem."""

    def __init__(self, problem: Problem) -> None:
        """Keep the problem."""
        super().__init__(str(problem))
        self.problem = problem


@dataclass(frozen=True, eq=False)
class Case:
    """One sheet over a set of conditions.

    Attributes:
        sheet: What its file states.
        conditions: The conditions, the nominal one first.
        external: Values of other sheets at these conditions.
        filled: Numbers for what the sheet leaves open (the solver's proposals), by key. [unit of the key]
        moves: Values that replace the sheet's own.
        shifts, factors: Mismatch of single transistors by name: added to the threshold [V], times the specific current.
        strict: Whether a formula that leaves its range while values are moved is an error: what is stated must hold
            itself, what is only tried (by the solver, by fragility) may fail.
    """

    sheet: Sheet
    conditions: ConditionSet
    external: External
    filled: Mapping[str, float] = field(default_factory=dict)
    moves: Moves = field(default_factory=dict)
    shifts: Mapping[str, Number] = field(default_factory=dict)
    factors: Mapping[str, Number] = field(default_factory=dict)
    strict: bool = False

    def moved(self, moves: Moves) -> Case:
        """The same case with further values replaced."""
        return replace(self, moves={**self.moves, **moves})

    def mismatched(self, shifts: Mapping[str, Number], factors: Mapping[str, Number]) -> Case:
        """The same case with single transistors off their intended values."""
        return replace(self, shifts=dict(shifts), factors=dict(factors))

    def held(self, moves: Moves) -> Case:
        """The same case at further values that the sheet states (ends of ranges), where every formula must hold too."""
        return replace(self, moves={**self.moves, **moves}, strict=True)

    def with_filled(self, filled: Mapping[str, float]) -> Case:
        """The same case with further open values filled in."""
        return replace(self, filled={**self.filled, **filled})

    @property
    def stage(self) -> Stage:
        """The sheet's stage."""
        stage = catalogue.find(self.sheet.stage)
        assert stage is not None  # the reader refuses unknown stages
        return stage

    @cached_property
    def circuit(self) -> Circuit:
        """The stage with this sheet's options."""
        main, resistance = self.model(self.stage.transistors[0]), self.value("drive_resistance")
        driven = bool(np.any(np.asarray(resistance) > 0))
        return circuit_of(self.stage, main.polarity, self.sheet.bulk, self.sheet.bias.ideal, driven)

    def model(self, device: Transistor) -> DeviceModel:
        """The process file's device behind one of the circuit's transistors."""
        name = self.sheet.bias.device if device.name == BIAS else self.sheet.device
        return self.conditions.process.devices[name]

    @cached_property
    def open_keys(self) -> tuple[str, ...]:
        """Design variables that the sheet leaves to the solver, filled or not."""
        names = [k.name for k in self.stage.design_keys(self.sheet.bias.ideal) if k.dimension is not None]
        return tuple(
            n
            for n in names
            if n not in self.sheet.assume and (n not in self.sheet.choose or self.sheet.choose[n].propose)
        )

    @cached_property
    def _known(self) -> dict[str, Number]:
        return {}

    def resolve(self) -> None:
        """Find every value that the engine takes. CaseError where one cannot be had."""
        for name in self._taken:
            self.value(name)
        for name in OPTIONAL:
            self.given(name)

    @property
    def _taken(self) -> tuple[str, ...]:
        sizes = [device.key(name) for device in self.circuit.devices for name in GEOMETRY]
        return (*PLAIN, "bias_temperature_exponent", "bias_current", "load_capacitance", *sizes, *_BIAS)

    def stated(self, name: str) -> Value | None:
        """What the sheet states under a name: assumption, choice or own name."""
        sheet = self.sheet
        return sheet.assume.get(name) or sheet.choose.get(name) or sheet.own.get(name)

    def value(self, name: str) -> Number:
        """A value of this sheet by name, "bias.KEY" of its ideal source. [unit of the key], scalar or over conditions

        Raises: CaseError where a formula fails or leaves its range; KeyError where there is no such name or it is open.
        """
        if name in self.moves:
            return self.moves[name]
        if name not in self._known:
            self._known[name] = self._resolve(name)
        return self._known[name]

    def _resolve(self, name: str) -> Number:
        if name == "supply":
            return self.conditions.supply
        if name == "temperature":
            return self.conditions.temperature
        if name in _BIAS:
            return self._of_bias(_BIAS[name])
        stated = self.stated(name)
        if stated is not None and stated.formula is not None:
            return self._checked(self._where(name), stated, stated.formula, self._key(name))
        if stated is not None and stated.number is not None:
            return stated.number
        if name in self.filled:
            return self.filled[name]
        default = _DEFAULTS[name].default
        if default is None:
            raise KeyError(name)
        return float(default)

    def _of_bias(self, key: Key) -> Number:
        stated = self.sheet.bias.values.get(key.name)
        if stated is None:
            return float(key.default or 0.0)
        if stated.formula is not None:
            return self._checked(f"bias.{key.name}", stated, stated.formula, key)
        return stated.number or 0.0

    def _checked(self, where: str, stated: Value, formula: Formula, key: Key | None) -> Number:
        """What a value's formula gives, held to the range of its key. `where` is its dotted key."""
        result = self.evaluate(formula, where)
        wrong = ~np.isfinite(result)
        if key is not None:
            wrong = wrong | _outside(key, result)
        if np.any(wrong) and (self.strict or not self.moves):
            shape = np.broadcast_shapes(np.shape(wrong), (len(self.conditions),))
            place = int(np.argmax(np.broadcast_to(wrong, shape)))
            at = self.conditions.conditions[place % len(self.conditions)]
            found = float(np.broadcast_to(result, shape).reshape(-1)[place])
            wanted = key.range_text() if key is not None else "a number"
            what = f"gives {found:g}" if np.isfinite(found) else "gives no number"
            ends = " at an end of a range that it uses" if self.moves else ""
            where_at = f"{at.process}, {at.temperature:g} K, {at.supply:g} V{ends}"
            message = f"the formula {formula.text!r} {what} at {where_at}; expected {wanted}"
            raise CaseError(self._problem_at(where, stated, message))
        return np.asarray(result)

    def _where(self, name: str) -> str:
        """The dotted key of one of this sheet's values."""
        sheet = self.sheet
        tables = (("assume", sheet.assume), ("choose", sheet.choose), ("own", sheet.own))
        table = next((t for t, values in tables if name in values), "")
        return f"{table}.{name}" if table else name

    def problem(self, name: str, stated: Value | None, message: str) -> Problem:
        """A problem with one of this sheet's values."""
        return self._problem_at(self._where(name), stated, message)

    def _problem_at(self, where: str, stated: Value | None, message: str) -> Problem:
        line = self.sheet.lines.get(where, stated.line if stated is not None else None)
        return Problem(self.sheet.file, line, where, message)

    def fail(self, key: str, message: str) -> CaseError:
        """The error that one of this sheet's values cannot be had, to be raised by whoever finds out."""
        return CaseError(self.problem(key, self.stated(key), message))

    def _key(self, name: str) -> Key | None:
        known = {key.name: key for key in self.stage.design_keys(self.sheet.bias.ideal)} | _DEFAULTS
        return known.get(name)

    def evaluate(self, formula: Formula, where: str, extra: Callable[[str], Number | None] | None = None) -> Array:
        """A formula over this case. [SI], over conditions

        Args:
            formula: What to evaluate.
            where: The dotted key that it stands at, for messages.
            extra: Further names (a target's metrics); None for a name that it does not know.
        Raises: CaseError where the formula cannot be evaluated.
        """

        def lookup(name: str) -> Number:
            if "." in name:
                return self.moves[name] if name in self.moves else self.external(*name.split(".", 1))
            found = extra(name) if extra is not None else None
            return self.value(name) if found is None else found

        with np.errstate(all="ignore"):
            try:
                return np.asarray(formulas.evaluate(formula, lookup, FUNCTIONS, number=np.float64), dtype=np.float64)
            except FormulaError as error:
                message = f"the formula {formula.text!r} gives no number: {error}"
                raise CaseError(self._problem_at(where, None, message)) from error

    @property
    def upside_down(self) -> bool:
        """Whether the stage is of p-channel devices."""
        return self.circuit.polarity == "p"

    @property
    def nominal_temperature(self) -> float:
        """At which the bias current is stated. [K]"""
        return self.conditions.nominal.temperature

    @property
    def reference_temperature(self) -> float:
        """At which the process values hold. [K]"""
        return self.conditions.process.reference_temperature

    def process(self, device: Transistor) -> tuple[Mapping[str, Number], Mapping[str, Array]]:
        """A transistor's process values by name, and what the corners change of them. [unit of the key]"""
        model = self.model(device)
        stated, prefix = self.conditions.numbers(model.name), f"process.{model.name}."
        moved = {key.removeprefix(prefix): value for key, value in self.moves.items() if key.startswith(prefix)}
        return {**stated, **moved} if moved else stated, self.conditions.changes(model.name)

    def given(self, name: str) -> Number | None:
        """A value that a sheet may leave out altogether; None where it does. [unit of the key]"""
        return self.value(name) if name in self.moves or self.stated(name) is not None else None

    @cached_property
    def current(self) -> Number:
        """Bias current over conditions, with its temperature law. [A]"""
        return current_of(self)

    @cached_property
    def inputs(self) -> Inputs:
        """The engine's inputs. KeyError where something is left open and not filled."""
        return inputs_of(self)

    @cached_property
    def solution(self) -> NumericSolution:
        """The solved stage."""
        return NumericSolution(self.inputs)

    def figure(self, target: Target, solution: Metrics | None = None) -> Array:
        """Values of a target that has a formula, over conditions; NaN where a metric is missing. [its own unit]"""
        assert target.formula is not None
        solved = solution or self.solution
        where = f"target.{target.name}"
        return self.evaluate(
            target.formula, where, lambda name: solved[name] if metrics.find(name) is not None else None
        )
