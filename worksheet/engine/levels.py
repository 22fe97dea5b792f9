"""Where every node stands: ranges that keep each device saturated, levels, and the voltages that follow.

All voltages here are in the stage's frame: from ground for an n-channel stage, from the supply downwards for a
p-channel one, which is its mirror image. `Frame` turns them back.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from worksheet.device import bulk, charge
from worksheet.device.arrays import Array, Number
from worksheet.device.transistor import saturation_voltage
from worksheet.engine.inputs import Inputs, given_or, nominal
from worksheet.stages.circuit import Circuit
from worksheet.stages.stage import BIAS, GROUND, IN, OUT, SUPPLY, Transistor


class Levels:
    """Node voltages, ranges and device voltages of one circuit over its conditions. Built lazily from Inputs."""

    def __init__(self, inputs: Inputs, at_nominal: Callable[[], Levels] | None = None) -> None:
        """Take the numbers, and the same at the nominal condition where their first condition is another."""
        self._in = inputs
        self._at_nominal = at_nominal
        self._circuit: Circuit = inputs.circuit
        self._below = self._circuit.stack_below(OUT)
        self._above = self._circuit.stack_above(OUT)

    def turn(self, voltage: Number) -> Array:
        """Between the frame and ground, either way. [V]"""
        mirrored = self._in.mirrored
        if not mirrored.any():
            return np.asarray(voltage)
        turned = np.asarray(self._in.supply - voltage)
        return turned if mirrored.all() else np.where(mirrored, turned, voltage)

    def _held(self, find: Callable[[Levels], Array]) -> Array:
        """A frame voltage found at the nominal condition and held from ground over all conditions. [V]"""
        there = self if self._at_nominal is None else self._at_nominal()
        return self.turn(nominal(there.turn(find(there))))

    @cached_property
    def specific(self) -> dict[str, Array]:
        """I_spec of each transistor, by name. [A]"""
        return {name: np.asarray(p.specific) for name, p in self._in.devices.items()}

    @cached_property
    def inversions(self) -> dict[str, Array]:
        """I/I_spec of each transistor, by name. [-]"""
        return {name: np.asarray(self._in.current / specific) for name, specific in self.specific.items()}

    @cached_property
    def charges(self) -> dict[str, Array]:
        """Normalised charge at the source end of each transistor, by name. [-]"""
        devices = self._in.devices
        return {n: charge.charge_from_inversion(i, devices[n].velocity) for n, i in self.inversions.items()}

    @cached_property
    def drives(self) -> dict[str, Array]:
        """u = 2 q + ln q at the source end of each transistor, by name. [-]"""
        return {name: charge.drive_from_charge(q) for name, q in self.charges.items()}

    @cached_property
    def saturation(self) -> dict[str, Array]:
        """V_DSsat of each transistor, by name. [V]"""
        return {name: saturation_voltage(i, self._in.thermal) for name, i in self.inversions.items()}

    def wanted(self, device: Transistor) -> Array:
        """Drain-source voltage wanted of a device: V_DSsat and the margin; 0 of an ideal source. [V]"""
        if device.name not in self._in.devices:
            return np.zeros(())
        return self.saturation[device.name] + self._in.saturation_margin

    def _stack(self, devices: tuple[Transistor, ...]) -> Array:
        return np.asarray(sum((self.wanted(d) for d in devices), np.zeros(())))

    @cached_property
    def assumed_output(self) -> Array | None:
        """The output level that is assumed, in the frame; None or NaN where none is. [V]"""
        return None if self._in.output_level is None else self.turn(self._in.output_level)

    @cached_property
    def _input_given_or_found(self) -> Array | None:
        """Level of a source- or drain-driven input. [V]"""
        if self._above[0] == IN:
            return given_or(self._assumed_input, lambda: np.asarray(self._in.supply))
        if self._below[0] == IN:
            return given_or(self._assumed_input, lambda: self._held(lambda at: at.source_input_room / 2.0))
        return None

    @cached_property
    def _assumed_input(self) -> Array | None:
        """The input level that is assumed, in the frame; None or NaN where none is. [V]"""
        return None if self._in.input_level is None else self.turn(self._in.input_level)

    @cached_property
    def source_input_room(self) -> Array:
        """Highest level of a source-driven input for the output that is given, or else for any output. [V]"""
        highest = given_or(self.assumed_output, lambda: self._in.supply - self._stack(self._above[1]))
        return np.asarray(highest - self._stack(self._below[1]))

    def _fixed(self, node: str) -> Array:
        if node == GROUND:
            return np.zeros(())
        if node == SUPPLY:
            return np.asarray(self._in.supply)
        level = self._input_given_or_found
        assert level is not None
        return level

    @cached_property
    def output_low(self) -> Array:
        """Lowest output in the frame that keeps every device saturated. [V]"""
        return self._fixed(self._below[0]) + self._stack(self._below[1])

    @cached_property
    def output_high(self) -> Array:
        """Highest output in the frame that keeps every device saturated, the gate within the supply. [V]"""
        highest = self._fixed(self._above[0]) - self._stack(self._above[1])
        if self._circuit.stage.holds_input:
            highest = np.minimum(highest, self.output_for_gate(self._in.supply))
        return highest

    @cached_property
    def _upper_of_main(self) -> Array:
        """Drain voltage of the main device where its source is the output. [V]"""
        return self._fixed(self._above[0]) - self._stack(self._above[1][1:])

    def output_for_gate(self, gate: Number, drain: Number | None = None) -> Array:
        """Output of a source-output stage for a gate voltage of its main device, all in the frame. [V]"""
        main = self._circuit.stage.transistors[0]
        p, u = self._in.devices[main.name], self.drives[main.name]
        law = bulk.own_well_source_voltage if self._circuit.bulk == "source" else bulk.source_voltage
        return law(p, u, gate, self._upper_of_main if drain is None else drain, self._in.thermal)

    def gate_for_output(self, output: Number) -> Array:
        """Gate voltage of the main device that gives an output, the inverse of output_for_gate. [V]"""
        return self._gate(self._circuit.stage.transistors[0], output, self._upper_of_main)

    @cached_property
    def input(self) -> Array:
        """Input level in the frame; for a gate-driven drain output the gate that follows. [V]"""
        level = self._input_given_or_found
        if level is not None:
            return level
        if self._circuit.stage.holds_input:
            return given_or(self._assumed_input, lambda: given_or(self._gate_for_assumed, self._found_gate))
        return self.gates[self._circuit.stage.transistors[0].name]

    @cached_property
    def _gate_for_assumed(self) -> Array | None:
        """The gate of a follower whose output is assumed; None or NaN where it is not. [V]"""
        return None if self.assumed_output is None else self.gate_for_output(self.assumed_output)

    def _found_gate(self) -> Array:
        """The gate of a follower that stands in the middle of its range at the nominal condition. [V]"""
        return self._held(lambda at: at.gate_for_output((at.output_low + at.output_high) / 2.0))

    @cached_property
    def output(self) -> Array:
        """Output level in the frame. [V]"""
        if self._circuit.stage.holds_input:
            return given_or(self.assumed_output, lambda: self.output_for_gate(self.input))
        return given_or(self.assumed_output, lambda: self._held(lambda at: (at.output_low + at.output_high) / 2.0))

    @cached_property
    def empty(self) -> Array:
        """By how much the range is empty in which a level that is not assumed was sought, at the nominal condition. [V]

        Zero or negative where a level exists.
        """
        none = np.full((), -np.inf)
        out_is_sought = _missing(self._in.output_level)
        if self._circuit.stage.holds_input:
            out_is_sought = out_is_sought & _missing(self._in.input_level)
        short = np.where(out_is_sought, nominal(self.output_low - self.output_high), none)
        if self._below[0] == IN:
            in_is_sought = _missing(self._in.input_level)
            short = np.maximum(short, np.where(in_is_sought, nominal(-self.source_input_room), none))
        return short

    @cached_property
    def nodes(self) -> dict[str, Array]:
        """Voltage in the frame of every node that a channel touches. [V]"""
        nodes = {GROUND: np.zeros(()), SUPPLY: np.asarray(self._in.supply), OUT: self.output}
        for (base, devices), sign in ((self._below, 1.0), (self._above, -1.0)):
            nodes.setdefault(base, self._fixed(base))
            voltage = nodes[base]
            for device in reversed(devices[1:]):
                voltage = voltage + sign * self.wanted(device)
                nodes[device.upper if sign > 0 else device.lower] = voltage
        return nodes

    def _local(self, device: Transistor, voltage: Array) -> Array:
        return self._in.supply - voltage if device.upside_down else voltage

    def _gate(self, device: Transistor, source: Number, drain: Number) -> Array:
        """Gate voltage in the frame for source and drain voltages in the frame. [V]"""
        p, u, thermal = self._in.devices[device.name], self.drives[device.name], self._in.thermal
        source, drain = self._local(device, np.asarray(source)), self._local(device, np.asarray(drain))
        if self._bulk_on_source(device):
            return self._local(device, source + bulk.gate_voltage(p, u, 0.0, drain - source, thermal))
        return self._local(device, bulk.gate_voltage(p, u, source, drain, thermal))

    def _bulk_on_source(self, device: Transistor) -> bool:
        return self._circuit.bulk == "source" and device.name != BIAS

    @cached_property
    def gates(self) -> dict[str, Array]:
        """Gate voltage of each transistor in the frame, by name. [V]"""
        gates = {}
        for device in self._circuit.devices:
            if device.gate == IN and self._circuit.stage.holds_input:
                gates[device.name] = self.input
            else:
                gates[device.name] = self._gate(device, self.nodes[device.source], self.nodes[device.drain])
        return gates

    def terminals(self, device: Transistor) -> Terminals:
        """All voltages of one transistor."""
        source, drain = self.nodes[device.source], self.nodes[device.drain]
        rail = self.nodes[SUPPLY if device.upside_down else GROUND]
        body = source if self._bulk_on_source(device) else rail
        return Terminals(self.gates[device.name], drain, source, body)

    def source_bulk(self, device: Transistor) -> Array:
        """V_SB of a transistor, positive in its own polarity. [V]"""
        t = self.terminals(device)
        return np.abs(t.source - t.bulk) if device.upside_down else np.asarray(t.source - t.bulk)

    @cached_property
    def input_low(self) -> Array | None:
        """Lowest input level in the frame that keeps every device saturated; None where the input follows. [V]"""
        if self._circuit.stage.holds_input:
            return self.gate_for_output(self.output_low)
        if self._below[0] == IN:
            return np.zeros(())
        if self._above[0] == IN:
            return self.output + self._stack(self._above[1])
        return None

    @cached_property
    def input_high(self) -> Array | None:
        """Highest input level in the frame that keeps every device saturated; None where the input follows. [V]"""
        if self._circuit.stage.holds_input:
            return self.gate_for_output(self.output_high)
        if self._below[0] == IN:
            return self.output - self._stack(self._below[1])
        if self._above[0] == IN:
            return np.asarray(self._in.supply)
        return None

    @property
    def input_is_level(self) -> bool:
        """Whether the input is a channel end, so that its level bounds the output."""
        return IN in (self._below[0], self._above[0])

    def range_moves(self, step: Number) -> tuple[Number, Number]:
        """By how much the lower and the upper end of the output range move when the input moves. [V]"""
        return (step if self._below[0] == IN else 0.0), (step if self._above[0] == IN else 0.0)


def _missing(level: Number | None) -> NDArray[np.bool_]:
    """Where a level is not assumed."""
    return np.ones((), dtype=np.bool_) if level is None else np.isnan(nominal(level))


@dataclass(frozen=True, eq=False, slots=True)
class Terminals:
    """Voltages of one transistor in the frame. [V]"""

    gate: Array
    drain: Array
    source: Array
    bulk: Array

    @property
    def span(self) -> Array:
        """Greatest voltage between any two terminals. [V]"""
        stack = (self.gate, self.drain, self.source, self.bulk)
        highest, lowest = stack[0], stack[0]
        for voltage in stack[1:]:
            highest, lowest = np.maximum(highest, voltage), np.minimum(lowest, voltage)
        return np.asarray(highest - lowest)
