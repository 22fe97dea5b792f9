"""The operating point of every transistor of a solved stage, by the keys of model.operating."""

from __future__ import annotations

from collections.abc import Mapping
from functools import cached_property

import numpy as np

from worksheet.device import bulk, charge, noise
from worksheet.device.arrays import Array, Number
from worksheet.device.parameters import Parameters
from worksheet.device.transistor import Slopes, slopes
from worksheet.engine.inputs import Inputs
from worksheet.engine.levels import Levels
from worksheet.stages.stage import Transistor


class Operating:
    """One transistor at its operating point. Attributes carry the keys of model.operating, over conditions."""

    def __init__(self, inputs: Inputs, levels: Levels, device: Transistor) -> None:
        """Take the numbers; nothing is computed yet."""
        self.device = device
        self.name = device.name
        self.parameters: Parameters = inputs.devices[device.name]
        self._in = inputs
        self._levels = levels

    @property
    def current(self) -> Number:
        """Drain current. [A]"""
        return self._in.current

    @property
    def specific_current(self) -> Array:
        """I_spec. [A]"""
        return self._levels.specific[self.name]

    @property
    def inversion_coefficient(self) -> Array:
        """IC. [-]"""
        return self._levels.inversions[self.name]

    @property
    def charge(self) -> Array:
        """Normalised charge at the source end. [-]"""
        return self._levels.charges[self.name]

    @cached_property
    def kappa(self) -> Array:
        """Gate coupling at the operating point. [-]"""
        p = self.parameters
        if not np.any(p.surface_potential):
            return np.asarray(p.kappa)
        return bulk.coupling(p, self._levels.source_bulk(self.device))

    @cached_property
    def slopes(self) -> Slopes:
        """Conductances and capacitances."""
        inversion = self.inversion_coefficient
        return slopes(self.parameters, self.current, self.kappa, self._in.thermal, inversion, self.charge)

    def __getattr__(self, name: str) -> Array:
        if name in Slopes.__slots__:
            value: Array = getattr(self.slopes, name)
            return value
        raise AttributeError(name)

    @cached_property
    def transconductance_efficiency(self) -> Array:
        """g_m/I. [1/V]"""
        return self.slopes.transconductance / self.current

    @cached_property
    def transit_frequency(self) -> Array:
        """f_T. [Hz]"""
        s = self.slopes
        total = s.gate_source_capacitance + s.gate_bulk_capacitance + s.gate_drain_capacitance
        with np.errstate(divide="ignore"):
            return np.asarray(s.transconductance / (2.0 * np.pi * total))

    @cached_property
    def saturation_voltage(self) -> Array:
        """V_DSsat. [V]"""
        return self._levels.saturation[self.name]

    @cached_property
    def drain_source(self) -> Array:
        """V_DS, a magnitude where the device is the right way up. [V]"""
        t = self._levels.terminals(self.device)
        return np.asarray(t.source - t.drain if self.device.upside_down else t.drain - t.source)

    @cached_property
    def headroom(self) -> Array:
        """V_DS beyond V_DSsat and the saturation margin. [V]"""
        return np.asarray(self.drain_source - self.saturation_voltage - self._in.saturation_margin)

    @cached_property
    def reverse_share(self) -> Array:
        """q_d/(sigma q_s); not finite where sigma is 0. [-]"""
        p = self.parameters
        u_d = self._levels.drives[self.name] - (1.0 + p.drain_coupling) * self.drain_source / self._in.thermal
        with np.errstate(all="ignore"):
            return np.asarray(charge.charge_from_drive(u_d) / (p.drain_coupling * self.charge))

    @cached_property
    def gate_source_voltage(self) -> Array:
        """V_GS, a magnitude for p-channel devices too. [V]"""
        t = self._levels.terminals(self.device)
        return np.asarray(t.source - t.gate if self.device.upside_down else t.gate - t.source)

    @cached_property
    def gate_voltage(self) -> Array:
        """From ground. [V]"""
        return self._levels.turn(self._levels.terminals(self.device).gate)

    @cached_property
    def source_voltage(self) -> Array:
        """From ground. [V]"""
        return self._levels.turn(self._levels.terminals(self.device).source)

    @cached_property
    def drain_voltage(self) -> Array:
        """From ground. [V]"""
        return self._levels.turn(self._levels.terminals(self.device).drain)

    @property
    def width(self) -> Number:
        """W. [m]"""
        return self.parameters.width

    @property
    def length(self) -> Number:
        """L. [m]"""
        return self.parameters.length

    @property
    def matching_threshold(self) -> Number:
        """A_VT. [V m]"""
        return self.parameters.matching_threshold

    @property
    def matching_factor(self) -> Number:
        """A_beta. [m]"""
        return self.parameters.matching_factor

    @cached_property
    def white_density(self) -> Number:
        """White noise of the drain current. [A^2/Hz]"""
        return noise.white_density(self.charge, self.slopes.source_conductance, self._in.temperature)

    @cached_property
    def flicker_density(self) -> Number:
        """Flicker noise of the drain current at 1 Hz. [A^2/Hz]"""
        with np.errstate(divide="ignore", invalid="ignore"):
            return noise.flicker_density(self.parameters, self.slopes.transconductance)


def operating_points(inputs: Inputs, levels: Levels) -> Mapping[str, Operating]:
    """Operating points of all transistors of a circuit, by name, each computed when asked."""
    return {device.name: Operating(inputs, levels, device) for device in inputs.circuit.devices}
