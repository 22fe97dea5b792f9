"""The yardstick: the script that a designer would write with SciPy, condition by condition, for four metrics.

python tests/bench/designer_script.py PROJECT

It reads the same files, finds gate voltage (or output level) of each stage with a root finder, and prints DC gain,
bandwidth, output noise and power of every sheet: nominal, worst and where. Nothing of biasbook is used. It is plain on
purpose: scalar arithmetic, one operating point after the other, no batches.
"""

from __future__ import annotations

import itertools
import json
import math
import sys
import tomllib
from pathlib import Path
from typing import Any

import numpy as np
from scipy.optimize import brentq

K_B, Q_E = 1.380649e-23, 1.602176634e-19
PREFIX = {"f": 1e-15, "p": 1e-12, "n": 1e-9, "u": 1e-6, "m": 1e-3, "k": 1e3, "M": 1e6}
UNITS = ("ohm", "Hz", "um", "V", "A", "F", "S", "W", "dB")
DRAIN_OUTPUTS = ("common-source", "common-gate", "cascode")


def number(raw: Any) -> float:
    """A value of the files in SI units."""
    if isinstance(raw, dict):
        raw = raw["value"]
    if not isinstance(raw, str):
        return float(raw)
    digits, _, unit = raw.partition(" ")
    value = float(digits)
    if unit == "°C":
        return value + 273.15
    special = {"mV um": 1e-9, "% um": 1e-8, "fF/um^2": 1e-3, "fF/um": 1e-9, "um/V": 1e-6, "mV/K": 1e-3, "um": 1e-6}
    if unit in special or unit == "V^2 F":
        return value * special.get(unit, 1.0)
    return value * (PREFIX[unit[0]] if unit[0] in PREFIX and unit not in UNITS else 1.0)


def device_at(process: dict[str, Any], name: str, corner: str, temperature: float) -> dict[str, float]:
    """A device's parameters at a corner and a temperature."""
    p = {k: number(v) for k, v in process["device"][name].items() if k not in ("polarity", "own_well")}
    change = {k: number(v) for k, v in process.get("corner", {}).get(corner, {}).get(name, {}).items()}
    reference = number(process["reference_temperature"])
    p["threshold"] += change.get("threshold_shift", 0.0) - p["threshold_drift"] * (temperature - reference)
    p["specific_current"] *= change.get("specific_current_factor", 1.0) * (temperature / reference) ** (
        2 - p["mobility_exponent"]
    )
    p["drain_coupling"] *= change.get("drain_coupling_factor", 1.0)
    for key in ("gate_capacitance", "overlap_capacitance", "junction_capacitance"):
        p[key] *= change.get("capacitance_factor", 1.0)
    return p


def small_signal(
    p: dict[str, float], current: float, width: float, length: float, temperature: float
) -> dict[str, float]:
    """Conductances, capacitances and noise of a saturated device."""
    thermal = K_B * temperature / Q_E
    specific = p["specific_current"] * width / length
    inversion = current / specific
    q = (math.sqrt(1 + 4 * inversion) - 1) / 2
    sigma = p["drain_coupling"] * (p["drain_coupling_length"] / length) ** p["drain_coupling_exponent"]
    g_s = specific * q / thermal
    area = width * length * p["gate_capacitance"]
    intrinsic = area * q / 3 * (2 * q + 3) / (q + 1) ** 2
    overlap = p["overlap_capacitance"] * width
    g_m = p["kappa"] * g_s
    return {
        "q": q,
        "sigma": sigma,
        "saturation": thermal * (2 * math.sqrt(inversion + 0.25) + 3),
        "g_s": g_s,
        "g_m": g_m,
        "g_d": sigma * g_s + p.get("length_modulation", 0.0) * current / length,
        "c_gs": intrinsic + overlap,
        "c_gd": overlap,
        "c_gb": (1 - p["kappa"]) * (area - intrinsic),
        "c_sb": p["junction_capacitance"] * width + (1 / p["kappa"] - 1) * intrinsic,
        "c_db": p["junction_capacitance"] * width,
        "white": 4 * K_B * temperature * (4 * q + 3) / (6 * (q + 1)) * g_s,
        "flicker": g_m**2 * p["flicker"] / area,
    }


