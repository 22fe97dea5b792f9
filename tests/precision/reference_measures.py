"""Every metric of section 3 at 50 digits, from nodal analysis alone.

A metric is a pair of value and reason; one of them is None.
"""

from __future__ import annotations

from typing import Any

from mpmath import mp, mpf

from tests.precision import reference_settling as settling
from tests.precision.reference_device import BOLTZMANN, Point, Real, thermal_voltage
from tests.precision.reference_levels import SOURCE_OUTPUTS, Bench, Levels, input_range, output_range
from tests.precision.reference_network import (
    Network,
    Polynomial,
    add,
    derivative,
    magnitude_squared,
    roots,
    scale,
    times,
    trimmed,
    value_at,
)

Metric = tuple[Any, str | None]

TERMINALS = {
    "source-follower": {"gate": "in", "drain": "far", "source": "out", "bulk": "near"},
    "common-source": {"gate": "in", "drain": "out", "source": "near", "bulk": "near"},
    "common-gate": {"gate": "near", "drain": "out", "source": "in", "bulk": "near"},
    "drain-follower": {"gate": "near", "drain": "in", "source": "out", "bulk": "near"},
    "cascode": {"gate": "in", "drain": "inner", "source": "near", "bulk": "near"},
}
"""Nodes of the main device. near is the rail of its bulk, far the other one; a gate line stands on near."""

CASCODE = {"gate": "near", "drain": "out", "source": "inner", "bulk": "near"}
YIELD = mpf(0.9973)
GATE_DRIVEN = ("source-follower", "common-source", "cascode")


class Circuit:
    """The stage's network at one condition, with or without the drive resistance."""

    def __init__(self, b: Bench, devices: dict[str, Point], sheet: dict[str, Any], *, driven: bool) -> None:
        self.resistance = mpf(b.assume.get("drive_resistance", 0.0)) if driven else mpf(0)
        self.rail = "near" if b.stage in SOURCE_OUTPUTS else "far"
        self.moving_rail = "far" if b.polarity == "n" else "near"
        unknown = ["out"]
        if b.stage == "cascode":
            unknown.append("inner")
        if self.resistance > 0:
            unknown.append("terminal")
        self.network = Network(unknown)
        self.terminals: dict[str, dict[str, str]] = {}
        for name, point in devices.items():
            nodes = self._nodes(b, name)
            self.terminals[name] = nodes
            self.network.transistor(point, **nodes)
            if b.own_bulk and name != "bias":
                self.network.capacitance(nodes["source"], "near", mpf(b.assume.get("well_capacitance", 0.0)))
        if b.bias is None:
            self.network.conductance("out", self.rail, mpf(sheet["bias"].get("output_conductance", 0.0)))
            self.network.capacitance("out", self.rail, mpf(sheet["bias"].get("capacitance", 0.0)))
        load = b.assume.get("load_capacitance", sheet["choose"].get("load_capacitance"))
        self.network.capacitance("out", "near", mpf(load))
        if self.resistance > 0:
            self.network.conductance("terminal", "in", 1 / self.resistance)

    def _nodes(self, b: Bench, name: str) -> dict[str, str]:
        if name == "bias":
            return {"gate": self.rail, "drain": "out", "source": self.rail, "bulk": self.rail}
        nodes = dict(CASCODE if name == "cascode" else TERMINALS[b.stage])
        if self.resistance > 0:
            nodes = {terminal: "terminal" if node == "in" else node for terminal, node in nodes.items()}
        if b.own_bulk:
            nodes["bulk"] = nodes["source"]
        return nodes

    def forward(self) -> Polynomial:
        return self.network.numerator("out", held={"in": mpf(1)}, injected={})

    def from_supply(self) -> Polynomial:
        return self.network.numerator("out", held={self.moving_rail: mpf(1)}, injected={})

    def from_device(self, name: str) -> Polynomial:
        nodes = self.terminals[name]
        injected = {nodes["drain"]: mpf(-1), nodes["source"]: mpf(1)}
        return self.network.numerator("out", held={}, injected=injected)

    def from_node(self, node: str) -> Polynomial:
        return self.network.numerator("out", held={}, injected={node: mpf(1)})


def measures(b: Bench, at: Levels, devices: dict[str, Point], sheet: dict[str, Any]) -> dict[str, Metric]:
    circuit = Circuit(b, devices, sheet, driven=True)
    result: dict[str, Metric] = {}
    rate = typical_rate(circuit.network)
    denominator = trimmed(circuit.network.denominator(), rate)
    forward = trimmed(circuit.forward(), rate)
    shape = Shape(forward, denominator)
    result.update(shape.metrics())
    result["output_resistance"] = quotient(circuit.from_node("out")[0], denominator[0])
    result["input_capacitance"] = input_capacitance(b, devices, sheet)
    if b.stage != "drain-follower":
        result["supply_rejection"] = quotient(abs(forward[0]), abs(circuit.from_supply()[0]))
    output_capacitance = circuit.network.c["out", "out"]
    bare = output_capacitance == 0
    result["slew_rate"] = (None, "no capacitance") if bare else (b.current / output_capacitance, None)
    result.update(noise(b, circuit, devices, shape))
    result["settling_time"] = settling_time(b, devices["main"], shape, output_capacitance)
    result.update(static(b, at, devices))
    return result


