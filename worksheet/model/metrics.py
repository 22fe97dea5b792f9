"""Every metric, once: key, unit, meaning, and the rule that gives it from a solved stage.

A rule is ordinary arithmetic over a Solution, so that the numeric engine (arrays over conditions) and the symbolic
engine (sympy expressions) evaluate the same rule. What needs more than arithmetic (a root, an integral) is a
method of the Solution. A metric that is entered here is known to targets, formulas, solver, screens and reports.
"""

from __future__ import annotations

from statistics import NormalDist
from typing import Any

from worksheet.model import dimension as dim
from worksheet.model.metric import Metric, Reason, Solution, SolvedDevice

__all__ = [
    "DEFAULT_YIELD",
    "METRICS",
    "Metric",
    "Reason",
    "Solution",
    "all_metrics",
    "deviations",
    "find",
    "keys",
    "offset_variance",
    "register",
    "withdraw",
]

DEFAULT_YIELD = 0.9973
"""Share of parts that a bound keeps where a target states none: 3.0 standard deviations of a normal law."""


def deviations(yield_fraction: float) -> float:
    """Standard deviations on either side that hold a share of a normal law.

    Args:
        yield_fraction: Share of parts within the bound. [-], between 0 and 1
    Returns: [-]
    Source: normal law, closed form.
    """
    return NormalDist().inv_cdf((1.0 + yield_fraction) / 2.0)


def offset_variance(s: Solution, d: SolvedDevice) -> Any:
    """What one transistor adds to the square of the offset, referred to the input. [V^2]

    Source: Pelgrom, Duinmaijer and Welbers 1989; a single device carries half the variance of a pair.
    """
    return (
        s.referred_to_input(d)
        * ((d.transconductance * d.matching_threshold) ** 2 + (d.current * d.matching_factor) ** 2)
        / (2 * d.width * d.length)
    )


def _offset(s: Solution) -> Any:
    return s.sqrt(sum(offset_variance(s, d) for d in s.transistors))


