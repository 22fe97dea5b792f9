"""What the solver asks of a sheet: a case over conditions whose values can be moved. The project layer provides it."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any, Protocol

from worksheet.device.arrays import Array, Number
from worksheet.engine.inputs import Inputs
from worksheet.engine.solution import NumericSolution
from worksheet.model.sheet import Condition, DeviceModel, Process, Sheet, Target, Value
from worksheet.model.units import UnitError, parse_unit
from worksheet.stages.circuit import Circuit
from worksheet.stages.stage import Stage, Transistor


class Conditions(Protocol):
    """Conditions in order, the nominal one first."""

    @property
    def conditions(self) -> tuple[Condition, ...]:
        """The conditions, in order."""
        ...

    @property
    def process(self) -> Process:
        """The process file that they belong to."""
        ...

    def __len__(self) -> int:
        """How many there are."""
        ...


class Subject(Protocol):
    """One sheet over its conditions."""

    @property
    def sheet(self) -> Sheet:
        """What the file states."""
        ...

    @property
    def conditions(self) -> Conditions:
        """The conditions, in order."""
        ...

    @property
    def stage(self) -> Stage:
        """The sheet's stage."""
        ...

    @property
    def circuit(self) -> Circuit:
        """The stage with the sheet's options."""
        ...

    @property
    def open_keys(self) -> tuple[str, ...]:
        """Design variables left to the solver."""
        ...

    @property
    def filled(self) -> Mapping[str, float]:
        """Numbers given to open design variables."""
        ...

    @property
    def inputs(self) -> Inputs:
        """The engine's inputs."""
        ...

    @property
    def solution(self) -> NumericSolution:
        """The solved stage."""
        ...

    def moved(self, moves: Mapping[str, Number]) -> Subject:
        """The same with values replaced."""
        ...

    def with_filled(self, filled: Mapping[str, float]) -> Subject:
        """The same with open values given."""
        ...

    def value(self, name: str) -> Number:
        """A value by name, over conditions. [unit of the key]"""
        ...

    def stated(self, name: str) -> Value | None:
        """What the sheet states under a name."""
        ...

    def model(self, device: Transistor) -> DeviceModel:
        """The process file's device behind a transistor."""
        ...

    def figure(self, target: Target, solution: Any = None) -> Array:
        """Values of a target with a formula. [its unit]"""
        ...

    def fail(self, key: str, message: str) -> Exception:
        """The error that a value cannot be had."""
        ...


def scalar(value: Any) -> float:
    """The nominal number of a value that is stated once or over conditions."""
    if isinstance(value, (int, float)):
        return float(value)
    flat: Sequence[float] = value.reshape(-1)
    return float(flat[0])


def own_unit(value: Value) -> str:
    """The SI unit of a name of the user's own, whose number is in it whatever prefix it was written with."""
    try:
        return parse_unit(value.unit).base if value.unit else ""
    except UnitError:
        return value.unit
