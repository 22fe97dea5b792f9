"""Random projects, as the plain documents of the file contract, all numbers bare and in SI base units."""

from __future__ import annotations

import random

from tests.documents import Document
from tests.precision.reference import evaluate

STAGES = ("source-follower", "common-source", "common-gate", "drain-follower", "cascode")
DRAIN_OUTPUTS = ("common-source", "common-gate", "cascode")
NOMINAL_TEMPERATURE = 300.15

CAPACITANCES = ("gate_capacitance", "overlap_capacitance", "junction_capacitance", "flicker")
"""What to put to 0 for a device without capacitance; flicker is referred to the gate capacitance."""


def rounded(value: float) -> float:
    return float(f"{value:.5g}")


def spread(rng: random.Random, low: float, high: float) -> float:
    """Evenly over the logarithm."""
    return rounded(low * (high / low) ** rng.random())


def even(rng: random.Random, low: float, high: float) -> float:
    return rounded(rng.uniform(low, high))


def some(rng: random.Random, share: float, value: float, otherwise: float = 0.0) -> float:
    return value if rng.random() < share else otherwise


def draw_device(rng: random.Random, polarity: str, max_voltage: float) -> Document:
    result: Document = {
        "polarity": polarity,
        "own_well": True,
        "kappa": even(rng, 0.6, 0.86),
        "threshold": even(rng, 0.25, 0.55),
        "specific_current": spread(rng, 1e-7, 1e-6),
        "drain_coupling": some(rng, 0.93, spread(rng, 2e-3, 4e-2)),
        "drain_coupling_length": spread(rng, 1.3e-7, 1e-6),
        "drain_coupling_exponent": even(rng, 0.5, 1.5),
        "gate_capacitance": spread(rng, 3e-3, 1.6e-2),
        "overlap_capacitance": some(rng, 0.93, spread(rng, 1e-10, 5e-10)),
        "junction_capacitance": spread(rng, 3e-10, 1.5e-9),
        "flicker": some(rng, 0.85, spread(rng, 3e-26, 3e-23)),
        "flicker_exponent": some(rng, 0.5, even(rng, 0.8, 1.2), 1.0),
        "matching_threshold": spread(rng, 2e-9, 8e-9),
        "matching_factor": spread(rng, 5e-9, 2e-8),
        "threshold_drift": even(rng, 2e-4, 1.2e-3),
        "mobility_exponent": even(rng, 0.9, 2.1),
        "min_length": 1e-7,
        "max_length": 1e-4,
        "min_width": 1e-7,
        "max_width": 0.1,
        "grid": 5e-9,
        "max_voltage": max_voltage,
    }
    for key, share, low, high in (
        ("length_modulation", 0.45, 1e-9, 6e-8),
        ("surface_potential", 0.35, 0.5, 1.1),
        ("velocity_length", 0.3, 5e-9, 1e-7),
    ):
        if rng.random() < share:
            result[key] = spread(rng, low, high)
    return result


def draw_corner(rng: random.Random, slow: bool) -> Document:
    side = 1 if slow else -1
    changes: Document = {
        "threshold_shift": rounded(side * rng.uniform(0.005, 0.05)),
        "specific_current_factor": rounded(1 - side * rng.uniform(0.02, 0.2)),
        "drain_coupling_factor": even(rng, 0.8, 1.25),
        "kappa_shift": rounded(rng.uniform(-0.02, 0.02)),
        "capacitance_factor": rounded(1 + side * rng.uniform(0.01, 0.1)),
    }
    return {key: value for key, value in changes.items() if rng.random() < 0.8}


