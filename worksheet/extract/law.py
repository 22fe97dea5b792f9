"""The drain-current law that is fitted, in every region of inversion, with its slopes against every parameter.

It extends the long-channel law of device.transistor by what a table of currents can carry: kappa that moves with the
source voltage (surface potential), the factor 1 + lambda_L V_DS/L, velocity saturation, the laws over length and
temperature, and offsets between drawn and effective size. Slopes are exact, so that covariances are.

Sources: Enz, Krummenacher and Vittoz 1995; Enz and Vittoz 2006; with velocity saturation Enz, Chicco and Pezzotta 2017.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from worksheet.device.arrays import Array
from worksheet.device.charge import charge_from_drive, inversion_from_charge
from worksheet.extract.data import Rows

NAMES = (
    "kappa",
    "threshold",
    "log_current",
    "drain_coupling",
    "inverse_potential",
    "length_modulation",
    "velocity_length",
    "drain_coupling_exponent",
    "threshold_drift",
    "mobility_exponent",
    "length_offset",
    "width_offset",
)
"""The law's parameters in the order of its arrays.

log_current is ln(I_sq/A); inverse_potential is 1/Psi, 0 where kappa is constant, which makes the constant-kappa law an
inner point; offsets are L - L_eff and W_eff - W. [-, V, -, -, 1/V, m/V, m, -, V/K, -, m, m]"""

AT = {name: place for place, name in enumerate(NAMES)}
"""Place of a parameter in the law's arrays."""

OFF = np.zeros(len(NAMES))
"""Every optional parameter at its default, which switches it off; exponent 2 keeps the current factor still."""
OFF[AT["mobility_exponent"]] = 2.0

_LEAST = 1e-290
_FLAT = 1e-3


@dataclass(frozen=True, slots=True)
class Reference:
    """Where the parameters are stated.

    Attributes:
        temperature: T_0. [K]
        length: L_ref of the drain coupling; 1 where lengths are unknown, so that ratios stay plain numbers. [m]
    """

    temperature: float
    length: float


@dataclass(frozen=True, eq=False, slots=True)
class _End:
    """Drive of one end of the channel and its slopes; `own` is against the voltage of that end."""

    drive: Array
    own: Array
    kappa: Array
    threshold: Array
    coupling: Array
    potential: Array


def sizes(rows: Rows) -> tuple[Array, Array]:
    """W and L of every row, 1 where they are unknown: the law then speaks of the whole device. [m], (rows,) each"""
    return np.where(np.isfinite(rows.width), rows.width, 1.0), np.where(np.isfinite(rows.length), rows.length, 1.0)


def log_specific(values: Array, rows: Rows, reference: Reference) -> Array:
    """ln(I_spec) of every row's device at its temperature and effective size. [-], shape (rows,)

    Args:
        values: Parameters in the order of NAMES. [see NAMES]
        rows: The points.
        reference: Where the parameters are stated.
    """
    width, length = sizes(rows)
    ratio = (width + values[AT["width_offset"]]) / (length - values[AT["length_offset"]])
    warm = np.log(rows.temperature / reference.temperature)
    return np.asarray(
        values[AT["log_current"]] + np.log(np.maximum(ratio, 1e-12)) + (2.0 - values[AT["mobility_exponent"]]) * warm
    )


def log_current(values: Array, rows: Rows, reference: Reference) -> Array:
    """ln(I_D) of the law at every row. [-], shape (rows,); see log_current_and_slopes."""
    return log_current_and_slopes(values, rows, reference)[0]