METRICS: tuple[Metric, ...] = (
    Metric(
        "dc_gain",
        "DC gain",
        "A_0",
        dim.GAIN,
        "Magnitude of the transfer at zero frequency.",
        lambda s: s.dc_gain(),
        "high",
        relation="abs(H(0)) of the nodal solution",
    ),
    Metric(
        "bandwidth",
        "Bandwidth",
        "f_3dB",
        dim.FREQUENCY,
        "Lowest frequency at which the magnitude has fallen to 1/sqrt(2) of its DC value.",
        lambda s: s.bandwidth(),
        "high",
        relation="abs(H(j omega))^2 = abs(H(0))^2/2",
    ),
    Metric(
        "pole_frequency",
        "Pole frequency",
        "f_p",
        dim.FREQUENCY,
        "Lowest pole of the transfer; g_o/(2 pi C_o) for one node.",
        lambda s: s.pole_frequency(),
        "high",
        relation="lowest root of det(G + s C)",
    ),
    Metric(
        "unity_gain_frequency",
        "Unity-gain frequency",
        "f_u",
        dim.FREQUENCY,
        "Lowest frequency at which the magnitude is 1.",
        lambda s: s.unity_gain_frequency(),
        "high",
        relation="abs(H(j omega)) = 1",
    ),
    Metric(
        "output_resistance",
        "Output resistance",
        "R_o",
        dim.RESISTANCE,
        "Resistance seen into the output at zero frequency.",
        lambda s: s.output_resistance(),
        relation="Z_o(0) of the nodal solution",
    ),
    Metric(
        "input_capacitance",
        "Input capacitance",
        "C_in",
        dim.CAPACITANCE,
        "Capacitance seen into the input at low frequency, Miller effect included.",
        lambda s: s.input_capacitance(),
        "low",
        relation="slope of Im(Y_in) at zero frequency (Miller)",
    ),
    Metric(
        "supply_rejection",
        "Supply rejection",
        "PSR",
        dim.GAIN,
        "Gain from the input over gain from the supply at zero frequency.",
        lambda s: s.supply_rejection(),
        "high",
        relation="abs(A_in/A_supply)",
    ),
    Metric(
        "slew_rate",
        "Slew rate",
        "SR",
        dim.SLEW_RATE,
        "Fastest change of the output that the bias current allows.",
        lambda s: s.current / s.output_capacitance,
        "high",
        relation="I = C dV/dt",
    ),
    Metric(
        "settling_time",
        "Settling time",
        "t_s",
        dim.TIME,
        "From a step at the input until the output stays within the settling tolerance of its final change.",
        lambda s: s.settling_time(),
        "low",
        relation="step response of H(s); with a step size the charge equation of the device",
    ),
    Metric(
        "noise_density",
        "Noise density",
        "v_n",
        dim.NOISE_DENSITY,
        "White noise referred to the input.",
        lambda s: s.sqrt(sum(n.referred * n.white for n in s.noise_sources)),
        "low",
        relation="S_i = 4 k T gamma g_s, all sources, over G_in^2",
    ),
    Metric(
        "noise_corner",
        "Noise corner",
        "f_c",
        dim.FREQUENCY,
        "Frequency at which flicker and white noise are equal; 0 without flicker.",
        lambda s: s.noise_corner(),
        "low",
        relation="flicker density = white density",
    ),
    Metric(
        "output_noise",
        "Output noise",
        "v_no",
        dim.NOISE_VOLTAGE,
        "At the output: white noise over all frequency and flicker from noise_from to the pole frequency.",
        lambda s: s.sqrt(s.white_noise_power + s.flicker_noise_power),
        "low",
        relation="integral of abs(Z_k)^2 S_k over frequency",
    ),
    Metric(
        "input_noise",
        "Input noise",
        "v_ni",
        dim.NOISE_VOLTAGE,
        "Output noise referred to the input by the DC gain.",
        lambda s: s["output_noise"] / s["dc_gain"],
        "low",
        relation="v_no/A_0",
    ),
    Metric(
        "output_low",
        "Lowest output",
        "V_olow",
        dim.VOLTAGE,
        "Lowest output, from ground, at which every device is saturated.",
        lambda s: s.output_low,
        "low",
        relation="sum of saturation voltages below the output",
    ),
    Metric(
        "output_high",
        "Highest output",
        "V_ohigh",
        dim.VOLTAGE,
        "Highest output, from ground, at which every device is saturated.",
        lambda s: s.output_high,
        "high",
        relation="supply less the saturation voltages above the output",
    ),
    Metric(
        "output_swing",
        "Output swing",
        "V_osw",
        dim.VOLTAGE,
        "Highest less lowest output.",
        lambda s: s["output_high"] - s["output_low"],
        "high",
        relation="V_ohigh - V_olow",
    ),
    Metric(
        "supply_current",
        "Supply current",
        "I_DD",
        dim.CURRENT,
        "Bias current and the bias branch's overhead.",
        lambda s: s.current * (1 + s.bias_overhead),
        "low",
        additive=True,
        relation="I (1 + k_b)",
    ),
    Metric(
        "power",
        "Power",
        "P",
        dim.POWER,
        "Supply current times supply.",
        lambda s: s["supply_current"] * s.supply,
        "low",
        additive=True,
        relation="I_DD V_DD",
    ),
    Metric(
        "gate_area",
        "Gate area",
        "A_g",
        dim.AREA,
        "Sum of width times length over all transistors.",
        lambda s: sum(d.width * d.length for d in s.transistors),
        "low",
        additive=True,
        relation="sum of W L",
    ),
    Metric(
        "offset",
        "Offset",
        "sd(V_os)",
        dim.VOLTAGE,
        "One standard deviation of the mismatch, referred to the input.",
        _offset,
        "low",
        relation="sd = A_VT/sqrt(W L), A_beta/sqrt(W L) (Pelgrom 1989)",
    ),
    Metric(
        "offset_limit",
        "Offset limit",
        "V_os,max",
        dim.VOLTAGE,
        "Bound that the magnitude of the offset keeps with the target's yield.",
        lambda s: deviations(DEFAULT_YIELD) * s["offset"],
        "low",
        of_yield="offset",
        relation="normal law",
    ),
    Metric(
        "input_low",
        "Lowest input",
        "V_ilow",
        dim.VOLTAGE,
        "Lowest input level, from ground, at which every device is saturated.",
        lambda s: s.input_low,
        "low",
        needs_level="input_level",
        relation="range of the input level",
    ),
    Metric(
        "input_high",
        "Highest input",
        "V_ihigh",
        dim.VOLTAGE,
        "Highest input level, from ground, at which every device is saturated.",
        lambda s: s.input_high,
        "high",
        needs_level="input_level",
        relation="range of the input level",
    ),
    Metric(
        "peaking",
        "Peaking",
        "M_p",
        dim.NUMBER,
        "Greatest magnitude over the DC magnitude; 1 where there is no peak.",
        lambda s: s.peaking(),
        "low",
        relation="max abs(H)/abs(H(0))",
    ),
)
"""All metrics, in the order of a table."""

_BY_KEY = {metric.key: metric for metric in METRICS}


def find(key: str) -> Metric | None:
    """The metric of that key, or None."""
    return _BY_KEY.get(key)


def keys() -> tuple[str, ...]:
    """Keys of all metrics."""
    return tuple(_BY_KEY)


def register(metric: Metric) -> None:
    """Enter one more metric. ValueError where its key is taken."""
    if metric.key in _BY_KEY:
        raise ValueError(f"a metric {metric.key!r} exists already")
    _BY_KEY[metric.key] = metric


def withdraw(key: str) -> None:
    """Take a metric out again. KeyError where there is none of that key."""
    del _BY_KEY[key]


def all_metrics() -> tuple[Metric, ...]:
    """All metrics, those entered later included."""
    return tuple(_BY_KEY.values())