def typical_rate(network: Network) -> Real:
    whole = sum(network.c[node, node] for node in network.unknown)
    return sum(abs(network.g[node, node]) for node in network.unknown) / whole if whole else mpf(1)


def quotient(above: Real, below: Real) -> Metric:
    return (None, "unlimited") if below == 0 else (above / below, None)


class Shape:
    """The transfer function from the input to the output, and what can be read off it."""

    def __init__(self, numerator: Polynomial, denominator: Polynomial) -> None:
        self.numerator, self.denominator = numerator, denominator
        self.poles = sorted(roots(denominator), key=abs)
        self.gain = abs(numerator[0] / denominator[0]) if denominator[0] else None

    @property
    def pole_frequency(self) -> Real:
        return abs(self.poles[0]) / (2 * mp.pi)

    def crossing(self, level: Real) -> Real | None:
        """Lowest frequency at which abs(H)^2 equals `level`."""
        balance = add(magnitude_squared(self.numerator), scale(magnitude_squared(self.denominator), -level))
        found = [x for x in roots(balance) if isinstance(x, mpf) and x > 0]
        return mp.sqrt(min(found)) / (2 * mp.pi) if found else None

    def peaking(self) -> Real:
        above, below = magnitude_squared(self.numerator), magnitude_squared(self.denominator)
        turning = add(times(derivative(above), below), scale(times(above, derivative(below)), mpf(-1)))
        while len(turning) > 1 and turning[-1] == 0:
            turning.pop()
        heights = [value_at(above, x) / value_at(below, x) for x in roots(turning) if isinstance(x, mpf) and x > 0]
        if len(self.numerator) == len(self.denominator):
            heights.append((self.numerator[-1] / self.denominator[-1]) ** 2)
        return max([mpf(1), *(mp.sqrt(height) / self.gain for height in heights)])

    def metrics(self) -> dict[str, Metric]:
        result: dict[str, Metric] = {"peaking": (mpf(1), None)}
        if self.poles:
            result["pole_frequency"] = (self.pole_frequency, None)
        if self.gain is None or not self.poles:
            result["bandwidth"] = (None, "unlimited")
        if self.gain is None:
            result["dc_gain"] = (None, "unlimited")
            result["unity_gain_frequency"] = self._named(self.crossing(mpf(1)))
            return result
        result["dc_gain"] = (self.gain, None)
        if self.gain == 0:
            del result["peaking"]
            return result
        if self.poles:
            result["bandwidth"] = self._named(self.crossing(self.gain**2 / 2))
            result["peaking"] = (self.peaking(), None)
        if self.gain <= 1:
            result["unity_gain_frequency"] = (None, "gain below 1")
        else:
            result["unity_gain_frequency"] = self._named(self.crossing(mpf(1)))
        return result

    @staticmethod
    def _named(frequency: Real | None) -> Metric:
        return (None, "feed-through") if frequency is None else (frequency, None)


def input_capacitance(b: Bench, devices: dict[str, Point], sheet: dict[str, Any]) -> Metric:
    circuit = Circuit(b, devices, sheet, driven=False)
    net = circuit.network
    own = net.c["in", "in"]
    if b.stage not in GATE_DRIVEN:
        return own, None
    ground = net.denominator()[0]
    if ground == 0:
        return None, "no gain that ends"
    moved = {node: net.numerator(node, held={"in": mpf(1)}, injected={})[0] / ground for node in net.unknown}
    return own + sum(net.c["in", node] * voltage for node, voltage in moved.items()), None


def square_integral(numerator: Polynomial, denominator: Polynomial, poles: list[Any]) -> Real:
    """Integral of abs(N/D)^2 over frequency from 0 to infinity, by the residues of its poles."""
    slope = derivative(denominator)
    whole = mpf(0)
    for pole in poles:
        above = value_at(numerator, pole) * value_at(numerator, -pole)
        whole += above / (value_at(slope, pole) * value_at(denominator, -pole))
    return mp.re(whole) / 2


