"""The closed forms of section 2 for the four one-transistor stages, written down once more without any matrix.

They hold without a drive resistance. `tests/precision/test_reference.py` lays them beside the nodal route.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

from mpmath import mp, mpf

from tests.precision.reference_device import Point, Real
from tests.precision.reference_levels import SOURCE_OUTPUTS, Bench


@dataclass(frozen=True)
class OneNode:
    """Row of the stage table: H(s) = (driving + s feed) / (conductance + s capacitance)."""

    driving: Real
    feed: Real
    conductance: Real
    capacitance: Real
    input_capacitance: Real
    from_supply: Real | None


def one_node(b: Bench, devices: dict[str, Point], sheet: dict[str, Any]) -> OneNode:
    main, bias = devices["main"], devices.get("bias")
    load = mpf(b.assume.get("load_capacitance", sheet["choose"].get("load_capacitance")))
    if bias is None:
        lead = mpf(sheet["bias"].get("output_conductance", 0.0))
        load += mpf(sheet["bias"].get("capacitance", 0.0))
    else:
        lead = bias.drain_conductance
        load += bias.gate_drain + bias.drain_bulk
    gm, gd = main.transconductance, main.drain_conductance
    gs, gb = main.source_conductance, main.bulk_conductance
    gate_source, gate_bulk, source_bulk = main.gate_source, main.gate_bulk, main.source_bulk
    drain_source = well = mpf(0)
    drain_bulk = main.drain_bulk
    if b.own_bulk:
        gs, gb = gm + gd, mpf(0)
        gate_source, gate_bulk = gate_source + gate_bulk, mpf(0)
        source_bulk = mpf(0)
        drain_source, drain_bulk = drain_bulk, mpf(0)
        well = mpf(b.assume.get("well_capacitance", 0.0))
    n = b.polarity == "n"
    if b.stage in SOURCE_OUTPUTS:
        g, c = gs + lead, load + gate_source + source_bulk + drain_source + well
        if b.stage == "source-follower":
            gate = main.gate_drain + gate_bulk + gate_source * (1 - gm / g)
            return OneNode(gm, gate_source, g, c, gate, gd if n else gb + lead)
        return OneNode(gd, drain_source, g, c, main.gate_drain + drain_bulk + drain_source, None)
    g, c = gd + lead, load + main.gate_drain + drain_bulk + drain_source
    if b.stage == "common-source":
        gate = gate_source + gate_bulk + main.gate_drain * (1 + gm / g)
        return OneNode(-gm, main.gate_drain, g, c, gate, lead if n else gm + gd)
    entry = gate_source + source_bulk + drain_source + well
    return OneNode(gs, drain_source, g, c, entry, lead if n else gm + gb)


def closed_metrics(b: Bench, devices: dict[str, Point], row: OneNode) -> dict[str, Any]:
    """Metrics that have a closed form; a value that does not exist is None."""
    a, f, g, c = row.driving, row.feed, row.conductance, row.capacitance
    gain, tau = abs(a / g), c / g
    white = sum(point.white_noise for point in devices.values())
    variance = sum(point.mismatch for point in devices.values())
    tolerance = mpf(b.assume.get("settling_tolerance", 1e-3))
    jump = (f / c) / (a / g)
    high = f / c

    def crossing(level: Real) -> Real | None:
        """abs(H) = level: (a^2 + x f^2) = level^2 (g^2 + x c^2)."""
        slope, start = (level * c) ** 2 - f**2, a**2 - (level * g) ** 2
        return mp.sqrt(start / slope) / (2 * mp.pi) if slope > 0 and start > 0 else None

    return {
        "dc_gain": gain,
        "pole_frequency": 1 / (2 * mp.pi * tau),
        "bandwidth": crossing(gain / mp.sqrt(2)),
        "unity_gain_frequency": crossing(mpf(1)) if gain > 1 else None,
        "output_resistance": 1 / g,
        "input_capacitance": row.input_capacitance,
        "supply_rejection": abs(a / row.from_supply) if row.from_supply else None,
        "slew_rate": b.current / c,
        "settling_time": max(mpf(0), tau * mp.log(abs(1 - jump) / tolerance)),
        "noise_density": mp.sqrt(white) / (g * gain),
        "white_output_noise": mp.sqrt(white / (4 * g * c)),
        "offset": mp.sqrt(variance) / (g * gain),
        "peaking": max(mpf(1), abs(high) / gain),
    }
