"""The other way: currents, efficiency and output conductance that a device or a corner implies, to lay over others.

The law is the one that tables are fitted with, so curves of a fresh fit run through the table it came from.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence

import numpy as np

from worksheet.device.arrays import Array
from worksheet.extract.data import Rows
from worksheet.extract.law import AT, OFF, Reference, bias_slopes, log_current, log_specific

COLUMNS = (
    "vg",
    "vs",
    "vd",
    "id",
    "w",
    "l",
    "temperature",
    "inversion_coefficient",
    "transconductance",
    "transconductance_efficiency",
    "drain_conductance",
    "source_conductance",
)
"""Heading of each column, SI: the contract's own, which `extract` reads back, then what follows from them."""


def law_values(device: Mapping[str, float], changes: Mapping[str, float]) -> Array:
    """A device of the process file, in a corner, as the law's parameters. [see law.NAMES]

    Args:
        device: Parameters of process_keys by name. [unit of the key]
        changes: Changes of process_keys.CORNER_CHANGES by name; shifts add, factors multiply.
    """
    values = OFF.copy()
    psi = device.get("surface_potential", 0.0)
    table = {
        "kappa": device["kappa"] + changes.get("kappa_shift", 0.0),
        "threshold": device["threshold"] + changes.get("threshold_shift", 0.0),
        "log_current": float(np.log(device["specific_current"] * changes.get("specific_current_factor", 1.0))),
        "drain_coupling": device["drain_coupling"] * changes.get("drain_coupling_factor", 1.0),
        "inverse_potential": 1.0 / psi if psi > 0.0 else 0.0,
        "length_modulation": device.get("length_modulation", 0.0),
        "velocity_length": device.get("velocity_length", 0.0),
        "drain_coupling_exponent": device["drain_coupling_exponent"],
        "threshold_drift": device["threshold_drift"],
        "mobility_exponent": device["mobility_exponent"],
    }
    for name, value in table.items():
        values[AT[name]] = value
    return values


def grid(
    gate: Sequence[float],
    source: Sequence[float],
    across: Sequence[float],
    *,
    width: float,
    length: float,
    temperature: float,
) -> Rows:
    """Gate sweeps at every source and drain-source voltage; current not filled in.

    Args:
        gate: V_G from the source's own voltage. [V]
        source: V_S. [V]
        across: V_DS. [V]
        width, length: [m]
        temperature: [K]
    """
    points = np.array([(g + s, s, s + d) for s in source for d in across for g in gate], dtype=np.float64)
    points = points.reshape(len(points), 3)
    full = np.full(len(points), 1.0)
    gates, sources, drains = points.T
    return Rows(gates, sources, drains, np.zeros(len(points)), width * full, length * full, temperature * full)


def implied(values: Array, rows: Rows, reference: Reference, *, polarity: str = "n") -> Iterator[tuple[float, ...]]:
    """The curves that parameters imply, one tuple of COLUMNS a point.

    Args:
        values: Parameters. [see law.NAMES]
        rows: Biases, sizes and temperatures; the current is not looked at.
        reference: Where the parameters are stated.
        polarity: "p" gives voltages and current their signs; conductances are positive for both.
    """
    level = log_current(values, rows, reference)
    current = np.exp(level)
    by_gate, by_source, by_drain = bias_slopes(values, rows, reference)
    inversion = np.exp(level - log_specific(values, rows, reference))
    sign = -1.0 if polarity == "p" else 1.0
    table = (
        sign * rows.gate,
        sign * rows.source,
        sign * rows.drain,
        sign * current,
        rows.width,
        rows.length,
        rows.temperature,
        inversion,
        current * by_gate,
        by_gate,
        current * by_drain,
        -current * by_source,
    )
    for row in zip(*table, strict=True):
        yield tuple(float(cell) + 0.0 for cell in row)
