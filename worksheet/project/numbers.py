"""From values by name to the engine's inputs: of one sheet, or of many of one circuit stacked along a first axis."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import replace
from typing import Any, Protocol

import numpy as np
from numpy.typing import NDArray

from worksheet.device.arrays import Array, Number
from worksheet.device.parameters import Parameters, at_condition
from worksheet.engine.inputs import Inputs
from worksheet.stages.circuit import Circuit
from worksheet.stages.stage import Transistor

OPTIONAL = ("step_size", "input_level", "output_level")
"""What a sheet may leave out altogether."""

PLAIN = (
    "drive_resistance",
    "well_capacitance",
    "bias_overhead",
    "saturation_margin",
    "settling_tolerance",
    "noise_from",
)
"""Assumptions that the engine takes as they stand."""


class Named(Protocol):
    """Whatever has values by name over a set of conditions, the last axis of each running over these."""

    @property
    def circuit(self) -> Circuit:
        """The circuit that the values belong to."""
        ...

    @property
    def upside_down(self) -> NDArray[np.bool_] | bool:
        """Where the stage is of p-channel devices."""
        ...

    @property
    def nominal_temperature(self) -> Number:
        """At which the bias current is stated. [K]"""
        ...

    @property
    def reference_temperature(self) -> float:
        """At which the process values hold. [K]"""
        ...

    @property
    def shifts(self) -> Mapping[str, Number]:
        """Added to the threshold of single transistors, by name. [V]"""
        ...

    @property
    def factors(self) -> Mapping[str, Number]:
        """Times the specific current of single transistors, by name. [-]"""
        ...

    def value(self, name: str) -> Number:
        """A value of the sheet, "bias.KEY" one of its ideal source. [unit of the key]"""
        ...

    def given(self, name: str) -> Number | None:
        """A value that may be left out; None where it is. [unit of the key]"""
        ...

    def process(self, device: Transistor) -> tuple[Mapping[str, Number], Mapping[str, Array]]:
        """A transistor's process values, and what the corners change of them."""
        ...


def inputs_of(named: Named) -> Inputs:
    """The engine's inputs, every number an array: bare floats would take other roads through powers than arrays do."""
    value = named.value
    stated = {name: named.given(name) for name in OPTIONAL}
    given: dict[str, Any] = {name: None if number is None else _array(number) for name, number in stated.items()}
    plain: dict[str, Any] = {name: _array(value(name)) for name in PLAIN}
    return Inputs(
        circuit=named.circuit,
        temperature=_array(value("temperature")),
        supply=_array(value("supply")),
        current=_array(current_of(named)),
        devices={device.name: _parameters(named, device) for device in named.circuit.devices},
        load_capacitance=_array(value("load_capacitance")),
        ideal_conductance=_array(value("bias.output_conductance")),
        ideal_capacitance=_array(value("bias.capacitance")),
        upside_down=named.upside_down,
        **plain,
        **given,
    )


def _array(value: Number) -> Array:
    return np.atleast_1d(np.asarray(value, dtype=np.float64))


def current_of(named: Named) -> Number:
    """Bias current over conditions, with its temperature law. [A]"""
    exponent, current = named.value("bias_temperature_exponent"), named.value("bias_current")
    if not np.any(exponent):
        return current
    warmth = _array(named.value("temperature")) / named.nominal_temperature
    return np.asarray(current * warmth ** _array(exponent))


def _parameters(named: Named, device: Transistor) -> Parameters:
    """One transistor's parameters over the conditions."""
    process, changes = named.process(device)
    intended = at_condition(
        {name: _array(number) for name, number in process.items()},
        changes,
        _array(named.value("temperature")),
        named.reference_temperature,
        _array(named.value(device.key("width"))),
        _array(named.value(device.key("length"))),
    )
    if device.name not in named.shifts:
        return intended
    return replace(
        intended,
        threshold=intended.threshold + named.shifts[device.name],
        specific_current=intended.specific_current * named.factors[device.name],
    )
