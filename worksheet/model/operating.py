"""Every operating-point value of a transistor, described once: key, unit, symbol, meaning."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass

from worksheet.model import dimension as dim
from worksheet.model.dimension import Dimension


@dataclass(frozen=True, slots=True)
class OperatingValue:
    """One value of a transistor's operating point. `attribute` is its name in engine.operating.Operating."""

    key: str
    title: str
    symbol: str
    dimension: Dimension
    help: str


OPERATING_POINT = (
    OperatingValue("current", "Drain current", "I", dim.CURRENT, "Current through the channel."),
    OperatingValue(
        "inversion_coefficient",
        "Inversion coefficient",
        "IC",
        dim.NUMBER,
        "Current over specific current: below 0.1 weak, above 10 strong.",
    ),
    OperatingValue(
        "specific_current", "Specific current", "I_spec", dim.CURRENT, "I_sq W/L at this temperature and corner."
    ),
    OperatingValue(
        "transconductance", "Gate transconductance", "g_m", dim.CONDUCTANCE, "Slope of current against gate voltage."
    ),
    OperatingValue(
        "source_conductance", "Source conductance", "g_s", dim.CONDUCTANCE, "Slope of current against source voltage."
    ),
    OperatingValue(
        "drain_conductance", "Drain conductance", "g_d", dim.CONDUCTANCE, "Slope of current against drain voltage."
    ),
    OperatingValue(
        "bulk_conductance", "Bulk conductance", "g_b", dim.CONDUCTANCE, "Slope of current against bulk voltage."
    ),
    OperatingValue(
        "transconductance_efficiency",
        "Transconductance efficiency",
        "g_m/I",
        dim.PER_VOLTAGE,
        "Gate transconductance for the current spent.",
    ),
    OperatingValue(
        "transit_frequency", "Transit frequency", "f_T", dim.FREQUENCY, "g_m over 2 pi times the gate's capacitances."
    ),
    OperatingValue(
        "gate_source_capacitance", "Gate-source capacitance", "c_gs", dim.CAPACITANCE, "Channel share and overlap."
    ),
    OperatingValue("gate_drain_capacitance", "Gate-drain capacitance", "c_gd", dim.CAPACITANCE, "Overlap."),
    OperatingValue(
        "gate_bulk_capacitance", "Gate-bulk capacitance", "c_gb", dim.CAPACITANCE, "What the channel does not screen."
    ),
    OperatingValue(
        "source_bulk_capacitance",
        "Source-bulk capacitance",
        "c_sb",
        dim.CAPACITANCE,
        "Junction and depletion under the channel.",
    ),
    OperatingValue("drain_bulk_capacitance", "Drain-bulk capacitance", "c_db", dim.CAPACITANCE, "Junction."),
    OperatingValue(
        "saturation_voltage",
        "Saturation voltage",
        "V_DSsat",
        dim.VOLTAGE,
        "Least drain-source voltage of a saturated device.",
    ),
    OperatingValue(
        "headroom",
        "Headroom",
        "V_DS - V_DSsat",
        dim.VOLTAGE,
        "Drain-source voltage beyond the saturation voltage and the margin wanted.",
    ),
    OperatingValue(
        "reverse_share",
        "Reverse share",
        "q_d/(sigma q_s)",
        dim.NUMBER,
        "By how much the drain conductance is understated so near the edge of saturation.",
    ),
    OperatingValue("gate_voltage", "Gate voltage", "V_G", dim.VOLTAGE, "Voltage of the gate, from ground."),
    OperatingValue("source_voltage", "Source voltage", "V_S", dim.VOLTAGE, "Voltage of the source, from ground."),
    OperatingValue("drain_voltage", "Drain voltage", "V_D", dim.VOLTAGE, "Voltage of the drain, from ground."),
    OperatingValue(
        "gate_source_voltage",
        "Gate-source voltage",
        "V_GS",
        dim.VOLTAGE,
        "Between gate and source; a magnitude for p-channel devices too.",
    ),
    OperatingValue("width", "Width", "W", dim.LENGTH, "Total channel width."),
    OperatingValue("length", "Length", "L", dim.LENGTH, "Channel length."),
)
"""All of them, in the order of a table. The region (weak, moderate, strong) goes with the inversion coefficient."""

WEAK_BELOW, STRONG_ABOVE = 0.1, 10.0
"""Inversion coefficients that bound moderate inversion."""


def region(inversion: float) -> str:
    """Name the region of inversion of an inversion coefficient [-]: "weak", "moderate" or "strong"."""
    if inversion < WEAK_BELOW:
        return "weak"
    return "strong" if inversion > STRONG_ABOVE else "moderate"


def find(key: str) -> OperatingValue | None:
    """The operating-point value of that key, or None."""
    return next((value for value in OPERATING_POINT if value.key == key), None)


def named(devices: Iterable[str]) -> dict[str, Dimension]:
    """Every value of some devices as DEVICE.VALUE ("main.inversion_coefficient"), with what it measures."""
    return {f"{device}.{value.key}": value.dimension for device in devices for value in OPERATING_POINT}