def draw(
    rng: random.Random, stage: str, polarity: str, source: str, *, want_invalid: bool
) -> tuple[Document, Document, Document]:
    """A project, its process and one sheet; nothing is promised about its validity."""
    inversion = spread(rng, 1e-4, 1e3)
    supply = spread(rng, 1.0, 5.5)
    limit = rounded(supply * (rng.uniform(0.7, 1.3) if want_invalid else rng.uniform(1.3, 2.5)))
    corner = rng.choice(("slow", "fast"))
    names = {"n": "nfet", "p": "pfet"}
    process: Document = {
        "schema": 1,
        "title": "Drawn at random",
        "reference_temperature": some(rng, 0.7, 300.15, even(rng, 290.0, 310.0)),
        "device": {names[kind]: draw_device(rng, kind, limit) for kind in ("n", "p")},
        "corner": {corner: {names[kind]: draw_corner(rng, corner == "slow") for kind in ("n", "p")}},
    }
    temperatures = [even(rng, 233.15, 290.0), even(rng, 310.0, 398.15)]
    project: Document = {
        "schema": 1,
        "title": "Drawn at random",
        "process": "drawn",
        "conditions": {
            "process": [some_text(rng, 0.85, corner, "typical")],
            "temperature": temperatures,
            "supply": [rounded(supply * rng.uniform(0.88, 1.12))],
            "nominal": {"process": "typical", "temperature": NOMINAL_TEMPERATURE, "supply": supply},
        },
    }
    sheet = draw_sheet(rng, process, stage, polarity, source, inversion, supply)
    add_dynamics(rng, process, sheet, project["conditions"]["nominal"])
    return project, process, sheet


def some_text(rng: random.Random, share: float, value: str, otherwise: str) -> str:
    return value if rng.random() < share else otherwise


def draw_sheet(
    rng: random.Random, process: Document, stage: str, polarity: str, source: str, inversion: float, supply: float
) -> Document:
    names = {"n": "nfet", "p": "pfet"}
    name = names[polarity]
    other = names["p" if polarity == "n" else "n"] if stage in DRAIN_OUTPUTS else name
    per_square = process["device"][name]["specific_current"]
    length = spread(rng, 1.5e-7, 5e-6)
    width = spread(rng, 3e-7, 2e-2)
    current = rounded(per_square * width / length * inversion)
    own_bulk = rng.random() < 0.35
    choose: Document = {"bias_current": current, "width": width, "length": length}
    if stage == "cascode":
        choose["cascode_length"] = spread(rng, 1.5e-7, 3e-6)
        ratio = current / per_square / spread(rng, 1e-3, 30.0)
        choose["cascode_width"] = rounded(ratio * choose["cascode_length"])
    bias: Document = {"device": "ideal"}
    if source == "transistor":
        bias["device"] = other
        choose["bias_length"] = spread(rng, 2e-7, 5e-6)
        ratio = current / process["device"][other]["specific_current"] / spread(rng, 5e-3, 50.0)
        choose["bias_width"] = rounded(ratio * choose["bias_length"])
    else:
        slope = current / 0.026
        bias["output_conductance"] = some(rng, 0.75, rounded(slope * spread(rng, 1e-5, 3e-2)))
        bias["capacitance"] = some(rng, 0.6, spread(rng, 1e-15, 2e-13))
    assume: Document = {}
    for key, share, value in (
        ("well_capacitance", 0.5 if own_bulk else 0.0, spread(rng, 1e-14, 5e-13)),
        ("bias_overhead", 0.3, even(rng, 0.05, 1.0)),
        ("bias_temperature_exponent", 0.4, some(rng, 0.5, 1.0, even(rng, 0.2, 1.6))),
        ("saturation_margin", 0.3, even(rng, 0.01, 0.08)),
        ("settling_tolerance", 0.4, spread(rng, 1e-5, 3e-2)),
        ("noise_from", 0.4, spread(rng, 1e-2, 1e3)),
    ):
        if rng.random() < share:
            assume[key] = value
    load = spread(rng, 1e-15, 3e-11)
    (assume if rng.random() < 0.5 else choose)["load_capacitance"] = load
    draw_levels(rng, stage, polarity, supply, assume)
    return {
        "schema": 1,
        "title": "Drawn at random",
        "stage": stage,
        "device": name,
        "bulk": "source" if own_bulk else "rail",
        "bias": bias,
        "assume": assume,
        "choose": choose,
    }


def draw_levels(rng: random.Random, stage: str, polarity: str, supply: float, assume: Document) -> None:
    """Levels as a fraction of the supply, drawn where the stage is likely to be saturated."""

    def level(low: float, high: float) -> float:
        share = rng.uniform(low, high)
        return rounded(supply * (share if polarity == "n" else 1 - share))

    if stage == "source-follower":
        pick = rng.random()
        if pick < 0.35:
            assume["input_level"] = level(0.45, 1.0)
        elif pick < 0.6:
            assume["output_level"] = level(0.1, 0.5)
        return
    if rng.random() < 0.45:
        assume["output_level"] = level(0.25, 0.75)
    if stage == "common-gate" and rng.random() < 0.45:
        assume["input_level"] = level(0.02, 0.4)
    if stage == "drain-follower" and rng.random() < 0.6:
        assume["input_level"] = level(0.6, 0.95)


