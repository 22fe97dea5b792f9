"""Where every node stands, from ground, as expressions: ranges that keep each device saturated, levels, terminals.

Stages are drawn for n-channel devices; a p-channel one is the mirror image about the supply. `_Frame` turns a voltage
into the drawn stage's frame and back, which is the same operation.
"""

from __future__ import annotations

from collections.abc import Callable
from typing import TYPE_CHECKING, Any

from worksheet.engine.symbolic import laws
from worksheet.engine.symbolic.definition import Definition, Pick, Root
from worksheet.engine.symbolic.vocabulary import AT_NOMINAL
from worksheet.stages.stage import GROUND, IN, OUT, SUPPLY, Transistor

if TYPE_CHECKING:
    from worksheet.engine.symbolic.algebra import Algebra

RANGES = "every device saturated: sum of saturation voltages along the channels"
GATE_LAW = f"{laws.CHARGE_MODEL}: gate voltage of a known current"
MIDDLE = "middle of the range that keeps every device saturated"


class _Frame:
    """The circuit in the frame in which its stage is drawn."""

    def __init__(self, a: Algebra) -> None:
        self.a = a
        self.circuit = a.circuit
        self.below = a.circuit.stack_below(OUT)
        self.above = a.circuit.stack_above(OUT)

    def turned(self, voltage: Any) -> Any:
        """Between the frame and ground, either way."""
        return voltage if self.circuit.polarity == "n" else self.a.symbol("supply") - voltage

    def wanted(self, d: Transistor) -> Any:
        """Drain-source voltage wanted of a device: V_DSsat and the margin; 0 of an ideal source."""
        if d not in self.circuit.devices:
            return 0
        return self.a.of(d, "saturation_voltage") + self.a.leaf("saturation_margin")

    def stack(self, devices: tuple[Transistor, ...]) -> Any:
        return sum(self.wanted(d) for d in devices)

    def fixed(self, node: str) -> Any:
        if node == IN:
            return self.turned(self.a.symbol("input_level"))
        return self.a.symbol("supply") if node == SUPPLY else 0

    @property
    def low(self) -> Any:
        return self.fixed(self.below[0]) + self.stack(self.below[1])

    @property
    def high(self) -> Any:
        import sympy

        highest = self.fixed(self.above[0]) - self.stack(self.above[1])
        if not self.circuit.stage.holds_input:
            return highest
        return sympy.Min(highest, self.turned(self.a.symbol("output_at_rail")), evaluate=False)

    @property
    def upper_of_main(self) -> Any:
        """Drain of the main device where its source is the output."""
        return self.fixed(self.above[0]) - self.stack(self.above[1][1:])

    def nodes(self) -> dict[str, Any]:
        """Every node that a channel touches."""
        nodes = {GROUND: 0, SUPPLY: self.a.symbol("supply"), OUT: self.turned(self.a.symbol("output_level"))}
        for (base, devices), sign in ((self.below, 1), (self.above, -1)):
            voltage = nodes.setdefault(base, self.fixed(base))
            for d in reversed(devices[1:]):
                voltage = voltage + sign * self.wanted(d)
                nodes[d.upper if sign > 0 else d.lower] = voltage
        return nodes


def _is_n(a: Algebra, d: Transistor) -> bool:
    return (a.circuit.polarity == "n") != d.upside_down


def _own(a: Algebra, d: Transistor, voltage: Any) -> Any:
    """Between ground and the rail that a device's polarity counts from, either way."""
    return voltage if _is_n(a, d) else a.symbol("supply") - voltage


def _in_own_well(a: Algebra, d: Transistor) -> bool:
    return a.circuit.bulk_node(d) == d.source and d.source not in (GROUND, SUPPLY)


