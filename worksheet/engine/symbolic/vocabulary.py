"""Names of levels: key, symbol as a designer writes it, title, unit. Described elsewhere where there is a description.

Keys: a sheet's own names ("bias_current", "cascode_width", "supply"); "DEVICE.VALUE" for an operating-point value or
a law of one transistor; "DEVICE.process.PARAMETER" and "DEVICE.corner.CHANGE"; "bias.output_conductance" and
"bias.capacitance" of an ideal source; a metric's key; and the levels of the circuit listed here. "KEY@nominal" is a
level that was found at the nominal condition and held, "KEY/width" one per metre of its device's width.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

from worksheet.model import metrics, operating
from worksheet.model.keys import Key
from worksheet.model.process_keys import CORNER_CHANGES, DEVICE_PARAMETERS
from worksheet.model.project_keys import SUPPLY, TEMPERATURE
from worksheet.model.sheet_keys import ASSUMPTIONS, BIAS_KEYS, DESIGN
from worksheet.stages.circuit import Circuit
from worksheet.stages.stage import MAIN

AT_NOMINAL, PER_WIDTH = "@nominal", "/width"


@dataclass(frozen=True, slots=True)
class Word:
    """One level's name.

    Attributes:
        key: Its key.
        symbol: As a designer writes it; a plain identifier with underscores.
        title: In words.
        unit: SI unit.
        positive: Whether it is never negative, which lets sympy simplify roots.
    """

    key: str
    symbol: str
    title: str
    unit: str
    positive: bool = True


_WRITTEN = {
    "sd(V_os)": "V_os",
    "dV_T/dT": "alpha_VT",
    "g_m/I": "g_mI",
    "q_d/(sigma q_s)": "r_d",
    "V_DS - V_DSsat": "V_h",
}
"""Symbols that are no plain name, and what stands for them in an expression."""

_LAWS = (
    Word("charge", "q", "Normalised charge at the source end", ""),
    Word("slope_factor", "G", "Source conductance for the current spent, g_s U_T/I", ""),
    Word("drive", "u", "Drive of the source end in thermal voltages", "", positive=False),
    Word("square_current", "I_sq", "Specific current per square at this condition", "A"),
    Word("gate_coupling", "kappa", "Gate coupling at the operating point", ""),
    Word("gate_coupling_at_zero", "kappa_0", "Gate coupling at zero source-bulk voltage", ""),
    Word("threshold_voltage", "V_T0", "Threshold voltage at this condition", "V", positive=False),
    Word("drain_coupling", "sigma", "Drain coupling at this length and condition", ""),
    Word("velocity", "lambda_c", "Velocity-saturation parameter", ""),
    Word("gate_capacitance", "C_ox", "Gate capacitance per area at this condition", "F/m^2"),
    Word("overlap_capacitance", "C_ov", "Overlap capacitance per width at this condition", "F/m"),
    Word("junction_capacitance", "C_j", "Junction capacitance per width at this condition", "F/m"),
    Word("intrinsic_capacitance", "c_gsi", "Channel's share of the gate-source capacitance", "F"),
    Word("white_factor", "gamma", "White noise factor, referred to the source conductance", ""),
    Word("white_density", "S_w", "White density of the drain current", "A^2/Hz"),
    Word("flicker_density", "S_f", "Flicker density of the drain current at 1 Hz", "A^2/Hz"),
    Word("source_bulk_voltage", "V_SB", "Source-bulk voltage", "V", positive=False),
    Word("drain_source_voltage", "V_DS", "Drain-source voltage", "V", positive=False),
    Word("reverse_charge", "q_d", "Normalised charge at the drain end", ""),
    Word("width_capacitance", "c_W", "Capacitance of the output node per metre of width", "F/m"),
)
"""Laws of one transistor that are no operating-point value."""

_CIRCUIT = (
    Word("thermal_voltage", "U_T", "Thermal voltage", "V"),
    Word("current", "I", "Bias current at this temperature", "A"),
    Word("output_capacitance", "C_o", "Capacitance that hangs on the output node", "F"),
    Word("white_noise_power", "P_w", "White noise power at the output", "V^2"),
    Word("flicker_noise_power", "P_f", "Flicker noise power at the output", "V^2"),
    Word("noise_until", "f_h", "Frequency up to which flicker noise is counted", "Hz"),
    Word("output_at_rail", "V_orail", "Output for a gate at the rail", "V", positive=False),
    Word("settling_rise", "t_r", "Settling of a rising step", "s"),
    Word("settling_fall", "t_f", "Settling of a falling step", "s"),
    Word("drive_step", "dV", "Step of the drive", "V"),
    Word("rise_start", "q_r0", "Normalised charge right after a rising step", ""),
    Word("rise_end", "q_r1", "Normalised charge where a rising step has settled", ""),
    Word("fall_start", "q_f0", "Normalised charge right after a falling step", ""),
    Word("fall_end", "q_f1", "Normalised charge where a falling step has settled", ""),
    Word("deviations", "z", "Standard deviations that the target's yield asks for", ""),
    Word("constant.boltzmann", "k", "Boltzmann constant", "J/K"),
    Word("constant.elementary_charge", "q_e", "Elementary charge", "C"),
    Word("nominal_temperature", "T_n", "Temperature of the nominal condition", "K"),
    Word("reference_temperature", "T_0", "Temperature at which the process parameters hold", "K"),
)

_SIGNED = {"input_level", "output_level", "bias_temperature_exponent", "bulk_conductance", "headroom", "gate_voltage",
           "source_voltage", "drain_voltage", "gate_source_voltage", "output_low", "output_high", "output_swing",
           "input_low", "input_high", "threshold", "threshold_drift", "mobility_exponent", "threshold_shift",
           "kappa_shift"}  # fmt: skip
"""Described quantities that may be negative."""

_CHANGES = {"threshold_shift": "dV_T0", "specific_current_factor": "k_I", "drain_coupling_factor": "k_sigma",
            "kappa_shift": "dkappa", "capacitance_factor": "k_C"}  # fmt: skip
"""Symbols of what a corner changes."""

_MOVED = {"kappa", "threshold", "specific_current", "drain_coupling", "gate_capacitance", "overlap_capacitance",
          "junction_capacitance"}  # fmt: skip
"""Process parameters that have a level of their own at a condition; as stated they are written with "_ref"."""


def canonical(circuit: Circuit, key: str) -> str:
    """The one key of a level that has several: every device carries the bias current, and a width is the sheet's."""
    owner, _, value = key.partition(".")
    if any(d.name == owner for d in circuit.devices):
        if value == "current":
            return "current"
        if value in ("width", "length"):
            return next(d.key(value) for d in circuit.devices if d.name == owner)
    return key


