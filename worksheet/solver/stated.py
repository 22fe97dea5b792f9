"""What a sheet states, leaf by leaf, at one condition: the number, and where it came from.

It also tells which leaves do nothing there, so that the algebra is written without them.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass
from typing import Any, Protocol

import numpy as np

from worksheet.device.arrays import Array, Number
from worksheet.device.constants import BOLTZMANN, ELEMENTARY_CHARGE
from worksheet.engine.inputs import Inputs
from worksheet.engine.solution import NumericSolution
from worksheet.engine.symbolic.algebra import Setting, neutral
from worksheet.model import metrics
from worksheet.model.process_keys import CORNER_CHANGES
from worksheet.model.sheet import Condition, DeviceModel, Process, Sheet, Target, Value
from worksheet.stages.circuit import Circuit
from worksheet.stages.stage import Stage, Transistor

LEVELS = ("input_level", "output_level", "step_size")
"""Assumptions without which the algebra has another shape, whatever their number."""

_SWITCHED = (
    "bias_temperature_exponent",
    "bias_overhead",
    "saturation_margin",
    "well_capacitance",
    "bias.output_conductance",
    "bias.capacitance",
)
_LAWS = (
    "length_modulation",
    "surface_potential",
    "velocity_length",
    "flicker",
    "flicker_exponent",
    "drain_coupling",
)
_CHANGE_DEFAULTS = {key.name: float(key.default or 0.0) for key in CORNER_CHANGES}
_CONSTANTS = {
    "constant.boltzmann": BOLTZMANN,
    "constant.elementary_charge": ELEMENTARY_CHARGE,
    "deviations": metrics.deviations(metrics.DEFAULT_YIELD),
}
_PROJECT_FILE = "biasbook.toml"
_SOURCES = {"deviations": f"normal law, yield {metrics.DEFAULT_YIELD}"}


class Conditions(Protocol):
    """Conditions in order, the nominal one first, and what corners do."""

    @property
    def conditions(self) -> tuple[Condition, ...]:
        """The conditions, in order."""
        ...

    @property
    def nominal(self) -> Condition:
        """The nominal one."""
        ...

    @property
    def process(self) -> Process:
        """The process file."""
        ...

    @property
    def lines(self) -> Mapping[str, int]:
        """The line of each dotted key of the project's file."""
        ...

    def changes(self, device: str) -> Mapping[str, Array]:
        """What the corners do to a device, over the conditions."""
        ...


class Case(Protocol):
    """One sheet over its conditions, with a number for everything it leaves open."""

    @property
    def sheet(self) -> Sheet:
        """What the file states."""
        ...

    @property
    def conditions(self) -> Conditions:
        """The conditions."""
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
    def filled(self) -> Mapping[str, float]:
        """Numbers found for open design variables."""
        ...

    @property
    def moves(self) -> Mapping[str, Number]:
        """Values that replace the sheet's own."""
        ...

    @property
    def external(self) -> Callable[[str, str], Array]:
        """Gives SHEET.NAME of another sheet at these conditions. [SI]"""
        ...

    @property
    def inputs(self) -> Inputs:
        """The engine's inputs."""
        ...

    @property
    def solution(self) -> NumericSolution:
        """The solved stage."""
        ...

    def moved(self, moves: Mapping[str, Number]) -> Any:
        """The same with values replaced."""
        ...

    def value(self, name: str) -> Number:
        """A value by name. [unit of the key]"""
        ...

    def stated(self, name: str) -> Value | None:
        """What the sheet states under a name."""
        ...

    def figure(self, target: Target) -> Array:
        """Values of a target that has a formula, over the conditions. [its own unit]"""
        ...

    def model(self, device: Transistor) -> DeviceModel:
        """The process file's device behind a transistor."""
        ...


def at(value: Any, index: int) -> float:
    """The number of a value over conditions at one of them; a value stated once is the same in all."""
    array = np.asarray(value, dtype=np.float64).reshape(-1)
    return float(array[0] if array.size == 1 else array[index])


@dataclass(frozen=True, slots=True)
class Origin:
    """Where a number came from.

    Attributes:
        kind: "sheet", "process", "corner", "conditions", "constant", "proposed", "default" or "moved".
        file, line, key: The file, its line and the dotted key; "" and None where there is none.
        source, trust: What was said about it; "" where nothing.
        formula: The sheet's own formula that gave it; "" where it was stated as a number.
    """

    kind: str
    file: str = ""
    line: int | None = None
    key: str = ""
    source: str = ""
    trust: str = ""
    formula: str = ""


