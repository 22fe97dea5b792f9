"""Small-signal values of a saturated transistor of known current, and its law out of saturation."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from worksheet.device import charge
from worksheet.device.arrays import Array, Number
from worksheet.device.parameters import Parameters


def saturation_voltage(inversion: Number, thermal: Number) -> Array:
    """V_DSsat = U_T (2 sqrt(IC + 1/4) + 3).

    Args:
        inversion: IC = I_D/I_spec, also with velocity saturation. [-]
        thermal: U_T. [V]
    Returns: [V]
    Source: Enz and Vittoz 2006. Valid: all inversion; one of several published forms.
    """
    return np.asarray(thermal * (2.0 * np.sqrt(np.asarray(inversion) + 0.25) + 3.0))


@dataclass(frozen=True, eq=False, slots=True)
class Slopes:
    """Conductances [S] and capacitances [F] of a saturated transistor, over conditions."""

    transconductance: Array
    source_conductance: Array
    drain_conductance: Array
    bulk_conductance: Array
    gate_source_capacitance: Array
    gate_drain_capacitance: Array
    gate_bulk_capacitance: Array
    source_bulk_capacitance: Array
    drain_bulk_capacitance: Array


def slopes(
    parameters: Parameters, current: Number, kappa: Number, thermal: Number, inversion: Number, q: Number
) -> Slopes:
    """Conductances and capacitances in saturation, all from the one slope g_s.

    Args:
        parameters: The device.
        current: Drain current. [A]
        kappa: Gate coupling at the operating point. [-]
        thermal: U_T. [V]
        inversion: Current over specific current. [-]
        q: Normalised charge at the source end. [-]
    Returns: Slopes
    Source: Enz and Vittoz 2006; g_d = sigma g_s + lambda_L I/L is the usual hand rule I/V_A. Valid: saturation.
    """
    p = parameters
    g_s = current * charge.slope_factor(inversion, p.velocity) / thermal
    g_m = kappa * g_s
    g_d = p.drain_coupling * g_s + p.length_modulation * current / p.length
    channel = p.gate_capacitance * p.width * p.length
    intrinsic = channel * (q / 3.0) * (2.0 * q + 3.0) / (q + 1.0) ** 2
    overlap = np.asarray(p.overlap_capacitance * p.width)
    junction = np.asarray(p.junction_capacitance * p.width)
    return Slopes(
        transconductance=np.asarray(g_m),
        source_conductance=np.asarray(g_s),
        drain_conductance=np.asarray(g_d),
        bulk_conductance=np.asarray(g_s - g_m - g_d),
        gate_source_capacitance=intrinsic + overlap,
        gate_drain_capacitance=overlap,
        gate_bulk_capacitance=np.asarray((1.0 - kappa) * (channel - intrinsic)),
        source_bulk_capacitance=junction + (1.0 / kappa - 1.0) * intrinsic,
        drain_bulk_capacitance=junction,
    )


def drain_current(parameters: Parameters, gate: Number, source: Number, drain: Number, thermal: Number) -> Array:
    """Drain current of the long channel in every region, forward less reverse, from bulk-referred voltages.

    Args:
        parameters: The device; its surface potential and velocity saturation are not used.
        gate, source, drain: V_G, V_S, V_D. [V]
        thermal: U_T. [V]
    Returns: I_D [A]; changes sign when source and drain are exchanged
    Source: Enz, Krummenacher and Vittoz 1995. Valid: long channel.
    """
    p = parameters
    pinch = p.kappa * (gate - p.threshold)
    forward = charge.charge_from_drive((pinch - source + p.drain_coupling * drain) / thermal)
    reverse = charge.charge_from_drive((pinch - drain + p.drain_coupling * source) / thermal)
    return np.asarray(p.specific * (charge.inversion_from_charge(forward) - charge.inversion_from_charge(reverse)))


def triode_conductances(
    parameters: Parameters, forward: Number, reverse: Number, thermal: Number
) -> tuple[Array, Array, Array]:
    """g_m, g_s and g_d out of saturation, from the charges at both ends.

    Args:
        parameters: The device.
        forward, reverse: q_s, q_d. [-]
        thermal: U_T. [V]
    Returns: (g_m, g_s, g_d) [S]
    Source: Enz and Vittoz 2006. Valid: long channel.
    """
    p = parameters
    unit = p.specific / thermal
    g_m = p.kappa * unit * (forward - reverse)
    return (
        np.asarray(g_m),
        np.asarray(unit * (forward + p.drain_coupling * reverse)),
        np.asarray(unit * (p.drain_coupling * forward + reverse)),
    )
