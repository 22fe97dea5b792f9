"""Gate, source and drain voltages of a transistor that carries a known current, referred to its bulk.

With a surface potential the gate coupling moves with the source voltage: n(V_SB) = 1 + (1/kappa - 1)
sqrt(Psi/(Psi + V_SB)). Without one (Psi = 0) kappa is constant. Sources: Enz, Krummenacher and Vittoz 1995; Enz
and Vittoz 2006.
"""

from __future__ import annotations

import numpy as np

from worksheet.device.arrays import Array, Number
from worksheet.device.parameters import Parameters

_STEPS = 60


def coupling(parameters: Parameters, source_bulk: Number) -> Array:
    """kappa at a source-bulk voltage. [-]

    Args:
        parameters: The device.
        source_bulk: V_SB. [V], broadcasts with the parameters
    Returns: kappa(V_SB) = 1/n(V_SB)
    Source: Enz and Vittoz 2006. Valid: V_SB above -Psi; held at its end below.
    """
    psi = np.asarray(parameters.surface_potential)
    if not psi.any():
        return np.broadcast_to(parameters.kappa, np.broadcast_shapes(np.shape(parameters.kappa), np.shape(source_bulk)))
    excess = 1.0 / parameters.kappa - 1.0
    depth = np.maximum(psi + source_bulk, 1e-6)
    moved = 1.0 / (1.0 + excess * np.sqrt(psi / depth))
    return np.asarray(np.where(psi > 0, moved, parameters.kappa))


def gate_voltage(parameters: Parameters, u: Number, source: Number, drain: Number, thermal: Number) -> Array:
    """Gate-bulk voltage that gives drive u at the source end.

    Args:
        parameters: The device.
        u: Drive, 2 q + ln q. [-]
        source, drain: V_S, V_D. [V]
        thermal: U_T. [V]
    Returns: V_G [V]
    Source: physics of the charge model, V_G = V_T0 + (V_S - sigma V_D + U_T u)/kappa; with Psi V_TB and kappa(V_SB).
    """
    p = parameters
    rest = thermal * u - p.drain_coupling * drain
    flat = p.threshold + (source + rest) / p.kappa
    psi = np.asarray(p.surface_potential)
    if not psi.any():
        return np.asarray(flat)
    body = 2.0 * (1.0 / p.kappa - 1.0) * np.sqrt(psi)
    depth = np.maximum(psi + source, 1e-6)
    turning = p.threshold + source + body * (np.sqrt(depth) - np.sqrt(psi))
    return np.asarray(np.where(psi > 0, turning + rest / coupling(p, source), flat))


def source_voltage(parameters: Parameters, u: Number, gate: Number, drain: Number, thermal: Number) -> Array:
    """Source-bulk voltage at which a gate voltage gives drive u: the inverse of gate_voltage. [V]

    Closed form where kappa is constant, else Newton's iteration on sqrt(Psi + V_S), which converges from above.
    Source: as gate_voltage.
    """
    p = parameters
    flat = p.kappa * (gate - p.threshold) + p.drain_coupling * drain - thermal * u
    psi = np.asarray(p.surface_potential)
    if not psi.any():
        return np.asarray(flat)
    safe = np.where(psi > 0, psi, 1.0)
    excess = 1.0 / p.kappa - 1.0
    body, rest = 2.0 * excess * np.sqrt(safe), thermal * u - p.drain_coupling * drain
    bend = rest * excess * np.sqrt(safe)
    wanted = gate - p.threshold - rest + safe + body * np.sqrt(safe)
    x = np.sqrt(np.maximum(wanted, safe))
    done = np.zeros(np.shape(x), dtype=bool)  # what has arrived stays: a number must not depend on its neighbours
    for _ in range(_STEPS):
        error = x * x + body * x + bend / x - wanted
        step = error / np.maximum(2.0 * x + body - bend / (x * x), 1e-3)
        x = np.where(done, x, np.maximum(x - step, 0.1 * x))
        done = done | (np.abs(step) <= 1e-16 * x)
        if done.all():
            break
    return np.asarray(np.where(psi > 0, x * x - safe, flat))


def own_well_source_voltage(parameters: Parameters, u: Number, gate: Number, drain: Number, thermal: Number) -> Array:
    """Source voltage of a device whose bulk is tied to its source; gate and drain from the same reference. [V]

    Source: as gate_voltage with V_SB = 0: kappa (V_G - V_S - V_T0) + sigma (V_D - V_S) = U_T u.
    """
    p = parameters
    return np.asarray(
        (p.kappa * (gate - p.threshold) + p.drain_coupling * drain - thermal * u) / (p.kappa + p.drain_coupling)
    )
