"""Curves of the devices that a process file says were fitted, with the tables beside them where they are at hand."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from hashlib import sha256
from pathlib import Path
from typing import Any

import numpy as np

from worksheet.model.sheet import DeviceModel, Process
from worksheet.project.discover import EVIDENCE
from worksheet.report.handoff.material import Fit
from worksheet.sheetfile.paths import inside

_GATES = 61
_CURVES = 3
_MOST_BYTES = 20_000_000
_AT_SOURCE = 1e-3

Points = Mapping[float, Sequence[tuple[float, float]]]
"""(gate-source voltage [V], current [A]) by drain-source voltage [V]."""


def fits_of(root: Path, process: Process) -> Iterator[Fit]:
    """Every fitted device of a process file, drawn at zero source voltage."""
    for name, stated in process.fitted.items():
        model = process.devices.get(name)
        if model is not None:
            yield _fit(root, process, model, stated)


def _fit(root: Path, process: Process, model: DeviceModel, stated: Mapping[str, Any]) -> Fit:
    from worksheet.extract import curves
    from worksheet.extract.law import Reference

    numbers = {key: one.number for key, one in model.values.items() if one.number is not None}
    top = float(stated.get("drain_voltage_high") or numbers["max_voltage"])
    found = _tables(root, model, stated)
    measured, width, length, temperature = found or (
        {},
        max(float(stated.get("length_high") or numbers["drain_coupling_length"]), numbers["min_width"]),
        float(stated.get("length_high") or numbers["drain_coupling_length"]),
        process.reference_temperature,
    )
    across = sorted(measured) or [top / 2**k for k in reversed(range(_CURVES))]
    ends = [v for rows in measured.values() for v, _ in rows] or [0.0, top]
    gate = np.linspace(min(ends), max(ends), _GATES)
    values = curves.law_values(numbers, {})
    reference = Reference(process.reference_temperature, numbers["drain_coupling_length"])
    currents = {}
    for volts in across:
        rows = curves.grid(gate.tolist(), [0.0], [volts], width=width, length=length, temperature=temperature)
        currents[volts] = np.array([row[3] for row in curves.implied(values, rows, reference)])
    return Fit(model.name, model.polarity, stated, gate, currents, measured, width, length)


def _tables(root: Path, model: DeviceModel, stated: Mapping[str, Any]) -> tuple[Points, float, float, float] | None:
    """Rows of the fitted tables at zero source voltage, of the first size and temperature in them; None for none.

    A table counts only where it lies in the project and is the version that was fitted.
    """
    from worksheet.extract.extraction import Request, read_rows

    names = [part.strip() for part in str(stated.get("files", "")).split(",") if part.strip()]
    digests = str(stated.get("digest", ""))
    paths = [path for name in names if (path := _at_hand(root, name, digests)) is not None]
    if not paths:
        return None
    rows, _, problems = read_rows(paths, [path.name for path in paths], Request(polarity=model.polarity))
    if rows is None or problems or not len(rows) or not np.isfinite([rows.width[0], rows.length[0]]).all():
        return None
    alike = np.isclose(rows.source, 0.0, atol=_AT_SOURCE) & (rows.current > 0)
    for axis in (rows.width, rows.length, rows.temperature):
        alike &= np.isclose(axis, axis[0], rtol=1e-6)
    across = np.round(rows.drain[alike], 4)
    levels, counts = np.unique(across[across > 0], return_counts=True)
    chosen = sorted(float(levels[k]) for k in np.argsort(-counts, kind="stable")[:_CURVES])
    gates, currents = rows.gate[alike], rows.current[alike]
    measured = {
        volts: [(float(g), float(i)) for g, i in zip(gates[across == volts], currents[across == volts], strict=True)]
        for volts in chosen
    }
    return (measured, float(rows.width[0]), float(rows.length[0]), float(rows.temperature[0])) if measured else None


def _at_hand(root: Path, name: str, digests: str) -> Path | None:
    """A fitted table within the project, or None where it is not there or is another version."""
    for path in (root / name, root / EVIDENCE / Path(name).name):
        try:
            if not inside(root, path) or not path.is_file() or path.stat().st_size > _MOST_BYTES:
                continue
            if sha256(path.read_bytes()).hexdigest() in digests:
                return path
        except (OSError, ValueError):
            continue
    return None