class Stated:
    """The leaves of one case at one condition."""

    def __init__(self, case: Case, index: int) -> None:
        """Take the case and the index of the condition, 0 being the nominal one."""
        self.case = case
        self.index = index
        self._devices = {d.name: d for d in case.circuit.devices}

    def number(self, key: str) -> float:
        """A leaf's number. KeyError where there is no such leaf. [unit of the leaf]"""
        if key in _CONSTANTS:
            return _CONSTANTS[key]
        if key == "nominal_temperature":
            return self.case.conditions.nominal.temperature
        if key == "reference_temperature":
            return self.case.conditions.process.reference_temperature
        owner, _, rest = key.partition(".")
        if rest and owner in self._devices and rest.partition(".")[0] in ("process", "corner"):
            return self._of_device(self._devices[owner], rest)
        if key == "bias.output_conductance":
            return at(self.case.inputs.ideal_conductance, self.index)
        if key == "bias.capacitance":
            return at(self.case.inputs.ideal_capacitance, self.index)
        return at(self.case.value(key), self.index)

    def _of_device(self, device: Transistor, rest: str) -> float:
        kind, _, name = rest.partition(".")
        model = self.case.model(device)
        if kind == "corner":
            return at(self.case.conditions.changes(model.name).get(name, _CHANGE_DEFAULTS[name]), self.index)
        moved = self.case.moves.get(f"process.{model.name}.{name}")
        return at(model.number(name) if moved is None else moved, self.index)

    def setting(self, keep_stated: bool = True) -> Setting:
        """What the algebra of this condition is written for.

        Args:
            keep_stated: Whether what the sheet states itself stays in the algebra even where it does nothing.
        """
        leaves = [*_SWITCHED]
        for d in self.case.circuit.devices:
            leaves += [f"{d.name}.process.{law}" for law in _LAWS]
            leaves += [f"{d.name}.corner.{change}" for change in _CHANGE_DEFAULTS]
            leaves += [] if keep_stated else [f"{d.name}.process.drain_coupling_exponent"]
        absent = {key for key in leaves if self._idle(key, keep_stated)}
        absent |= {key for key in LEVELS if key not in self.case.moves and self.case.stated(key) is None}
        return Setting(self.case.circuit, frozenset(absent), nominal=self.index == 0)

    def _idle(self, key: str, keep_stated: bool) -> bool:
        if keep_stated and self._on_sheet(key) is not None:
            return False
        return self.number(key) == neutral(key)

    def _on_sheet(self, key: str) -> Value | None:
        if key.startswith("bias."):
            return self.case.sheet.bias.values.get(key.removeprefix("bias."))
        return None if "." in key else self.case.stated(key)

    def origin(self, key: str) -> Origin:
        """Where a leaf's number came from."""
        if key in _CONSTANTS:
            return Origin("constant", key=key, source=_SOURCES.get(key, "CODATA 2018, exact"))
        process = self.case.conditions.process
        if key == "reference_temperature":
            return Origin("process", process.file, process.lines.get(key), key)
        if key == "nominal_temperature" or (key in ("supply", "temperature") and self._on_sheet(key) is None):
            name = "nominal" if key == "nominal_temperature" else key
            full = f"conditions.{name}"
            return Origin("conditions", _PROJECT_FILE, self.case.conditions.lines.get(full), full)
        owner, _, rest = key.partition(".")
        if rest and owner in self._devices and rest.partition(".")[0] in ("process", "corner"):
            return self._process_origin(self._devices[owner], rest)
        return self._sheet_origin(key)

    def _process_origin(self, device: Transistor, rest: str) -> Origin:
        kind, _, name = rest.partition(".")
        model, process = self.case.model(device), self.case.conditions.process
        if kind == "corner":
            corner = self.case.conditions.conditions[self.index].process
            full = f"corner.{corner}.{model.name}.{name}"
            return Origin("corner", process.file, process.lines.get(full), full)
        full = f"device.{model.name}.{name}"
        if f"process.{model.name}.{name}" in self.case.moves:
            return Origin("moved", key=full)
        value = model.values[name]
        line = value.line if value.line is not None else process.lines.get(full)
        kind = "process" if full in process.lines or value.text else "default"
        return Origin(kind, process.file, line, full, value.source, value.trust)

    def _sheet_origin(self, key: str) -> Origin:
        if key in self.case.moves:
            return Origin("moved", key=key)
        value = self._on_sheet(key)
        if value is not None and not value.propose:
            sheet = self.case.sheet
            tables = (("assume", sheet.assume), ("choose", sheet.choose), ("own", sheet.own))
            table = next((t for t, values in tables if key in values), "")
            full = f"{table}.{key}" if table else key
            line = sheet.lines.get(full, value.line)
            formula = "" if value.formula is None else value.formula.text
            return Origin("sheet", sheet.file, line, full, value.source, value.trust, formula)
        return Origin("proposed", key=key) if key in self.case.filled else Origin("default", key=key)