def log_current_and_slopes(values: Array, rows: Rows, reference: Reference) -> tuple[Array, Array]:
    """ln(I_D) of the law at every row, and its slopes.

    Args:
        values: Parameters in the order of NAMES. [see NAMES]
        rows: The points; V_D at or above V_S.
        reference: Where the parameters are stated.
    Returns: ln(I_D/A), shape (rows,), and its derivatives, shape (rows, parameters)
    Source: physics of the charge model, I_D = I_spec (i(q_s) - i(q_d)) (1 + lambda_L V_DS/L).
    Valid: everywhere; with velocity saturation exact in saturation, continuous below.
    """
    width, length = sizes(rows)
    sigma_slope = np.power(reference.length / length, values[AT["drain_coupling_exponent"]])
    sigma = values[AT["drain_coupling"]] * sigma_slope
    velocity = np.maximum(values[AT["velocity_length"]] / length, 0.0)
    threshold = values[AT["threshold"]] - values[AT["threshold_drift"]] * (rows.temperature - reference.temperature)
    source = _end(values, rows, threshold, sigma, at=rows.source, other=rows.drain)
    drain = _end(values, rows, threshold, sigma, at=rows.drain, other=rows.source)
    forward, forward_slope, forward_velocity = _normalised(source.drive, velocity)
    reverse, reverse_slope, reverse_velocity = _normalised(drain.drive, velocity)
    net = np.maximum(forward - reverse, _LEAST)
    stretch = np.maximum(1.0 + values[AT["length_modulation"]] * rows.across / length, 1e-3)
    result = log_specific(values, rows, reference) + np.log(net) + np.log(stretch)

    def chain(at_source: Array, at_drain: Array) -> Array:
        return np.asarray((forward_slope * at_source - reverse_slope * at_drain) / net)

    slopes = np.zeros((len(rows), len(NAMES)))
    slopes[:, AT["kappa"]] = chain(source.kappa, drain.kappa)
    slopes[:, AT["threshold"]] = chain(source.threshold, drain.threshold)
    slopes[:, AT["log_current"]] = 1.0
    by_sigma = chain(source.coupling, drain.coupling)
    slopes[:, AT["drain_coupling"]] = by_sigma * sigma_slope
    slopes[:, AT["inverse_potential"]] = chain(source.potential, drain.potential)
    slopes[:, AT["length_modulation"]] = rows.across / length / stretch
    slopes[:, AT["velocity_length"]] = (forward_velocity - reverse_velocity) / net / length
    slopes[:, AT["drain_coupling_exponent"]] = by_sigma * sigma * np.log(reference.length / length)
    slopes[:, AT["threshold_drift"]] = -slopes[:, AT["threshold"]] * (rows.temperature - reference.temperature)
    slopes[:, AT["mobility_exponent"]] = -np.log(rows.temperature / reference.temperature)
    slopes[:, AT["length_offset"]] = 1.0 / np.maximum(length - values[AT["length_offset"]], 1e-12)
    slopes[:, AT["width_offset"]] = 1.0 / np.maximum(width + values[AT["width_offset"]], 1e-12)
    return np.asarray(result), slopes


def bias_slopes(values: Array, rows: Rows, reference: Reference) -> tuple[Array, Array, Array]:
    """Slopes of ln(I_D) against gate, source and drain voltage. [1/V], shape (rows,) each

    Args:
        values: Parameters in the order of NAMES. [see NAMES]
        rows: The points; V_D above V_S.
        reference: Where the parameters are stated.
    """
    _, length = sizes(rows)
    sigma = values[AT["drain_coupling"]] * np.power(reference.length / length, values[AT["drain_coupling_exponent"]])
    velocity = np.maximum(values[AT["velocity_length"]] / length, 0.0)
    threshold = values[AT["threshold"]] - values[AT["threshold_drift"]] * (rows.temperature - reference.temperature)
    source = _end(values, rows, threshold, sigma, at=rows.source, other=rows.drain)
    drain = _end(values, rows, threshold, sigma, at=rows.drain, other=rows.source)
    forward, forward_slope, _ = _normalised(source.drive, velocity)
    reverse, reverse_slope, _ = _normalised(drain.drive, velocity)
    net = np.maximum(forward - reverse, _LEAST)
    across = sigma / rows.thermal
    stretch = values[AT["length_modulation"]] / length
    stretch = stretch / np.maximum(1.0 + stretch * rows.across, 1e-3)
    by_gate = -(forward_slope * source.threshold - reverse_slope * drain.threshold) / net
    by_source = (forward_slope * source.own - reverse_slope * across) / net - stretch
    by_drain = (forward_slope * across - reverse_slope * drain.own) / net + stretch
    return np.asarray(by_gate), np.asarray(by_source), np.asarray(by_drain)