def _gate(a: Algebra, d: Transistor, source: Any, drain: Any) -> Any:
    """Gate voltage that makes a device carry its current; all voltages counted from its own rail."""
    import sympy

    reference = source if _in_own_well(a, d) else 0
    kappa, threshold = a.of(d, "gate_coupling"), a.of(d, "threshold_voltage")
    rest = a.symbol("thermal_voltage") * a.of(d, "drive") - _coupling(a, d) * (drain - reference)
    lifted = source - reference
    if not laws.bends(a, d):
        return reference + threshold + (lifted + rest) / kappa
    zero, potential = a.of(d, "gate_coupling_at_zero"), a.process(d, "surface_potential")
    body = 2 * (1 / zero - 1) * sympy.sqrt(potential)
    moved = 1 / (1 + (1 / zero - 1) * sympy.sqrt(potential / (potential + lifted)))
    return threshold + lifted + body * (sympy.sqrt(potential + lifted) - sympy.sqrt(potential)) + rest / moved


def _coupling(a: Algebra, d: Transistor) -> Any:
    return a.of(d, "drain_coupling") if a.has(f"{d.name}.process.drain_coupling") else 0


def _source(a: Algebra, d: Transistor, gate: Any, drain: Any) -> tuple[Any, Root | None]:
    """Source voltage for a gate voltage, the inverse of _gate, and the equation behind it where there is one."""
    import sympy

    kappa, threshold, sigma = a.of(d, "gate_coupling"), a.of(d, "threshold_voltage"), _coupling(a, d)
    turn_on = a.symbol("thermal_voltage") * a.of(d, "drive")
    if _in_own_well(a, d):
        return (kappa * (gate - threshold) + sigma * drain - turn_on) / (kappa + sigma), None
    if not laws.bends(a, d):
        return kappa * (gate - threshold) + sigma * drain - turn_on, None
    zero, potential = a.of(d, "gate_coupling_at_zero"), a.process(d, "surface_potential")
    x = sympy.Symbol("x", positive=True)
    excess = (1 / zero - 1) * sympy.sqrt(potential)
    rest = turn_on - sigma * drain
    wanted = gate - threshold - rest + potential + 2 * excess * sympy.sqrt(potential)
    return x**2 - potential, Root(x, x**3 + 2 * excess * x**2 + excess * rest, wanted * x, Pick.LARGEST)


def _main(a: Algebra) -> Transistor:
    return a.circuit.stage.transistors[0]


def _output_at_rail(a: Algebra) -> Definition:
    frame, main = _Frame(a), _main(a)
    law, root = _source(a, main, a.symbol("supply"), frame.upper_of_main)
    return Definition("output_at_rail", frame.turned(law), root, GATE_LAW)


def _output_level(a: Algebra) -> Definition | None:
    if a.has("output_level"):
        return None
    frame = _Frame(a)
    if frame.circuit.stage.holds_input:
        law, root = _source(a, _main(a), frame.turned(a.symbol("input_level")), frame.upper_of_main)
        return Definition("output_level", frame.turned(law), root, GATE_LAW)
    if not a.setting.nominal:
        return Definition("output_level", a.symbol("output_level" + AT_NOMINAL))
    middle = (a.symbol("output_low") + a.symbol("output_high")) / 2
    return Definition("output_level", middle, source=MIDDLE)


def _input_level(a: Algebra) -> Definition | None:
    if a.has("input_level"):
        return None
    frame, stage = _Frame(a), a.circuit.stage
    if frame.above[0] == IN:
        return Definition("input_level", frame.turned(a.symbol("supply")), source="the input stands on the supply")
    if frame.below[0] != IN and not stage.holds_input:
        return Definition("input_level", a.of(_main(a), "gate_voltage"))
    given = a.has("output_level")
    if stage.holds_input and given:
        return Definition("input_level", _gate_for(a, a.symbol("output_level")), source=GATE_LAW)
    if not a.setting.nominal:
        return Definition("input_level", a.symbol("input_level" + AT_NOMINAL))
    if stage.holds_input:
        middle = (a.symbol("output_low") + a.symbol("output_high")) / 2
        return Definition("input_level", _gate_for(a, middle), source=f"{MIDDLE}; {GATE_LAW}")
    highest = frame.turned(a.symbol("output_level")) if given else a.symbol("supply") - frame.stack(frame.above[1])
    room = highest - frame.stack(frame.below[1])
    return Definition("input_level", frame.turned(room / 2), source=MIDDLE)