def add_dynamics(rng: random.Random, process: Document, sheet: Document, nominal: Document) -> None:
    """A drive resistance and a step whose sizes suit the stage, so that poles interact and steps stay in range."""
    want_drive, want_step = rng.random() < 0.45, rng.random() < 0.35
    if not (want_drive or want_step):
        return
    try:
        metrics = evaluate(process, sheet, nominal, [nominal])[0].metrics
        pole, entry = float(metrics["pole_frequency"][0]), float(metrics["input_capacitance"][0])
        gain, swing = float(metrics["dc_gain"][0]), float(metrics["output_swing"][0])
    except (ArithmeticError, TypeError, ValueError):
        return
    if want_drive:
        sheet["assume"]["drive_resistance"] = rounded(spread(rng, 0.03, 30.0) / (6.28 * pole * entry))
        if sheet["stage"] in ("common-gate", "drain-follower"):
            resistance = spread(rng, 0.03, 30.0) * 0.026 / sheet["choose"]["bias_current"]
            sheet["assume"]["drive_resistance"] = rounded(resistance)
    if want_step and swing > 0 and gain > 0:
        step = min(swing / gain, nominal["supply"]) * spread(rng, 0.01, 0.5)
        sheet["assume"]["step_size"] = rounded(step)


def edge_cases() -> list[tuple[str, tuple[Document, Document, Document]]]:
    """Sheets at the edge of what exists: no output conductance, no path from the supply, no capacitance."""
    rng = random.Random(7)
    result = []
    for name, stage, polarity, own_bulk, zeros, ideal in (
        ("no output conductance", "common-source", "n", False, ("drain_coupling",), {}),
        ("no output conductance, mirrored", "common-source", "p", False, ("drain_coupling",), {}),
        ("no path from the supply", "source-follower", "n", False, ("drain_coupling",), {"output_conductance": 1e-8}),
        ("no path from the supply, own well", "source-follower", "p", True, (), {}),
        ("settled at once", "source-follower", "n", True, (), {}),
        ("no capacitance", "source-follower", "n", False, CAPACITANCES, {}),
    ):
        project, process, sheet = draw(rng, stage, polarity, "ideal", want_invalid=False)
        project["conditions"]["nominal"]["supply"] = 3.0
        project["conditions"]["supply"] = [3.2]
        for kind in process["device"].values():
            kind.update(dict.fromkeys(zeros, 0.0), max_voltage=4.0)
            for key in ("length_modulation", "surface_potential", "velocity_length"):
                kind.pop(key, None)
        sheet.update(bulk="source" if own_bulk else "rail", bias={"device": "ideal", **ideal}, assume={})
        sheet["choose"] = {"bias_current": 2e-6, "width": 1e-5, "length": 1e-6}
        sheet["assume"]["load_capacitance"] = {"no capacitance": 0.0, "settled at once": 1e-17}.get(name, 1e-12)
        if name == "settled at once":
            sheet["assume"]["settling_tolerance"] = 0.4
        result.append((f"edge: {name}", (project, process, sheet)))
    for name, stage, polarity, step in (
        ("a step beyond the range of the output", "source-follower", "p", 1.5),
        ("a step beyond the range of the input", "drain-follower", "n", 0.4),
        ("a step that takes the gate below ground", "common-source", "n", 0.5),
        ("a step that takes the gate above the supply", "cascode", "p", 0.6),
    ):
        project, process, sheet = draw(rng, stage, polarity, "ideal", want_invalid=False)
        project["conditions"]["nominal"]["supply"] = 3.0
        project["conditions"]["supply"] = [3.2]
        for kind in process["device"].values():
            kind.update(drain_coupling=0.02, drain_coupling_length=1e-6, max_voltage=4.0)
        slope = 1e-5 if stage in DRAIN_OUTPUTS else 0.0
        sheet.update(bulk="rail", bias={"device": "ideal", "output_conductance": slope})
        sheet["assume"] = {"step_size": step, "load_capacitance": 1e-12}
        sheet["choose"] = {"bias_current": 2e-7, "width": 1e-5, "length": 1e-6}
        if stage == "cascode":
            sheet["choose"].update(cascode_width=2e-5, cascode_length=1e-6)
        result.append((f"edge: {name}", (project, process, sheet)))
    return result
