"""Every metric as an expression: the rules of model.metrics evaluated over a stage that is solved in symbols."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace
from functools import cached_property, lru_cache
from typing import TYPE_CHECKING, Any

from worksheet.engine.symbolic import crossing, settling, voltages
from worksheet.engine.symbolic.definition import AbsentError, Definition, Pick, Root
from worksheet.engine.symbolic.neglects import FACTOR_MISMATCH, FLICKER, OTHER_MISMATCH, OTHER_NOISE
from worksheet.engine.symbolic.network import Coefficients, noise_integral, squared_magnitude
from worksheet.model import metrics
from worksheet.model.metrics import Reason
from worksheet.stages.circuit import RESISTOR
from worksheet.stages.stage import MAIN, Transistor

if TYPE_CHECKING:
    from worksheet.engine.symbolic.algebra import Algebra


def define(a: Algebra, key: str) -> Definition:
    """A metric by its rule."""
    metric = metrics.find(key)
    assert metric is not None  # asked for by the key of one
    if metric.of_yield:
        return Definition(key, a.symbol("deviations") * a.symbol(metric.of_yield), source=metric.relation)
    found = metric.rule(SymbolicSolution(a))
    if isinstance(found, Definition):
        return replace(found, key=key, source=metric.relation)
    if found is None:
        return Definition(key, None, source=metric.relation, missing=Reason.NOT_A_NUMBER)
    return Definition(key, found, source=metric.relation)


@dataclass(frozen=True, eq=False, slots=True)
class SymbolicSource:
    """A source of noise current: white density [A^2/Hz], flicker at 1 Hz, and its numerator to the output, squared."""

    owner: str
    white: Any
    flicker: Any
    exponent: Any
    weight: Any
    _solution: SymbolicSolution

    @property
    def referred(self) -> Any:
        """abs(Z(0)/H(0))^2. [ohm^2]"""
        return self._solution.referred(self.owner)


class SymbolicDevice:
    """One transistor to a rule: attributes are symbols of its levels."""

    def __init__(self, a: Algebra, device: Transistor) -> None:
        """Take the algebra and the transistor."""
        self.device = device
        self._a = a

    def __getattr__(self, name: str) -> Any:
        if name not in ("matching_threshold", "matching_factor"):
            return self._a.of(self.device, name)
        made = self._a.setting.neglects
        other = self.device.name != MAIN and OTHER_MISMATCH in made
        if other or (name == "matching_factor" and FACTOR_MISMATCH in made):
            return 0
        return self._a.process(self.device, name)


class SymbolicSolution:
    """One circuit solved in symbols; indexing by a metric's key gives that metric's symbol."""

    def __init__(self, a: Algebra) -> None:
        """Take the algebra; nothing is derived yet."""
        self.a = a
        self.network = a.network

    def __getitem__(self, key: str) -> Any:
        return self.a.symbol(key)

    def sqrt(self, value: Any) -> Any:
        """Square root."""
        import sympy

        return sympy.sqrt(value)

    @property
    def current(self) -> Any:
        """Bias current. [A]"""
        return self.a.symbol("current")

    @property
    def supply(self) -> Any:
        """[V]"""
        return self.a.symbol("supply")

    @property
    def bias_overhead(self) -> Any:
        """[-]"""
        return self.a.leaf("bias_overhead")

    @property
    def output_capacitance(self) -> Any:
        """C_o. [F]"""
        return self.a.symbol("output_capacitance")

    @property
    def transistors(self) -> Sequence[SymbolicDevice]:
        """All transistors, the current source's last."""
        return tuple(SymbolicDevice(self.a, d) for d in self.a.circuit.devices)

    @property
    def output_low(self) -> Any:
        """From ground. [V]"""
        return voltages.output_range(self.a)[0]

    @property
    def output_high(self) -> Any:
        """From ground. [V]"""
        return voltages.output_range(self.a)[1]

    @property
    def input_low(self) -> Any:
        """From ground, None where the input follows. [V]"""
        return voltages.input_range(self.a)[0]

    @property
    def input_high(self) -> Any:
        """From ground, None where the input follows. [V]"""
        return voltages.input_range(self.a)[1]

    def _static(self, top: Any, bottom: Any) -> Any:
        """A ratio at zero frequency, common factors taken out."""
        if bottom == 0:
            raise AbsentError(Reason.UNLIMITED)
        return _reduced(top, bottom) if len(self.network.nodes) > 1 else top / bottom

    def signed_gain(self) -> Any:
        """H(0) with its sign. [V/V]"""
        return self._static(self.network.transfer[0], self.network.denominator[0])

    def dc_gain(self) -> Any:
        """abs(H(0)). [V/V]"""
        return abs(self.signed_gain())

    def output_resistance(self) -> Any:
        """Z_o(0). [ohm]"""
        return self._static(self.network.impedance, self.network.denominator[0])

    def supply_rejection(self) -> Any:
        """abs(A_in/A_supply). [V/V]"""
        return abs(self._static(self.network.transfer[0], self.network.supply_path))

    def input_capacitance(self) -> Any:
        """[F]"""
        return self.network.input_capacitance

    def check_response(self) -> None:
        """Raise AbsentError where there is no gain at all, or no conductance at the output, to refer a response to."""
        if self.network.transfer[0] == 0:
            raise AbsentError(Reason.NO_GAIN)
        if self.network.denominator[0] == 0:
            raise AbsentError(Reason.NOT_A_NUMBER)

    @cached_property
    def numerator(self) -> Coefficients:
        """Coefficients of the numerator of H(s), as symbols where there are several nodes."""
        return self._named("numerator", self.network.transfer)

    @cached_property
    def denominator(self) -> Coefficients:
        """Coefficients of the denominator, as symbols where there are several nodes."""
        return self._named("denominator", self.network.denominator)

    def _named(self, kind: str, coefficients: Coefficients) -> Coefficients:
        if len(self.network.denominator) == 2:
            return coefficients
        return [0 if c == 0 else self.a.symbol(f"network.{kind}.{k}") for k, c in enumerate(coefficients)]

    def _crossing(self, of: Callable[[Any, Any, Any, Any], Any], static: Any) -> Definition:
        """The frequency of a condition on the squares of numerator and denominator."""
        if static == 0:
            raise AbsentError(Reason.UNLIMITED)
        self.check_response()
        n, d = self.numerator, self.denominator
        present = tuple(k for k, c in enumerate(n) if c != 0)
        law = crossing.law(of, present, len(d))
        if law.expression is None:
            return law
        own = {crossing.coefficients("n", len(n))[k]: n[k] for k in present}
        own |= dict(zip(crossing.coefficients("d", len(d)), d, strict=True))
        root = law.root
        if root is not None:
            root = replace(root, left=root.left.xreplace(own))
        return replace(law, expression=law.expression.xreplace(own), root=root)

    def bandwidth(self) -> Definition:
        """Lowest frequency of -3 dB. [Hz]"""
        return self._crossing(crossing.fallen, self.network.denominator[0])

    def unity_gain_frequency(self) -> Definition:
        """Lowest frequency of unit magnitude. [Hz]"""
        found = self._crossing(crossing.at_one, 1)
        return replace(found, holds=abs(self.numerator[0]) > abs(self.denominator[0]))

    def pole_frequency(self) -> Definition:
        """Lowest pole. [Hz]"""
        import sympy

        d = self.denominator
        if len(d) == 2:
            return Definition("", d[0] / (2 * sympy.pi * d[1]))
        s = sympy.Symbol("s")
        root = Root(s, sum(c * s**k for k, c in enumerate(d)), sympy.S.Zero, Pick.SLOWEST)
        return Definition("", abs(s) / (2 * sympy.pi), root)

    def peaking(self) -> Definition:
        """Greatest magnitude over the DC magnitude. [-]"""
        import sympy

        x = sympy.Symbol("x", positive=True)
        self.check_response()
        n, d = self.numerator, self.denominator
        top, bottom = squared_magnitude(n, x), squared_magnitude(d, x)
        if len(d) == 2:
            limit = abs(n[1] * d[0] / (n[0] * d[1])) if len(n) > 1 else sympy.S.Zero
            return Definition("", sympy.Max(1, limit, evaluate=False))
        ratio = sympy.sqrt(top / bottom) * abs(d[0] / n[0])
        slope = sympy.expand(sympy.diff(top, x) * bottom - top * sympy.diff(bottom, x))
        return Definition("", ratio, Root(x, slope, sympy.S.Zero, Pick.GREATEST))

    def settling_time(self) -> Definition:
        """[s]"""
        return settling.define(self)

    @property
    def noise_sources(self) -> Sequence[SymbolicSource]:
        """Every source of noise current that is not neglected: all transistors, and the drive resistance."""
        a, sources = self.a, []
        alone = OTHER_NOISE in a.setting.neglects
        for d in a.circuit.devices:
            if alone and d.name != MAIN:
                continue
            owner = a.circuit.stage.transistors[0] if d in a.circuit.stage.transistors else d
            exponent = a.process(owner, "flicker_exponent")  # the stage's own transistors are of one type
            flicker = a.of(d, "flicker_density") if a.has(f"{d.name}.process.flicker") else 0
            sources.append(self._source(d.name, a.of(d, "white_density"), flicker, exponent))
        if a.circuit.driven_through_resistance and not alone:
            thermal = 4 * a.leaf("constant.boltzmann") * a.leaf("temperature")
            sources.append(self._source(RESISTOR, thermal / a.symbol("drive_resistance"), 0, 1))
        return tuple(sources)

    def _source(self, owner: str, white: Any, flicker: Any, exponent: Any) -> SymbolicSource:
        return SymbolicSource(owner, white, flicker, exponent, self.network.noise(owner)[0] ** 2, self)

    def referred(self, owner: str) -> Any:
        """abs(Z(0)/H(0))^2 of a source of noise current. AbsentError where there is no gain. [ohm^2]"""
        if self.network.transfer[0] == 0:
            raise AbsentError(Reason.NO_GAIN)
        return self._static(self.network.noise(owner)[0], self.network.transfer[0]) ** 2

    def referred_to_input(self, device: SymbolicDevice) -> Any:
        """abs(Z(0)/H(0))^2 of a transistor's current. [V^2/A^2]"""
        return self.referred(device.device.name)

    @property
    def white_noise_power(self) -> Any:
        """White noise at the output. [V^2]"""
        return self.a.symbol("white_noise_power")

    @property
    def flicker_noise_power(self) -> Any:
        """Flicker noise at the output. [V^2]"""
        silent = FLICKER in self.a.setting.neglects or all(s.flicker == 0 for s in self.noise_sources)
        return 0 if silent else self.a.symbol("flicker_noise_power")

    def noise_corner(self) -> Any:
        """Frequency where flicker equals white. [Hz]"""
        import sympy

        white = sum(s.weight * s.white for s in self.noise_sources)
        loud = [s for s in self.noise_sources if s.flicker != 0]
        if not loud:
            return sympy.S.Zero
        if len({s.exponent for s in loud}) == 1:
            return (sum(s.weight * s.flicker for s in loud) / white) ** (1 / loud[0].exponent)
        f = sympy.Symbol("f", positive=True)
        flicker = sum(s.weight * s.flicker * f**-s.exponent for s in loud)
        return Definition("", f, Root(f, flicker, white, Pick.ONLY))