def _gate_for(a: Algebra, output: Any) -> Any:
    """Gate of the main device of a follower that gives an output, both from ground."""
    frame = _Frame(a)
    return frame.turned(_gate(a, _main(a), frame.turned(output), frame.upper_of_main))


OF_CIRCUIT: dict[str, Callable[[Algebra], Definition | None]] = {
    "output_at_rail": _output_at_rail,
    "output_level": _output_level,
    "input_level": _input_level,
}
"""Levels of the circuit's nodes."""


def output_range(a: Algebra) -> tuple[Any, Any]:
    """Lowest and highest output from ground."""
    frame = _Frame(a)
    ends = frame.turned(frame.low), frame.turned(frame.high)
    return ends if a.circuit.polarity == "n" else (ends[1], ends[0])


def input_range(a: Algebra) -> tuple[Any, Any]:
    """Lowest and highest input level from ground, None where the input follows."""
    frame = _Frame(a)
    if a.circuit.stage.holds_input:
        return _gate_for(a, a.symbol("output_low")), _gate_for(a, a.symbol("output_high"))
    output = frame.turned(a.symbol("output_level"))
    if frame.below[0] == IN:
        ends = frame.turned(0), frame.turned(output - frame.stack(frame.below[1]))
    elif frame.above[0] == IN:
        ends = frame.turned(output + frame.stack(frame.above[1])), frame.turned(a.symbol("supply"))
    else:
        return None, None
    return ends if a.circuit.polarity == "n" else (ends[1], ends[0])


def of_device(a: Algebra, d: Transistor, value: str) -> Definition:
    """A voltage of one transistor; `value` is a key of OF_DEVICE."""
    expression, source = OF_DEVICE[value](a, d), GATE_LAW if value == "gate_voltage" else ""
    return Definition(f"{d.name}.{value}", expression, source=source or RANGES)


def _gate_voltage(a: Algebra, d: Transistor) -> Any:
    if d.gate == IN and a.circuit.stage.holds_input:
        return a.symbol("input_level")
    ends = (_own(a, d, a.of(d, end)) for end in ("source_voltage", "drain_voltage"))
    return _own(a, d, _gate(a, d, *ends))


def _terminal(end: str) -> Callable[[Algebra, Transistor], Any]:
    def law(a: Algebra, d: Transistor) -> Any:
        frame = _Frame(a)
        return frame.turned(frame.nodes()[getattr(d, end)])

    return law


def _between(first: str, second: str) -> Callable[[Algebra, Transistor], Any]:
    def law(a: Algebra, d: Transistor) -> Any:
        difference = a.of(d, first) - a.of(d, second)
        return difference if _is_n(a, d) else -difference

    return law


def _source_bulk_voltage(a: Algebra, d: Transistor) -> Any:
    return 0 if _in_own_well(a, d) else _own(a, d, a.of(d, "source_voltage"))


def _headroom(a: Algebra, d: Transistor) -> Any:
    return a.of(d, "drain_source_voltage") - a.of(d, "saturation_voltage") - a.leaf("saturation_margin")


def _reverse_charge(a: Algebra, d: Transistor) -> Any:
    import sympy

    step = (1 + _coupling(a, d)) * a.of(d, "drain_source_voltage") / a.symbol("thermal_voltage")
    return sympy.LambertW(2 * sympy.exp(a.of(d, "drive") - step)) / 2


def _reverse_share(a: Algebra, d: Transistor) -> Any:
    return a.of(d, "reverse_charge") / (_coupling(a, d) * a.of(d, "charge"))


OF_DEVICE: dict[str, Callable[[Algebra, Transistor], Any]] = {
    "gate_voltage": _gate_voltage,
    "source_voltage": _terminal("source"),
    "drain_voltage": _terminal("drain"),
    "drain_source_voltage": _between("drain_voltage", "source_voltage"),
    "gate_source_voltage": _between("gate_voltage", "source_voltage"),
    "source_bulk_voltage": _source_bulk_voltage,
    "headroom": _headroom,
    "reverse_charge": _reverse_charge,
    "reverse_share": _reverse_share,
}
"""Voltages of a transistor and what follows from them."""
