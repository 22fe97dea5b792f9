"""A project of many sheets to measure on: all stages, both polarities, both kinds of current source, ranges and links.

Invented, and the same for the same numbers. The sheets are as a team writes them: most of an amplifier's stages, values
with their source and trust, four to six targets, a range in every third, a value from another sheet in every fifth,
evidence in two of five, and as long as those of the sample project.
"""

from __future__ import annotations

import random
from pathlib import Path

from worksheet.model.resources import data_folder

CONDITIONS = {
    27: (
        ["typical", "slow", "fast"],
        ["-40 °C", "27 °C", "125 °C"],
        ["1.62 V", "1.8 V", "1.98 V"],
    ),
    125: (
        ["typical", "slow", "fast", "n_slow_p_fast", "n_fast_p_slow"],
        ["-40 °C", "0 °C", "27 °C", "85 °C", "125 °C"],
        ["1.62 V", "1.7 V", "1.8 V", "1.9 V", "1.98 V"],
    ),
}
"""Corners, temperatures and supplies by the number of their combinations."""

_STAGES = ("source-follower", "common-source", "common-gate", "drain-follower", "cascode")
_DRAIN_OUTPUTS = ("common-source", "common-gate", "cascode")
_OTHER = {"nfet": "pfet", "nfet_deep": "pfet", "pfet": "nfet"}
_SPECIFIC = {"nfet": 0.501e-6, "nfet_deep": 0.501e-6, "pfet": 0.122e-6}
_STEP, _RANGE, _LINK, _FIGURE, _RESISTANCE, _EVIDENCE = 0.15, 0.33, 0.2, 0.2, 0.1, 0.4
"""How many of the sheets have a step, a range, a link, a figure, a resistance before the input, evidence."""


def write(folder: Path, sheets: int, conditions: int) -> Path:
    """Write a project.

    Args:
        folder: Where; must not exist.
        sheets: How many.
        conditions: A key of CONDITIONS.
    Returns: the folder
    """
    (folder / "process").mkdir(parents=True)
    (folder / "sheets").mkdir()
    sample = data_folder("sample_projects") / "tide_gauge" / "process" / "quay_180.toml"
    (folder / "process" / "quay_180.toml").write_bytes(sample.read_bytes())
    corners, temperatures, supplies = (_listed(values) for values in CONDITIONS[conditions])
    (folder / "biasbook.toml").write_text(
        f"""schema = 1
title = "Many sheets"
owner = "nobody"
process = "quay_180"

[conditions]
process = {corners}
temperature = {temperatures}
supply = {supplies}
nominal = {{ process = "typical", temperature = "27 °C", supply = "1.8 V" }}

[budget]
supply_current = {{ max = "{sheets * 50} uA" }}
gate_area = {{ max = "{sheets * 200} um^2" }}
""",
        "utf-8",
    )
    rng = random.Random(sheets)
    for number in range(sheets):
        (folder / "sheets" / f"block_{number:04d}.toml").write_text(_sheet(rng, number), "utf-8")
    return folder


def _listed(values: list[str]) -> str:
    return "[" + ", ".join(f'"{value}"' for value in values) + "]"