def forward_inversion(values: Array, rows: Rows, reference: Reference) -> Array:
    """i(q_s), the inversion at the source end: I_D/I_spec of the same device in saturation. [-], shape (rows,)

    Args:
        values: Parameters in the order of NAMES. [see NAMES]
        rows: The points.
        reference: Where the parameters are stated.
    """
    return _ends(values, rows, reference)[0]


def _ends(values: Array, rows: Rows, reference: Reference) -> tuple[Array, Array]:
    """i(q_s) and i(q_d)."""
    _, length = sizes(rows)
    sigma = values[AT["drain_coupling"]] * np.power(reference.length / length, values[AT["drain_coupling_exponent"]])
    velocity = np.maximum(values[AT["velocity_length"]] / length, 0.0)
    threshold = values[AT["threshold"]] - values[AT["threshold_drift"]] * (rows.temperature - reference.temperature)
    source = _end(values, rows, threshold, sigma, at=rows.source, other=rows.drain)
    drain = _end(values, rows, threshold, sigma, at=rows.drain, other=rows.source)
    return _normalised(source.drive, velocity)[0], _normalised(drain.drive, velocity)[0]


def _end(values: Array, rows: Rows, threshold: Array, sigma: Array, *, at: Array, other: Array) -> _End:
    """Drive u of the end at voltage `at`, the other end at `other`.

    With r = sqrt(1 + V/Psi): n = 1 + (1/kappa - 1)/r and V_TB = V_T0 + V + 2 (1/kappa - 1) V/(1 + r), which is the
    law of the slope factor over source voltage in a form that also holds for 1/Psi = 0.
    """
    kappa = values[AT["kappa"]]
    excess = 1.0 / kappa - 1.0
    bend = np.sqrt(np.maximum(1.0 + at * values[AT["inverse_potential"]], _FLAT))
    factor = 1.0 + excess / bend
    above = rows.gate - threshold - at - 2.0 * excess * at / (1.0 + bend)
    thermal = rows.thermal
    unit = 1.0 / (factor * thermal)
    by_excess = (-2.0 * at / (1.0 + bend) - above / (factor * bend)) * unit
    bend_slope = at / (2.0 * bend)
    by_potential = excess * bend_slope * (2.0 * at / (1.0 + bend) ** 2 + above / (factor * bend**2)) * unit
    turning = values[AT["inverse_potential"]] / (2.0 * bend)
    above_slope = -1.0 - 2.0 * excess / (1.0 + bend) + 2.0 * excess * at * turning / (1.0 + bend) ** 2
    return _End(
        drive=np.asarray(above * unit + sigma * other / thermal),
        own=np.asarray((above_slope + above * excess * turning / (factor * bend**2)) * unit),
        kappa=np.asarray(-by_excess / kappa**2),
        threshold=-unit,
        coupling=np.asarray(other / thermal),
        potential=np.asarray(by_potential),
    )


def _normalised(drive: Array, velocity: Array) -> tuple[Array, Array, Array]:
    """i(q(u)) and its slopes against u and against lambda_c."""
    q = charge_from_drive(np.minimum(drive, 1e8))
    i = inversion_from_charge(q, velocity)
    share = velocity * (velocity * i + 1.0) + 2.0
    return i, np.asarray(2.0 * q / share), np.asarray(-(velocity * i + 1.0) * i / share)