@lru_cache(maxsize=1024)
def _reduced(top: Any, bottom: Any) -> Any:
    import sympy

    return sympy.factor_terms(sympy.cancel(top / bottom))


def _white_noise_power(a: Algebra) -> Definition:
    solution = SymbolicSolution(a)
    d = solution.denominator
    total: Any = 0
    for source in solution.noise_sources:
        numerator = a.network.noise(source.owner)
        named = [
            c if len(d) == 2 or c == 0 else a.symbol(f"network.noise.{source.owner}.{k}")
            for k, c in enumerate(numerator)
        ]
        total = total + source.white / 2 * _integral(named, d)
    return Definition("white_noise_power", total, source="integral of abs(Z_k)^2 S_k over all frequency")


def _integral(numerator: Coefficients, denominator: Coefficients) -> Any:
    import sympy

    c, d, law = noise_integral(len(denominator) - 1)
    padded = [*numerator, *([sympy.S.Zero] * len(denominator))][: len(c)]
    return law.subs(dict(zip((*c, *d), (*padded, *denominator), strict=True)), simultaneous=True)


def _flicker_noise_power(a: Algebra) -> Definition:
    import sympy

    solution = SymbolicSolution(a)
    start, stop = a.symbol("noise_from"), a.symbol("noise_until")
    total: Any = 0
    for source in solution.noise_sources:
        if source.flicker == 0:
            continue
        at_dc = solution._static(a.network.noise(source.owner)[0], a.network.denominator[0]) ** 2  # noqa: SLF001
        rest = 1 - source.exponent
        span = sympy.log(stop / start) if rest == 0 else (stop**rest - start**rest) / rest
        total = total + at_dc * source.flicker * span
    return Definition("flicker_noise_power", total, source="flicker density from noise_from to the pole frequency")


def _noise_until(a: Algebra) -> Definition:
    import sympy

    ends = a.symbol("pole_frequency"), a.symbol("noise_from")
    return Definition(
        "noise_until", sympy.Max(*ends, evaluate=False), source="up to the pole; nothing where it is lower"
    )


def _output_capacitance(a: Algebra) -> Definition:
    found = a.network.node_capacitance("out")
    return Definition("output_capacitance", found, source="all capacitance that hangs on the output node")


OF_CIRCUIT: dict[str, Callable[[Algebra], Definition]] = {
    "white_noise_power": _white_noise_power,
    "flicker_noise_power": _flicker_noise_power,
    "noise_until": _noise_until,
    "output_capacitance": _output_capacitance,
}
"""Levels of the circuit that metrics are written in."""
