"""One transistor's parameters at its conditions: process values with corner and temperature applied, and its size."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np

from worksheet.device.arrays import Number


@dataclass(frozen=True, eq=False, slots=True)
class Parameters:
    """Numbers of one transistor; every field is an array over conditions or a scalar that broadcasts.

    Attributes:
        kappa: Gate coupling at zero source-bulk voltage. [-]
        threshold: V_T0 at this temperature and corner, a magnitude. [V]
        specific_current: I_sq at this temperature and corner. [A]
        drain_coupling: sigma at this length and corner. [-]
        length_modulation: lambda_L. [m/V]
        surface_potential: Psi; 0 keeps kappa constant. [V]
        velocity: lambda_c = L_sat/L. [-]
        gate_capacitance, overlap_capacitance, junction_capacitance: C_ox [F/m^2], C_ov [F/m], C_j [F/m].
        flicker, flicker_exponent: K_F [V^2 F], alpha_F [-].
        matching_threshold, matching_factor: A_VT [V m], A_beta [m].
        max_voltage: Rating between any two terminals. [V]
        width, length: W, L. [m]
    """

    kappa: Number
    threshold: Number
    specific_current: Number
    drain_coupling: Number
    length_modulation: Number
    surface_potential: Number
    velocity: Number
    gate_capacitance: Number
    overlap_capacitance: Number
    junction_capacitance: Number
    flicker: Number
    flicker_exponent: Number
    matching_threshold: Number
    matching_factor: Number
    max_voltage: Number
    width: Number
    length: Number

    @property
    def specific(self) -> Number:
        """I_spec = I_sq W/L. [A]"""
        return self.specific_current * self.width / self.length


def couplings(process: Mapping[str, Number], changes: Mapping[str, Number], length: Number) -> tuple[Number, Number]:
    """Gate coupling kappa and drain coupling sigma of a corner at a length, both at zero source-bulk voltage. [-]

    Args:
        process: Kappa and drain coupling [-], the length that goes with it [m] and its exponent [-], by name.
        changes: Of the corner, all optional. [-]
        length: [m]
    Source: sigma(L) = sigma_ref (L_ref/L)^m; Tsividis and McAndrew 2011.
    """
    coupling = process["drain_coupling"] * np.power(
        process["drain_coupling_length"] / length, process["drain_coupling_exponent"]
    )
    shifted = process["kappa"] + changes.get("kappa_shift", 0.0)
    return shifted, coupling * changes.get("drain_coupling_factor", 1.0)


def at_condition(
    process: Mapping[str, Number],
    changes: Mapping[str, Number],
    temperature: Number,
    reference_temperature: Number,
    width: Number,
    length: Number,
) -> Parameters:
    """Apply corner, temperature and size to a device's process values.

    Args:
        process: Parameters of process_keys by name, at the reference temperature. [unit of the key]
        changes: Changes of process_keys.CORNER_CHANGES by name, all optional. Shifts add, factors multiply.
        temperature: [K], over conditions
        reference_temperature: T_0. [K]
        width, length: [m]
    Returns: Parameters whose fields broadcast over conditions
    Source: Tsividis and McAndrew 2011 for the temperature laws; sigma(L) = sigma_ref (L_ref/L)^m.
    """
    factor = changes.get("capacitance_factor", 1.0)
    kappa, drain_coupling = couplings(process, changes, length)
    warmth = temperature / reference_temperature
    return Parameters(
        kappa=kappa,
        threshold=process["threshold"]
        + changes.get("threshold_shift", 0.0)
        - process["threshold_drift"] * (temperature - reference_temperature),
        specific_current=process["specific_current"]
        * changes.get("specific_current_factor", 1.0)
        * np.power(warmth, 2.0 - process["mobility_exponent"]),
        drain_coupling=drain_coupling,
        length_modulation=process["length_modulation"],
        surface_potential=process["surface_potential"],
        velocity=process["velocity_length"] / length,
        gate_capacitance=process["gate_capacitance"] * factor,
        overlap_capacitance=process["overlap_capacitance"] * factor,
        junction_capacitance=process["junction_capacitance"] * factor,
        flicker=process["flicker"],
        flicker_exponent=process["flicker_exponent"],
        matching_threshold=process["matching_threshold"],
        matching_factor=process["matching_factor"],
        max_voltage=process["max_voltage"],
        width=width,
        length=length,
    )
