"""Every metric as an expression: the rules of model.metrics evaluated over a stage that is solved in symbols."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace
from functools import cached_property, lru_cache
from typing import TYPE_CHECKING, Any

from worksheet.engine.symbolic import settling, voltages
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
    """A source of noise current: white density [A^2/Hz], and abs(Z(0)/H(0))^2 [ohm^2]."""

    owner: str
    white: Any
    flicker: Any
    exponent: Any
    referred: Any


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
        law = _crossing_law(of, present, len(d))
        if law.expression is None:
            return law
        own = {_coefficients("n", len(n))[k]: n[k] for k in present}
        own |= dict(zip(_coefficients("d", len(d)), d, strict=True))
        root = law.root
        if root is not None:
            root = replace(root, left=root.left.xreplace(own))
        return replace(law, expression=law.expression.xreplace(own), root=root)

    def bandwidth(self) -> Definition:
        """Lowest frequency of -3 dB. [Hz]"""
        return self._crossing(_fallen, self.network.denominator[0])

    def unity_gain_frequency(self) -> Definition:
        """Lowest frequency of unit magnitude. [Hz]"""
        found = self._crossing(_at_one, 1)
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

    def noise_sources_of(self, neglecting: bool = True) -> Sequence[SymbolicSource]:
        """Every source of noise current, or those that are not neglected."""
        a, sources = self.a, []
        for d in a.circuit.devices:
            if neglecting and d.name != MAIN and OTHER_NOISE in a.setting.neglects:
                continue
            owner = a.circuit.stage.transistors[0] if d in a.circuit.stage.transistors else d
            exponent = a.process(owner, "flicker_exponent")  # the stage's own transistors are of one type
            flicker = a.of(d, "flicker_density") if a.has(f"{d.name}.process.flicker") else 0
            sources.append(self._source(d.name, a.of(d, "white_density"), flicker, exponent))
        drive = a.circuit.driven_through_resistance and not (neglecting and OTHER_NOISE in a.setting.neglects)
        if drive:
            thermal = 4 * a.leaf("constant.boltzmann") * a.leaf("temperature")
            sources.append(self._source(RESISTOR, thermal / a.symbol("drive_resistance"), 0, 1))
        return tuple(sources)

    @property
    def noise_sources(self) -> Sequence[SymbolicSource]:
        """Every source of noise current that is not neglected."""
        return self.noise_sources_of()

    def _source(self, owner: str, white: Any, flicker: Any, exponent: Any) -> SymbolicSource:
        if self.network.transfer[0] == 0:
            raise AbsentError(Reason.NO_GAIN)
        referred = self._static(self.network.noise(owner)[0], self.network.transfer[0]) ** 2
        return SymbolicSource(owner, white, flicker, exponent, referred)

    def referred_to_input(self, device: SymbolicDevice) -> Any:
        """abs(Z(0)/H(0))^2 of a transistor's current. [V^2/A^2]"""
        return next(s.referred for s in self.noise_sources_of(neglecting=False) if s.owner == device.device.name)

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

        white = sum(s.referred * s.white for s in self.noise_sources)
        loud = [s for s in self.noise_sources if s.flicker != 0]
        if not loud:
            return sympy.S.Zero
        if len({s.exponent for s in loud}) == 1:
            return (sum(s.referred * s.flicker for s in loud) / white) ** (1 / loud[0].exponent)
        f = sympy.Symbol("f", positive=True)
        flicker = sum(s.referred * s.flicker * f**-s.exponent for s in loud)
        return Definition("", f, Root(f, flicker, white, Pick.ONLY))


@lru_cache(maxsize=1024)
def _reduced(top: Any, bottom: Any) -> Any:
    import sympy

    return sympy.factor_terms(sympy.cancel(top / bottom))


def _coefficients(letter: str, count: int) -> tuple[Any, ...]:
    """Symbols for the coefficients of a polynomial; a denominator's first one is positive."""
    import sympy

    first = sympy.Symbol(f"{letter}_0", positive=True) if letter == "d" else sympy.Symbol(f"{letter}_0", real=True)
    return (first, *(sympy.Symbol(f"{letter}_{k}", real=True) for k in range(1, count)))


def _fallen(top: Any, bottom: Any, n: Any, d: Any) -> Any:
    """0 where the squared magnitude has fallen to half of its value at zero frequency."""
    return 2 * d**2 * top - n**2 * bottom


def _at_one(top: Any, bottom: Any, n: Any, d: Any) -> Any:  # noqa: ARG001
    """0 where the magnitude is 1."""
    return top - bottom


@lru_cache(maxsize=64)
def _crossing_law(of: Callable[[Any, Any, Any, Any], Any], present: tuple[int, ...], count: int) -> Definition:
    """The frequency of a condition for coefficients as symbols; written out where it is linear in omega^2.

    Args:
        of: The condition on numerator and denominator squared, and on their first coefficients.
        present: Powers of s that the numerator has.
        count: How many coefficients the denominator has.
    """
    import sympy

    x = sympy.Symbol("x", positive=True)
    every, d = _coefficients("n", max(present, default=0) + 1), _coefficients("d", count)
    n = [c if k in present else 0 for k, c in enumerate(every)]
    equation = of(squared_magnitude(n, x), squared_magnitude(d, x), n[0], d[0])
    poly = sympy.Poly(sympy.expand(equation), x)
    if poly.degree() == 1:
        slope, static = poly.all_coeffs()
        top, bottom = sympy.fraction(sympy.cancel(static / -slope))
        usual = dict.fromkeys((*every, *d), 1) | {every[0]: 3, d[-1]: 7}  # a gain above 1, a pole below the zero
        sign = 1 if top.subs(usual) > 0 else -1
        return Definition("", sympy.sqrt(sign * top) / (2 * sympy.pi * sympy.sqrt(sign * bottom)))
    terms = [c * x ** k[0] for k, c in sorted(poly.terms())]
    root = Root(x, sum(terms), sympy.S.Zero, Pick.LOWEST_POSITIVE)
    return Definition("", sympy.sqrt(x) / (2 * sympy.pi), root)


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
    start = a.symbol("noise_from")
    stop = sympy.Max(a.symbol("pole_frequency"), start, evaluate=False)
    total: Any = 0
    for source in solution.noise_sources:
        if source.flicker == 0:
            continue
        at_dc = solution._static(a.network.noise(source.owner)[0], a.network.denominator[0]) ** 2  # noqa: SLF001
        rest = 1 - source.exponent
        span = sympy.log(stop / start) if rest == 0 else (stop**rest - start**rest) / rest
        total = total + at_dc * source.flicker * span
    return Definition("flicker_noise_power", total, source="flicker density from noise_from to the pole frequency")


def _output_capacitance(a: Algebra) -> Definition:
    found = a.network.node_capacitance("out")
    return Definition("output_capacitance", found, source="all capacitance that hangs on the output node")


OF_CIRCUIT: dict[str, Callable[[Algebra], Definition]] = {
    "white_noise_power": _white_noise_power,
    "flicker_noise_power": _flicker_noise_power,
    "output_capacitance": _output_capacitance,
}
"""Levels of the circuit that metrics are written in."""
