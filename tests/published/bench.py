"""A project of one sheet at one condition, from the few numbers that a published example gives."""

from __future__ import annotations

from pathlib import Path
from typing import Any

from tests.documents import Document, to_toml
from tests.support import only_sheet, review

BOLTZMANN = 1.380649e-23  # CODATA 2018, exact
ELEMENTARY_CHARGE = 1.602176634e-19  # CODATA 2018, exact

DEVICE: Document = {
    "own_well": True,
    "kappa": 1.0,
    "threshold": 0.4,
    "specific_current": 5e-7,
    "drain_coupling": 0.0,
    "drain_coupling_length": 1e-6,
    "drain_coupling_exponent": 1.0,
    "gate_capacitance": 1e-9,
    "overlap_capacitance": 0.0,
    "junction_capacitance": 0.0,
    "flicker": 0.0,
    "flicker_exponent": 1.0,
    "matching_threshold": 5e-9,
    "matching_factor": 1e-8,
    "threshold_drift": 0.0,
    "mobility_exponent": 0.0,
    "min_length": 1e-8,
    "max_length": 1e-3,
    "min_width": 1e-8,
    "max_width": 1.0,
    "grid": 1e-9,
    "max_voltage": 30.0,
}
"""What an example leaves open: no parasitics, no drain coupling, a gate capacitance too small to matter."""


def temperature_of(thermal_voltage: float) -> float:
    """The temperature at which a source's thermal voltage holds. [K]"""
    return thermal_voltage * ELEMENTARY_CHARGE / BOLTZMANN


def solved(
    folder: Path,
    stage: str,
    choose: Document,
    *,
    assume: Document | None = None,
    bias: Document | None = None,
    bulk: str = "rail",
    device: Document | None = None,
    bias_device: Document | None = None,
    temperature: float = 300.0,
    supply: float = 10.0,
    targets: Document | None = None,
    own: Document | None = None,
) -> dict[str, Any]:
    """The reviewed sheet of an n-channel stage.

    Args:
        folder: An empty folder.
        stage: Key of the stage.
        choose: The table [choose]; a load of 1 pF is added where it states none.
        assume: The table [assume].
        bias: The table [bias]; an ideal source where left out.
        bulk: rail or source.
        device: Parameters of nfet that differ from DEVICE.
        bias_device: Likewise of pfet.
        temperature: Of the condition and of the process's reference. [K]
        supply: [V]
        targets: Targets by name.
        own: Names of the sheet's own.

    """
    nominal = {"process": "typical", "temperature": temperature, "supply": supply}
    project: Document = {
        "schema": 1,
        "title": "A published example",
        "process": "published",
        "conditions": {key: [value] for key, value in nominal.items()} | {"nominal": nominal},
    }
    process: Document = {
        "schema": 1,
        "title": "A published example",
        "reference_temperature": temperature,
        "device": {
            "nfet": {"polarity": "n"} | DEVICE | (device or {}),
            "pfet": {"polarity": "p"} | DEVICE | (bias_device or {}),
        },
    }
    sheet: Document = {
        "schema": 1,
        "title": "A published example",
        "stage": stage,
        "device": "nfet",
        "bulk": bulk,
        "bias": bias or {"device": "ideal"},
        "assume": assume or {},
        "own": own or {},
        "choose": {"load_capacitance": 1e-12} | choose,
        "target": targets or {},
    }
    return only_sheet(review(folder, to_toml(project), to_toml(process), {"example": to_toml(sheet)}))


def metric(sheet: dict[str, Any], key: str) -> float:
    """A metric at the nominal condition; that it exists is part of the check."""
    value = sheet["metrics"][key]["value"]
    assert value is not None, f"{key}: {sheet['metrics'][key]}"
    return float(value)


def point(sheet: dict[str, Any], key: str, device: str = "main") -> float:
    """A value of a device's operating point."""
    return float(sheet["operating_point"][device][key])
