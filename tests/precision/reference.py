"""The independent reference: a sheet in, every number out, at 50 digits.

Written from the formula sheet and the file contract alone, without a look at the program. It reads the documents of
a project as plain dicts, all in SI base units, and answers with mpf numbers.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

from mpmath import mp

from tests.precision.reference_device import Point, precise
from tests.precision.reference_levels import (
    Bench,
    Levels,
    bench,
    from_ground,
    held_levels,
    levels,
    points,
    validity,
)
from tests.precision.reference_measures import Metric, measures

INVERTING = ("common-source", "cascode")


@dataclass(frozen=True)
class Answer:
    """Everything about a sheet at one condition. Voltages from ground unless said otherwise."""

    condition: dict[str, Any]
    held: dict[str, Any]
    input: Any
    output: Any
    operating_point: dict[str, dict[str, Any]]
    metrics: dict[str, Metric]
    validity: list[dict[str, Any]]


@dataclass(frozen=True)
class Solved:
    """The stage at one condition, for checks that look inside."""

    bench: Bench
    levels: Levels
    devices: dict[str, Point]


def solve(
    process: dict[str, Any], sheet: dict[str, Any], nominal: dict[str, Any], condition: dict[str, Any]
) -> tuple[Solved, dict[str, Any]]:
    """Node voltages at `condition`, with the levels that `nominal` fixes."""
    precise()
    held = held_levels(bench(process, sheet, nominal, nominal))
    here = bench(process, sheet, condition, nominal)
    at = levels(here, held)
    return Solved(here, at, points(here, at)), held


def evaluate(
    process: dict[str, Any], sheet: dict[str, Any], nominal: dict[str, Any], conditions: list[dict[str, Any]]
) -> list[Answer]:
    """Every operating-point value, metric and validity entry, condition by condition.

    Args:
        process: process/NAME.toml as a dict of bare numbers.
        sheet: sheets/NAME.toml likewise.
        nominal: process, temperature, supply of the nominal condition.
        conditions: those to answer for.

    """
    answers = []
    for condition in conditions:
        solved, held = solve(process, sheet, nominal, condition)
        b, at, devices = solved.bench, solved.levels, solved.devices
        metrics = measures(b, at, devices, sheet)
        gain = mp.inf if metrics["dc_gain"][0] is None else metrics["dc_gain"][0]
        answers.append(
            Answer(
                condition=condition,
                held=held,
                input=b.ground(at.input),
                output=b.ground(at.output),
                operating_point={name: operating_point(b, name, point) for name, point in devices.items()},
                metrics=metrics,
                validity=validity(b, at, devices, -gain if b.stage in INVERTING else gain),
            )
        )
    return answers


def operating_point(b: Bench, name: str, point: Point) -> dict[str, Any]:
    """Values of section 3; voltages between terminals are magnitudes that do not know the polarity."""
    part = point.device
    gates = point.gate_source + point.gate_bulk + point.gate_drain
    values = {
        "current": part.current,
        "inversion_coefficient": part.inversion,
        "specific_current": part.specific_current,
        "transconductance": point.transconductance,
        "source_conductance": point.source_conductance,
        "drain_conductance": point.drain_conductance,
        "bulk_conductance": point.bulk_conductance,
        "transconductance_efficiency": point.transconductance / part.current,
        "transit_frequency": point.transconductance / (2 * mp.pi * gates) if gates else None,
        "gate_source_capacitance": point.gate_source,
        "gate_drain_capacitance": point.gate_drain,
        "gate_bulk_capacitance": point.gate_bulk,
        "source_bulk_capacitance": point.source_bulk,
        "drain_bulk_capacitance": point.drain_bulk,
        "saturation_voltage": part.saturation_voltage,
        "headroom": point.headroom,
        "reverse_share": point.reverse_shares()[0] if part.sigma else None,
        "reverse_share_kappa_held": point.reverse_shares()[1] if part.sigma else None,
        "gate_voltage": from_ground(b, name, point.gate),
        "source_voltage": from_ground(b, name, point.source),
        "drain_voltage": from_ground(b, name, point.drain),
        "gate_source_voltage": point.gate - point.source,
        "width": part.width,
        "length": part.length,
    }
    return values | {"region": region(part.inversion)}


def region(inversion: Any) -> str:
    if inversion < mp.mpf(1) / 10:
        return "weak"
    return "moderate" if inversion <= 10 else "strong"