def noise(b: Bench, circuit: Circuit, devices: dict[str, Point], shape: Shape) -> dict[str, Metric]:
    sources = [
        (circuit.from_device(name), point.white_noise, point.flicker_noise, point.device.flicker_exponent)
        for name, point in devices.items()
    ]
    if circuit.resistance > 0:
        thermal = 4 * mpf(BOLTZMANN) * b.temperature / circuit.resistance
        sources.append((circuit.from_node("terminal"), thermal, mpf(0), mpf(1)))
    white = sum(path[0] ** 2 * density for path, density, _, _ in sources)
    flickers = [(path[0] ** 2 * density, exponent) for path, _, density, exponent in sources if path[0] * density]
    offset = sum(circuit.from_device(name)[0] ** 2 * point.mismatch for name, point in devices.items())
    result: dict[str, Metric] = {"noise_corner": (corner_frequency(white, flickers), None)}
    driving = abs(shape.numerator[0])
    if driving > 0:
        result["noise_density"] = (mp.sqrt(white) / driving, None)
        result["offset"] = (mp.sqrt(offset) / driving, None)
        result["offset_limit"] = (mp.sqrt(2) * mp.erfinv(YIELD) * mp.sqrt(offset) / driving, None)
    if shape.gain is None or not shape.poles:
        return result
    square = sum(density * square_integral(path, shape.denominator, shape.poles) for path, density, _, _ in sources)
    low, high = mpf(b.assume.get("noise_from", 1.0)), shape.pole_frequency
    if high > low:
        for size, exponent in flickers:
            square += size / shape.denominator[0] ** 2 * power_integral(low, high, exponent)
    result["output_noise"] = (mp.sqrt(square), None)
    if shape.gain > 0:
        result["input_noise"] = (mp.sqrt(square) / shape.gain, None)
    return result


def power_integral(low: Real, high: Real, exponent: Real) -> Real:
    """Of f^-exponent."""
    if exponent == 1:
        return mp.log(high / low)
    return (high ** (1 - exponent) - low ** (1 - exponent)) / (1 - exponent)


def corner_frequency(white: Real, flickers: list[tuple[Any, Any]]) -> Real:
    """Where the flicker parts together equal the white part."""
    if not flickers:
        return mpf(0)

    def excess(decade: Real) -> Real:
        return white - sum(size * mp.exp(-exponent * decade) for size, exponent in flickers)

    guesses = [mp.log(size / white) / exponent for size, exponent in flickers]
    return mp.exp(settling.bisect(excess, min(guesses) - 5, max(guesses) + 5))


def settling_time(b: Bench, main: Point, shape: Shape, output_capacitance: Real) -> Metric:
    tolerance = mpf(b.assume.get("settling_tolerance", 1e-3))
    if "step_size" in b.assume and b.stage in SOURCE_OUTPUTS:
        return source_output_settling(b, main, output_capacitance, tolerance)
    if not shape.gain:
        return None, "no final value"
    if not shape.poles:
        return mpf(0), None
    if "step_size" not in b.assume:
        return settling.linear(shape.numerator, shape.denominator, shape.poles, tolerance), None
    change, slew_rate = shape.gain * mpf(b.assume["step_size"]), b.current / output_capacitance
    return settling.two_phase(change, tolerance, slew_rate, 1 / (2 * mp.pi * shape.pole_frequency)), None


def source_output_settling(b: Bench, main: Point, output_capacitance: Real, tolerance: Real) -> Metric:
    if b.main.velocity > 0:
        return None, "velocity saturation"
    share = main.kappa if b.stage == "source-follower" else b.main.sigma
    if share == 0:
        return None, "no final value"
    a = share * mpf(b.assume["step_size"]) / thermal_voltage(b.temperature)
    time = output_capacitance * thermal_voltage(b.temperature) / b.main.specific_current
    if b.own_bulk:
        time /= main.kappa + b.main.sigma
    times_ = [settling.large_signal_formula(side * a, tolerance, b.main.inversion, time) for side in (1, -1)]
    return max(times_), None


def static(b: Bench, at: Levels, devices: dict[str, Point]) -> dict[str, Metric]:
    """Metrics that need no network."""
    result: dict[str, Metric] = {}
    low, high = sorted_from_ground(b, *output_range(b, at.input))
    result["output_low"], result["output_high"], result["output_swing"] = (low, None), (high, None), (high - low, None)
    inputs = input_range(b, at.output)
    if inputs is not None:
        low, high = sorted_from_ground(b, *inputs)
        result["input_low"], result["input_high"] = (low, None), (high, None)
    drawn = b.current * (1 + mpf(b.assume.get("bias_overhead", 0.0)))
    result["supply_current"], result["power"] = (drawn, None), (drawn * b.supply, None)
    result["gate_area"] = (sum(point.device.width * point.device.length for point in devices.values()), None)
    return result


def sorted_from_ground(b: Bench, low: Real, high: Real) -> tuple[Real, Real]:
    """The mirror image turns a lower limit into an upper one."""
    first, second = b.ground(low), b.ground(high)
    return (first, second) if b.polarity == "n" else (second, first)