def drain_current(
    p: dict[str, float], sigma: float, specific: float, gate: float, source: float, drain: float, thermal: float
) -> float:
    """Forward less reverse current of the charge model."""

    def charge(u: float) -> float:
        w = u if u > 1 else math.exp(u)
        for _ in range(12):
            step = (2 * w + math.log(w) - u) / (2 + 1 / w)
            w = w - step if w > step else w / 2
            if abs(step) < 1e-12 * w:
                break
        return w

    pinch = p["kappa"] * (gate - p["threshold"])
    q_s = charge((pinch - source + sigma * drain) / thermal)
    q_d = charge((pinch - drain + sigma * source) / thermal)
    return specific * (q_s * q_s + q_s - q_d * q_d - q_d)


class Script:
    """One project."""

    def __init__(self, folder: Path) -> None:
        self.project = tomllib.loads((folder / "biasbook.toml").read_text("utf-8"))
        self.process = tomllib.loads((folder / "process" / f"{self.project['process']}.toml").read_text("utf-8"))
        self.sheets = {f.stem: tomllib.loads(f.read_text("utf-8")) for f in sorted((folder / "sheets").glob("*.toml"))}
        conditions = self.project["conditions"]
        lists = [conditions["process"], *([number(v) for v in conditions[k]] for k in ("temperature", "supply"))]
        self.nominal = tuple(
            conditions["nominal"][k] if k == "process" else number(conditions["nominal"][k])
            for k in ("process", "temperature", "supply")
        )
        every = list(itertools.product(*lists))
        self.conditions = [self.nominal, *(c for c in every if c != self.nominal)]
        self.devices = {
            (name, corner, temperature): device_at(self.process, name, corner, temperature)
            for name in self.process["device"]
            for corner in {c[0] for c in self.conditions}
            for temperature in {c[1] for c in self.conditions}
        }

    def load(self, sheet: dict[str, Any], at: tuple[str, float, float], scale: float = 1.0) -> float:
        """The load, through a link where it is one."""
        stated = sheet["assume"]["load_capacitance"]
        if "formula" not in stated:
            return number(stated) * scale
        link, rest = stated["formula"].removeprefix("2*").split(" + ")
        name, what = link.split(".")
        other = self.sheets[name]
        return 2 * (self.load(other, at) if what == "load_capacitance" else self.solve(other, at)[4]) + float(rest)

    def solve(self, sheet: dict[str, Any], at: tuple[str, float, float], scale: float = 1.0) -> tuple[float, ...]:
        """DC gain, bandwidth, output noise, power and input capacitance at one condition."""
        corner, temperature, supply = at
        stage, assume, choose = sheet["stage"], sheet["assume"], sheet["choose"]
        p = self.devices[sheet["device"], corner, temperature]
        exponent = number(assume.get("bias_temperature_exponent", 0.0))
        current = number(choose["bias_current"]) * (temperature / self.nominal[1]) ** exponent
        width, length = number(choose["width"]), number(choose["length"])
        thermal = K_B * temperature / Q_E
        d = small_signal(p, current, width, length, temperature)
        specific = p["specific_current"] * width / length
        if sheet["bias"]["device"] == "ideal":
            g_l, c_l = number(sheet["bias"]["output_conductance"]), number(sheet["bias"]["capacitance"])
            white, flicker, low = 0.0, 0.0, 0.0
        else:
            b = self.devices[sheet["bias"]["device"], corner, temperature]
            bias = small_signal(b, current, number(choose["bias_width"]), number(choose["bias_length"]), temperature)
            g_l, c_l, white, flicker = bias["g_d"], bias["c_gd"] + bias["c_db"], bias["white"], bias["flicker"]
            low = bias["saturation"]
        c_l += self.load(sheet, at, scale)
        # the operating point: the gate (of a follower: the output) that carries the bias current
        middle = (low + supply - d["saturation"]) / 2
        if stage in ("source-follower", "drain-follower"):
            brentq(
                lambda v: drain_current(p, d["sigma"], specific, v, middle, supply, thermal) / current - 1,
                0.0,
                3 * supply,
                xtol=1e-9,
            )
        else:
            brentq(
                lambda v: drain_current(p, d["sigma"], specific, v, 0.0, middle, thermal) / current - 1,
                -0.5,
                3 * supply,
                xtol=1e-9,
            )
        own = sheet["bulk"] == "source"
        g_s = d["g_m"] + d["g_d"] if own else d["g_s"]
        if stage in ("source-follower", "drain-follower"):
            g_o = g_s + g_l
            c_o = c_l + d["c_gs"] + (d["c_gb"] + d["c_db"] if own else d["c_sb"])
            drive = d["g_m"] if stage == "source-follower" else d["g_d"]
            feed = d["c_gs"] if stage == "source-follower" else 0.0
        else:
            g_o = d["g_d"] + g_l
            c_o = c_l + d["c_gd"] + d["c_db"]
            drive = -g_s if stage == "common-gate" else d["g_m"]
            feed = -d["c_gd"] if stage != "common-gate" else 0.0
            if stage == "cascode":
                second = small_signal(
                    p, current, number(choose["cascode_width"]), number(choose["cascode_length"]), temperature
                )
                g_o = d["g_d"] * second["g_d"] / (second["g_s"] + d["g_d"]) + g_l
        gain = abs(drive) / g_o
        tau, zero = c_o / g_o, feed / drive if drive else 0.0
        inside = 1 - 2 * (zero / tau) ** 2
        bandwidth = 1 / (2 * math.pi * tau * math.sqrt(inside)) if inside > 0 else math.inf
        noise = (d["white"] + white) / (4 * g_o * c_o)
        pole = 1 / (2 * math.pi * tau)
        if pole > 1:
            noise += (d["flicker"] + flicker) / g_o**2 * math.log(pole)
        power = current * (1 + number(assume.get("bias_overhead", 0.0))) * supply
        capacitance = {
            "source-follower": d["c_gd"] + d["c_gb"] + d["c_gs"] * (1 - gain),
            "common-source": d["c_gs"] + d["c_gb"] + d["c_gd"] * (1 + gain),
            "common-gate": d["c_gs"] + d["c_sb"],
            "drain-follower": d["c_gd"] + d["c_db"],
            "cascode": d["c_gs"] + d["c_gb"] + 2 * d["c_gd"],
        }[stage]
        return gain, bandwidth, math.sqrt(noise), power, capacitance

    def review(self) -> list[dict[str, Any]]:
        """All sheets."""
        found = []
        for name, sheet in self.sheets.items():
            stated = sheet["assume"]["load_capacitance"]
            scales = [1.0]
            if "low" in stated:
                scales += [number(stated[end]) / number(stated) for end in ("low", "high")]
            rows = np.array([self.solve(sheet, at, scale)[:4] for scale in scales for at in self.conditions])
            entry: dict[str, Any] = {"sheet": name}
            for k, metric in enumerate(("dc_gain", "bandwidth", "output_noise", "power")):
                values, target = rows[:, k], sheet["target"][metric]
                worst = int(np.argmin(values) if "min" in target else np.argmax(values))
                at = self.conditions[worst % len(self.conditions)]
                entry[metric] = {"nominal": values[0], "worst": values[worst], "worst_at": at}
            found.append(entry)
        return found


if __name__ == "__main__":
    json.dump(Script(Path(sys.argv[1])).review(), sys.stdout)