def word(circuit: Circuit, key: str) -> Word:
    """The name of a level.

    Args:
        circuit: The circuit that it belongs to.
        key: Its key.
    Raises: KeyError where there is no such level.
    """
    key = canonical(circuit, key)
    if key.endswith(AT_NOMINAL):
        plain = word(circuit, key.removesuffix(AT_NOMINAL))
        title = f"{plain.title}, found at the nominal condition"
        return replace(plain, key=key, symbol=f"{plain.symbol}_n", title=title)
    if key.endswith(PER_WIDTH):
        plain = word(circuit, key.removesuffix(PER_WIDTH))
        return replace(plain, key=key, symbol=f"{plain.symbol}W", title=f"{plain.title} per metre of width", unit="F/m")
    found = _circuit(key) or _described(circuit, key) or _device(circuit, key)
    if found is None:
        raise KeyError(key)
    return found


def _circuit(key: str) -> Word | None:
    listed = next((w for w in _CIRCUIT if w.key == key), None)
    if listed is not None:
        return listed
    parts = key.split(".")
    if parts[0] == "node_capacitance":
        return Word(key, f"C_{parts[1]}", f"Capacitance that hangs on the node {parts[1]!r}", "F")
    if parts[0] == "network":
        letter, of = {"denominator": ("d", "det(G + s C)"), "numerator": ("n", "the transfer's numerator")}.get(
            parts[1], ("z", f"the numerator of the transfer of {parts[-2]}'s noise")
        )
        suffix = f"_{parts[2]}" if parts[1] == "noise" else ""
        return Word(key, f"{letter}_{parts[-1]}{suffix}", f"Coefficient of s^{parts[-1]} in {of}", "", positive=False)
    return None


def _described(circuit: Circuit, key: str) -> Word | None:
    metric = metrics.find(key)
    if metric is not None:
        return Word(key, _written(metric.symbol), metric.title, metric.dimension.unit, key not in _SIGNED)
    keys = {k.name: k for k in (*circuit.stage.design_keys(circuit.ideal_bias), *DESIGN, *ASSUMPTIONS)}
    keys |= {k.name: k for k in (SUPPLY, TEMPERATURE)} | {f"bias.{k.name}": k for k in BIAS_KEYS}
    found = keys.get(key)
    if found is None or found.dimension is None:
        return None
    symbol = "I_0" if key == "bias_current" else found.symbol
    return _of_key(key, found, symbol)


def _device(circuit: Circuit, key: str) -> Word | None:
    owner, _, value = key.partition(".")
    if all(d.name != owner for d in circuit.devices):
        return None
    found = next((w for w in _LAWS if w.key == value), None)
    point = operating.find(value)
    kind, _, parameter = value.partition(".")
    if found is None and point is not None:
        found = Word(key, _written(point.symbol), point.title, point.dimension.unit, value not in _SIGNED)
    elif found is None and kind == "process":
        described = next((k for k in DEVICE_PARAMETERS if k.name == parameter), None)
        if described is not None:
            suffix = "_ref" if parameter in _MOVED else ""
            found = _of_key(key, described, _written(described.symbol) + suffix)
    elif found is None and kind == "corner":
        described = next((k for k in CORNER_CHANGES if k.name == parameter), None)
        if described is not None:
            found = _of_key(key, described, _CHANGES[parameter])
    if found is None:
        return None
    if owner == MAIN:
        return replace(found, key=key)
    return replace(found, key=key, symbol=f"{found.symbol}_{owner}", title=f"{found.title} of the {owner} device")


def _of_key(key: str, described: Key, symbol: str) -> Word:
    unit = described.dimension.unit if described.dimension is not None else ""
    return Word(key, symbol, described.title, unit, described.name not in _SIGNED)


def _written(symbol: str) -> str:
    return _WRITTEN.get(symbol, symbol)