def _sheet(rng: random.Random, number: int) -> str:
    stage = _STAGES[number % len(_STAGES)]
    device = rng.choice(("nfet", "pfet", "nfet_deep" if number % 4 == 0 else "nfet"))
    bulk = "source" if device in ("nfet_deep", "pfet") and rng.random() < 0.4 else "rail"
    transistor = rng.random() < 0.6
    bias = device if stage not in _DRAIN_OUTPUTS else _OTHER[device]
    length, inversion = rng.choice((0.36, 0.5, 0.8, 1.0)), 10 ** rng.uniform(-1.5, 0.8)
    width = round(rng.uniform(2, 60), 2)
    current = _SPECIFIC[device] * width / length * inversion
    lines = [
        f"# Block {number} of the benchmark: what it drives, what limits it and what was agreed stands beside.",
        "schema = 1",
        f'title = "Block {number}"',
        f'stage = "{stage}"',
        f'device = "{device}"',
        f'bulk = "{bulk}"',
        f"count = {rng.choice((1, 1, 1, 2, 8))}",
        'owner = "nobody"',
        'state = "draft"',
        'notes = """',
        "First sizes, from the inversion that the noise allows; the layout has not been drawn.",
        'To be looked at again when the load is known."""',
        "",
        "[bias]",
        f'device = "{bias if transistor else "ideal"}"',
    ]
    if not transistor:
        lines += [f'output_conductance = "{current * 0.04 * 1e9:.3f} nS"', 'capacitance = "12 fF"']
    lines += ["", "[assume]", _load(rng, number)]
    if rng.random() < _STEP:
        lines.append('step_size = { value = "20 mV", source = "signal range", trust = "guess" }')
    if rng.random() < _RESISTANCE:
        lines.append('drive_resistance = { value = "5 kohm", source = "sensor", trust = "estimate" }')
    if bulk == "source":
        lines.append('well_capacitance = { value = "60 fF", source = "layout sketch", trust = "guess" }')
    if rng.random() < 0.3:
        lines.append('bias_overhead = { value = 0.1, source = "bias cell", trust = "estimate" }')
    if rng.random() < 0.2:
        lines.append("bias_temperature_exponent = 1.0")
    figure = rng.random() < _FIGURE
    if figure:
        lines += ["", "[own]", 'sample_rate = { value = "40 kHz", source = "specification", trust = "agreed" }']
    lines += ["", "[choose]", f'bias_current = "{current * 1e6:.4g} uA"', f'width = "{width} um"']
    lines.append(f'length = "{length} um"')
    if stage == "cascode":
        lines += [f'cascode_width = "{width} um"', f'cascode_length = "{length} um"']
    if transistor:
        bias_length = 1.0
        lines += [
            f'bias_width = "{max(0.24, round(current / _SPECIFIC[bias] * bias_length / 2, 2))} um"',
            f'bias_length = "{bias_length} um"',
        ]
    return "\n".join([*lines, "", "[target]", *_targets(rng, stage, current, figure), *_evidence(rng)]) + "\n"


def _evidence(rng: random.Random) -> list[str]:
    if rng.random() > _EVIDENCE:
        return []
    return [
        "",
        "[[evidence]]",
        'metric = "bandwidth"',
        f'value = "{rng.uniform(0.2, 3):.3g} MHz"',
        'found_by = "simulation"',
        "dated = 2026-10-21",
        'basis = "9f2c61d0a3be"',
        'at = { process = "slow", temperature = "125 °C", supply = "1.62 V" }',
        'by = "nobody"',
        'reference = "run 118, netlist tag r3"',
    ]


def _load(rng: random.Random, number: int) -> str:
    load = round(rng.uniform(0.3, 4.0), 2)
    if number and rng.random() < _LINK:
        other = f"block_{rng.randrange(max(0, number - 20), number):04d}"
        wanted = rng.choice(("input_capacitance", "input_capacitance", "load_capacitance"))
        formula = f"2*{other}.{wanted} + {load / 10:.3g}e-12"
        return f'load_capacitance = {{ formula = "{formula}", source = "next block", trust = "estimate" }}'
    ends = f', low = "{load * 0.8:.4g} pF", high = "{load * 1.3:.4g} pF"' if rng.random() < _RANGE else ""
    return f'load_capacitance = {{ value = "{load} pF"{ends}, source = "floor plan", trust = "estimate" }}'


def _targets(rng: random.Random, stage: str, current: float, figure: bool) -> list[str]:
    gain = {"source-follower": 'min = 0.6, max = "1"', "drain-follower": "max = 0.05"}.get(stage, 'min = "20 dB"')
    gain = gain.replace(chr(34) + "1" + chr(34), "1.0")
    speed, power = f"{10 ** rng.uniform(3.5, 6):.3g} Hz", f"{current * 1e6 * rng.uniform(1.9, 3):.4g} uW"
    asked, noise = rng.randrange(100), rng.choice((200, 500, 1500))
    why = 'guard = 0.05, why = "two time constants within a sample"'
    lines = [
        f'dc_gain = {{ {gain}, id = "B-{asked}" }}',
        f'bandwidth = {{ min = "{speed}", source = "system specification", {why} }}',
        f'power = {{ max = "{power}", id = "P-{asked}", source = "power budget, revision C" }}',
        f'output_noise = {{ max = "{noise} uV", at = "nominal", source = "noise budget, revision C" }}',
    ]
    if rng.random() < 0.5:
        lines.append('offset_limit = { max = "15 mV", yield = 0.997 }')
    if rng.random() < 0.5:
        lines.append('output_swing = { min = "0.6 V" }')
    if figure:
        lines.append('conversions = { formula = "bandwidth/sample_rate", min = 2, why = "settles within the sample" }')
    return lines
