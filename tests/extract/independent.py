"""Drain currents of the charge model from its published formulas, written without the package: Lambert's W of scipy.

Sources: Enz, Krummenacher and Vittoz 1995; Enz and Vittoz 2006; with velocity saturation Enz, Chicco and Pezzotta 2017.
Constants are CODATA 2018's. mpmath's own Lambert W checks the numbers in test_independent.py.
"""

from __future__ import annotations

import csv
from dataclasses import dataclass, field
from pathlib import Path

import numpy as np
from numpy.typing import NDArray
from scipy.special import lambertw

Array = NDArray[np.float64]


@dataclass(frozen=True)
class Device:
    """A device of the contract's parameters, in SI."""

    kappa: float = 0.72
    threshold: float = 0.42
    specific_current: float = 0.6e-6
    drain_coupling: float = 0.02
    drain_coupling_length: float = 0.5e-6
    drain_coupling_exponent: float = 1.0
    length_modulation: float = 0.0
    surface_potential: float = 0.0
    velocity_length: float = 0.0
    threshold_drift: float = 0.0
    mobility_exponent: float = 2.0
    reference_temperature: float = 300.0
    length_offset: float = 0.0
    width_offset: float = 0.0


@dataclass
class Points:
    """Biases, sizes and temperature, one a point."""

    vg: Array
    vs: Array
    vd: Array
    w: Array
    l: Array  # noqa: E741 - the contract's column
    temperature: Array
    id: Array = field(default_factory=lambda: np.empty(0))


def grid(
    vg: Array,
    vs: tuple[float, ...] = (0.0,),
    vds: tuple[float, ...] = (0.05, 0.6, 1.2),
    sizes: tuple[tuple[float, float], ...] = ((5e-6, 0.5e-6),),
    temperatures: tuple[float, ...] = (300.0,),
) -> Points:
    """Gate sweeps from the source, at every source voltage, drain-source voltage, size and temperature."""
    table = [
        (g + s, s, s + d, w, length, t)
        for t in temperatures
        for w, length in sizes
        for s in vs
        for d in vds
        for g in vg
    ]
    columns = np.array(table, dtype=np.float64).T
    return Points(*columns)


def charge(u: Array) -> Array:
    """q of 2 q + ln q = u, by Lambert's W below 700 and by its asymptotic start and Newton's steps above."""
    z = 2.0 * np.exp(np.minimum(u, 600.0))
    return np.asarray(np.real(lambertw(z)) / 2.0, dtype=np.float64)


def inversion(q: Array, velocity: Array | float) -> Array:
    """i(q) with velocity saturation, of the published form."""
    root = np.sqrt(4 * (1 + velocity) + velocity**2 * (1 + 2 * q) ** 2)
    return np.asarray(4 * (q**2 + q) / (2 + velocity + root))


def current(device: Device, at: Points) -> Array:
    """I_D = I_spec (i(q_s) - i(q_d)) (1 + lambda_L V_DS/L)."""
    thermal = 1.380649e-23 * at.temperature / 1.602176634e-19
    warm = at.temperature - device.reference_temperature
    threshold = device.threshold - device.threshold_drift * warm
    square = device.specific_current * (at.temperature / device.reference_temperature) ** (2 - device.mobility_exponent)
    sigma = device.drain_coupling * (device.drain_coupling_length / at.l) ** device.drain_coupling_exponent

    def drive(here: Array, other: Array) -> Array:
        psi = device.surface_potential
        if psi == 0.0:
            return np.asarray((device.kappa * (at.vg - threshold) - here + sigma * other) / thermal)
        excess = 1 / device.kappa - 1
        body = 2 * excess * np.sqrt(psi)
        turning = threshold + here + body * (np.sqrt(psi + here) - np.sqrt(psi))
        kappa = 1 / (1 + excess * np.sqrt(psi / (psi + here)))
        return np.asarray((kappa * (at.vg - turning) + sigma * other) / thermal)

    velocity = device.velocity_length / at.l
    net = inversion(charge(drive(at.vs, at.vd)), velocity) - inversion(charge(drive(at.vd, at.vs)), velocity)
    ratio = (at.w + device.width_offset) / (at.l - device.length_offset)
    return np.asarray(square * ratio * net * (1 + device.length_modulation * (at.vd - at.vs) / at.l))


def noisy(device: Device, at: Points, seed: int, noise: float = 0.01) -> Points:
    """The points with their current, each off by a normal relative error."""
    draw = np.random.default_rng(seed)
    exact = current(device, at)
    measured = exact * (1 + noise * draw.standard_normal(len(exact)))
    return Points(at.vg, at.vs, at.vd, at.w, at.l, at.temperature, measured)


def write(path: Path, at: Points, columns: tuple[str, ...] = ("vg", "vs", "vd", "id", "w", "l", "temperature")) -> Path:
    """The points as a table with the contract's columns."""
    with path.open("w", newline="", encoding="utf-8") as file:
        writer = csv.writer(file)
        writer.writerow(columns)
        writer.writerows(zip(*(map(repr, map(float, getattr(at, name))) for name in columns), strict=True))
    return path
