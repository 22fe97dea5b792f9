"""The conditions of a sheet: every combination that its project states, the nominal one first."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from functools import cached_property
from itertools import product
from typing import Any

import numpy as np

from worksheet.device.arrays import Array
from worksheet.model.process_keys import CORNER_CHANGES, DEVICE_PARAMETERS
from worksheet.model.sheet import Condition, Process, ProjectFile, Sheet

_AXES = ("process", "temperature", "supply")
_NUMBERS = {key.name for key in DEVICE_PARAMETERS if key.dimension is not None}


@dataclass(frozen=True, eq=False)
class ConditionSet:
    """Conditions as arrays, the nominal one at index 0; the last axis of every result runs over them.

    `lines` gives the line of any dotted key of the project's file, which states them.
    """

    process: Process
    conditions: tuple[Condition, ...]
    lines: Mapping[str, int] = field(default_factory=dict)

    def __len__(self) -> int:
        return len(self.conditions)

    @property
    def nominal(self) -> Condition:
        """The condition at which nominal values are stated."""
        return self.conditions[0]

    @cached_property
    def temperature(self) -> Array:
        """[K], shape (conditions,)"""
        return np.array([c.temperature for c in self.conditions])

    @cached_property
    def supply(self) -> Array:
        """[V], shape (conditions,)"""
        return np.array([c.supply for c in self.conditions])

    @cached_property
    def index(self) -> dict[Condition, int]:
        """The place of each condition; of one that is stated twice, the first."""
        return {c: k for k, c in reversed(list(enumerate(self.conditions)))}

    @cached_property
    def places(self) -> list[int]:
        """The places of the conditions in an order that is not that of the lists, the nominal one first."""
        every = self.conditions
        return [0, *sorted(range(1, len(every)), key=lambda k: every[k])]

    @cached_property
    def single_changes(self) -> tuple[list[int], list[str]]:
        """The places of conditions that differ from the nominal one in one thing alone, and in which."""
        nominal, places, axes = self.nominal, [], []
        for place, other in enumerate(self.conditions):
            differs = [name for name in _AXES if getattr(other, name) != getattr(nominal, name)]
            if len(differs) == 1:
                places.append(place)
                axes += differs
        return places, axes

    @cached_property
    def ordered(self) -> list[Condition]:
        """The conditions in the order of `places`."""
        return [self.conditions[k] for k in self.places]

    @cached_property
    def kept(self) -> dict[Any, Any]:
        """For what others work out of these conditions and their process alone, to be had again."""
        return {}

    @cached_property
    def _changes(self) -> dict[str, dict[str, Array]]:
        return {}

    def changes(self, device: str) -> Mapping[str, Array]:
        """What the corners do to a device: changes of CORNER_CHANGES that any corner makes, each (conditions,)."""
        if device not in self._changes:
            corners = [self.process.corners.get(c.process, {}).get(device, {}) for c in self.conditions]
            self._changes[device] = {
                key.name: np.array([corner.get(key.name, key.default) for corner in corners], dtype=np.float64)
                for key in CORNER_CHANGES
                if any(key.name in corner for corner in corners)
            }
        return self._changes[device]

    @cached_property
    def _numbers(self) -> dict[str, dict[str, float]]:
        return {}

    def numbers(self, device: str) -> Mapping[str, float]:
        """The process values of a device by name, at the reference temperature. [unit of the key]"""
        if device not in self._numbers:
            values = self.process.devices[device].values
            self._numbers[device] = {name: value.number or 0.0 for name, value in values.items() if name in _NUMBERS}
        return self._numbers[device]

    def only_nominal(self) -> ConditionSet:
        """The nominal condition alone."""
        return ConditionSet(self.process, self.conditions[:1], self.lines)


def of_sheet(sheet: Sheet, project: ProjectFile, process: Process) -> ConditionSet:
    """The conditions of a sheet: the project's, with the sheet's own supply or temperature in their place."""
    temperature, supply = sheet.assume.get("temperature"), sheet.assume.get("supply")
    temperatures = temperature.numbers if temperature is not None else project.temperatures
    supplies = supply.numbers if supply is not None else project.supplies
    nominal = Condition(
        project.nominal.process,
        project.nominal.temperature if temperature is None else _nominal(project.nominal.temperature, temperatures),
        project.nominal.supply if supply is None else _nominal(project.nominal.supply, supplies),
    )
    return _product(project.processes, temperatures, supplies, nominal, process, project.lines)


def of_project(project: ProjectFile, process: Process) -> ConditionSet:
    """The conditions of a project, which are those of every sheet that states none of its own."""
    places = (project.processes, project.temperatures, project.supplies)
    return _product(*places, project.nominal, process, project.lines)


def _product(
    processes: Sequence[str],
    temperatures: Sequence[float],
    supplies: Sequence[float],
    nominal: Condition,
    process: Process,
    lines: Mapping[str, int],
) -> ConditionSet:
    every = (Condition(*parts) for parts in product(processes, temperatures, supplies))
    return ConditionSet(process, (nominal, *(c for c in dict.fromkeys(every) if c != nominal)), lines)


def _nominal(stated: float, values: tuple[float, ...]) -> float:
    """The project's nominal where it is among a sheet's own values, else the middle one of those."""
    return stated if stated in values else sorted(values)[(len(values) - 1) // 2]


def linked(wanted: ConditionSet, owner: ConditionSet, own_supply: bool) -> ConditionSet:
    """The conditions in which a sheet that is linked to is evaluated for another sheet's conditions.

    Args:
        wanted: Conditions of the sheet that asks.
        owner: Conditions of the sheet that is asked.
        own_supply: Whether either of the two is on its own regulator: then the asked sheet's nominal supply is taken.
    Returns: the asked sheet's nominal condition, then one for each wanted one
    """
    supply = owner.nominal.supply
    mapped = tuple(Condition(c.process, c.temperature, supply if own_supply else c.supply) for c in wanted.conditions)
    return ConditionSet(owner.process, (owner.nominal, *mapped), owner.lines)
