"""A solved stage in numbers: what the rules of model.metrics ask of it, over all conditions at once.

Everything is computed when it is first asked for and kept, so that a caller pays for the metrics it wants.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from functools import cached_property

import numpy as np

from worksheet.device.arrays import Array, Complex, Number
from worksheet.device.constants import BOLTZMANN
from worksheet.engine import polynomial as poly
from worksheet.engine import settling
from worksheet.engine.inputs import Inputs
from worksheet.engine.levels import Levels
from worksheet.engine.measured import Measured, either, missing_where, with_reasons_of
from worksheet.engine.nodal import Network
from worksheet.engine.operating import Operating, operating_points
from worksheet.model import metrics
from worksheet.model.metrics import Reason

_TWO_PI = 2.0 * np.pi


@dataclass(frozen=True, eq=False, slots=True)
class Source:
    """A source of noise current.

    Attributes:
        owner: Name of the device, or "drive_resistor".
        numerator: Transfer to the output, over the network's denominator. [ohm det]
        white: [A^2/Hz]
        flicker: At 1 Hz. [A^2/Hz]
        exponent: alpha_F. [-]
        referred: abs(Z(0)/H(0))^2.
    """

    owner: str
    numerator: poly.Poly
    white: Number
    flicker: Number
    exponent: Number
    referred: Array


class NumericSolution:
    """One circuit solved over its conditions; indexing by a metric's key gives its values (NaN where missing)."""

    def __init__(self, inputs: Inputs, at_nominal: Callable[[], Levels] | None = None) -> None:
        """Take the numbers; nothing is computed yet.

        Args:
            inputs: The numbers.
            at_nominal: The levels at the nominal condition, where that is not the first one.
        """
        self.inputs = inputs
        self.levels = Levels(inputs, at_nominal)
        self.devices = operating_points(inputs, self.levels)
        self.network = Network(inputs, self.devices)
        self._measured: dict[str, Measured] = {}
        self._asked: list[list[Measured]] = []

    def measure(self, key: str) -> Measured:
        """One metric with the reasons where it does not exist. KeyError for an unknown metric."""
        if key not in self._measured:
            metric = metrics.find(key)
            if metric is None:
                raise KeyError(key)
            self._asked.append([])
            with np.errstate(all="ignore"):
                result = metric.rule(self)
            parts = self._asked.pop()
            self._measured[key] = result if isinstance(result, Measured) else self._explained(result, parts)
        if self._asked:
            self._asked[-1].append(self._measured[key])
        return self._measured[key]

    def __getitem__(self, key: str) -> Array:
        return self.measure(key).values

    def _explained(self, values: Number, parts: Sequence[Measured] = ()) -> Measured:
        """Values with a reason where they are missing: that of a part, or what the stage lacks."""
        static, dynamic = self._static[1] == 0, np.asarray(self.output_capacitance) == 0
        return with_reasons_of(values, parts, (static, Reason.NO_CONDUCTANCE), (dynamic, Reason.NO_CAPACITANCE))

    def sqrt(self, value: Number) -> Array:
        """Square root, elementwise."""
        return np.asarray(np.sqrt(value))

    @property
    def current(self) -> Number:
        """Bias current. [A]"""
        return self.inputs.current

    @property
    def supply(self) -> Number:
        """[V]"""
        return self.inputs.supply

    @property
    def bias_overhead(self) -> Number:
        """[-]"""
        return self.inputs.bias_overhead

    @property
    def transistors(self) -> Sequence[Operating]:
        """All transistors, the current source's last."""
        return tuple(self.devices.values())

    @property
    def output_capacitance(self) -> Number:
        """C_o. [F]"""
        return self.network.output_capacitance

    @cached_property
    def output_low(self) -> Array:
        """From ground. [V]"""
        return self._lower_end(self.levels.output_low, self.levels.output_high)

    @cached_property
    def output_high(self) -> Array:
        """From ground. [V]"""
        return self._lower_end(self.levels.output_high, self.levels.output_low)

    @cached_property
    def input_low(self) -> Array:
        """From ground. [V]"""
        return self._lower_end(self.levels.input_low, self.levels.input_high)

    @cached_property
    def input_high(self) -> Array:
        """From ground. [V]"""
        return self._lower_end(self.levels.input_high, self.levels.input_low)

    def _lower_end(self, end: Array | None, mirrored: Array | None) -> Array:
        """An end of a range from ground: in a p-channel stage the two ends change places."""
        if end is None or mirrored is None:
            return np.full((), np.nan)
        down = self.inputs.mirrored
        chosen = mirrored if down.all() else end if not down.any() else np.where(down, mirrored, end)
        return self.levels.turn(chosen)

    @cached_property
    def _static(self) -> tuple[Array, Array]:
        """Numerator and denominator of H(0)."""
        return np.asarray(self.network.transfer[0]), np.asarray(self.network.denominator[0])

    def dc_gain(self) -> Measured:
        """abs(H(0))."""
        top, bottom = self._static
        return missing_where(np.abs(top / bottom), (bottom == 0, Reason.UNLIMITED))

    def signed_gain(self) -> Array:
        """H(0) with its sign; not finite where the output conductance is 0."""
        top, bottom = self._static
        return np.asarray(top / bottom)

    def output_resistance(self) -> Measured:
        """Z_o(0). [ohm]"""
        bottom = self._static[1]
        return missing_where(self.network.impedance[0] / bottom, (bottom == 0, Reason.UNLIMITED))

    @cached_property
    def _squares(self) -> tuple[poly.Poly, poly.Poly]:
        """abs(N)^2 and abs(D)^2 as polynomials in omega^2."""
        return poly.squared_magnitude(self.network.transfer), poly.squared_magnitude(self.network.denominator)

    def bandwidth(self) -> Measured:
        """Lowest frequency of -3 dB. [Hz]"""
        (top, bottom), (n2, d2) = self._static, self._squares
        fallen = [2.0 * bottom**2 * n - top**2 * d for n, d in zip(n2, d2, strict=True)]
        root = np.sqrt(poly.lowest_positive_root(fallen)) / _TWO_PI
        unlimited = (bottom == 0) | (np.asarray(self.output_capacitance) == 0)
        return missing_where(
            root, (unlimited, Reason.UNLIMITED), (top == 0, Reason.NO_GAIN), (np.isnan(root), Reason.FEED_THROUGH)
        )

    @cached_property
    def time_constants(self) -> Complex:
        """-1/pole of every pole along a first axis, complex. [s]"""
        return poly.inverse_roots(self.network.denominator)

    def pole_frequency(self) -> Measured:
        """Lowest pole. [Hz]"""
        slowest = np.max(np.abs(self.time_constants), axis=0)
        return self._explained(1.0 / (_TWO_PI * slowest))

    def unity_gain_frequency(self) -> Measured:
        """Lowest frequency of unit magnitude. [Hz]"""
        (top, bottom), (n2, d2) = self._static, self._squares
        root = np.sqrt(poly.lowest_positive_root([n - d for n, d in zip(n2, d2, strict=True)])) / _TWO_PI
        return missing_where(
            root, (np.abs(top) <= np.abs(bottom), Reason.GAIN_BELOW_1), (np.isnan(root), Reason.FEED_THROUGH)
        )

    def peaking(self) -> Measured:
        """Greatest magnitude over the DC magnitude; the limit at high frequency counts."""
        (top, bottom), (n2, d2) = self._static, self._squares
        relative_n, relative_d = [n / top**2 for n in n2], [d / bottom**2 for d in d2]
        peak = np.maximum(1.0, _limit_ratio(relative_n, relative_d))
        turning = _turning_points(relative_n, relative_d)
        if len(turning) > 1 or turning.ndim > 1:
            ratio = poly.evaluate(relative_n, turning) / poly.evaluate(relative_d, turning)
            peak = np.maximum(peak, np.nanmax(np.where(np.isnan(ratio), 1.0, ratio), axis=0))
        return missing_where(np.sqrt(peak), (top == 0, Reason.NO_GAIN))

    def input_capacitance(self) -> Measured:
        """[F]"""
        return missing_where(
            self.network.input_capacitance, (~np.isfinite(np.asarray(self.network.input_capacitance)), Reason.UNLIMITED)
        )

    def supply_rejection(self) -> Measured:
        """abs(A_in/A_supply)."""
        path = np.asarray(self.network.supply_transfer)
        return missing_where(np.abs(self._static[0] / path), (path == 0, Reason.UNLIMITED))

    def settling_time(self) -> Measured:
        """[s]"""
        step = self.inputs.step_size
        large = np.zeros((), dtype=bool) if step is None else np.asarray(step) > 0
        if step is None or not large.any():
            return self._small_step()
        stepped = self._source_step(step) if self.inputs.circuit.stage.source_output else self._drain_step(step)
        return stepped if large.all() else either(large, stepped, self._small_step())

    def _small_step(self) -> Measured:
        settled = settling.linear(self.network.transfer, self.network.denominator, self.inputs.settling_tolerance)
        return missing_where(settled, (self._static[0] == 0, Reason.NO_GAIN), (np.isnan(settled), Reason.UNSTABLE))

    def _drain_step(self, step: Number) -> Measured:
        tau = 1.0 / (_TWO_PI * self["pole_frequency"])
        return missing_where(
            settling.drain_step(step, self["dc_gain"], self["slew_rate"], tau, self.inputs.settling_tolerance)
        )

    def _source_step(self, step: Number) -> Measured:
        main, circuit = self.transistors[0], self.inputs.circuit
        p = main.parameters
        drive = (main.kappa if circuit.stage.drive == "gate" else p.drain_coupling) * step
        share = main.kappa + p.drain_coupling if circuit.bulk == "source" else 1.0
        times = [
            settling.source_step(
                sign * drive,
                main.inversion_coefficient,
                main.specific_current,
                self.output_capacitance / share,
                self.inputs.thermal,
                self.inputs.settling_tolerance,
            )
            for sign in (1.0, -1.0)
        ]
        return missing_where(np.maximum(*times), (np.asarray(p.velocity) > 0, Reason.LONG_CHANNEL_ONLY))

    @cached_property
    def noise_sources(self) -> Sequence[Source]:
        """Every source of noise current: all transistors, and the drive resistance."""
        sources = [
            self._source(
                d.name,
                self.network.channel_transfer(d.device),
                d.white_density,
                d.flicker_density,
                d.parameters.flicker_exponent,
            )
            for d in self.transistors
        ]
        if self.inputs.circuit.driven_through_resistance:
            stands = (
                np.asarray(self.inputs.drive_resistance) > 0
            )  # none has no noise; the least one has that of its bandwidth
            white = np.where(stands, 4.0 * BOLTZMANN * self.inputs.temperature / self.inputs.resistance, 0.0)
            sources.append(self._source("drive_resistor", self.network.drive_transfer(), white, 0.0, 1.0))
        return tuple(sources)

    def _source(self, owner: str, numerator: poly.Poly, white: Number, flicker: Number, exponent: Number) -> Source:
        with np.errstate(all="ignore"):
            referred = np.asarray((numerator[0] / self._static[0]) ** 2)
        return Source(owner, numerator, white, flicker, exponent, referred)

    def referred_to_input(self, device: Operating) -> Array:
        """abs(Z(0)/H(0))^2 of a transistor's current. [V^2/A^2]"""
        return next(source.referred for source in self.noise_sources if source.owner == device.name)

    @cached_property
    def white_noise_power(self) -> Number:
        """White noise at the output, over all frequency. [V^2]"""
        total: Number = 0.0
        for source in self.noise_sources:
            total = total + source.white / 2.0 * poly.noise_integral(source.numerator, self.network.denominator)
        return total

    @cached_property
    def flicker_noise_power(self) -> Number:
        """Flicker noise at the output, from noise_from to the pole frequency. [V^2]"""
        start, stop = self.inputs.noise_from, self["pole_frequency"]
        total: Number = 0.0
        for source in self.noise_sources:
            at_dc = (source.numerator[0] / self._static[1]) ** 2
            total = total + at_dc * source.flicker * flicker_span(start, np.maximum(stop, start), source.exponent)
        return total

    def noise_corner(self) -> Measured:
        """Frequency where flicker equals white. [Hz]"""
        white = sum((s.numerator[0] ** 2 * np.asarray(s.white) for s in self.noise_sources), np.zeros(()))
        flicker = [
            (np.asarray(s.numerator[0] ** 2 * s.flicker), np.asarray(s.exponent))
            for s in self.noise_sources
            if np.any(s.flicker)
        ]
        if not flicker:
            return missing_where(np.zeros_like(white))
        return missing_where(_corner(white, flicker))

    @cached_property
    def shape(self) -> tuple[int, ...]:
        """Shape of the conditions, samples included."""
        values = [self.inputs.temperature, self.inputs.supply, self.inputs.current, self.inputs.load_capacitance]
        values += [p.specific for p in self.inputs.devices.values()]
        return np.broadcast_shapes(*[np.shape(v) for v in values])


def _limit_ratio(numerator: Sequence[Number], denominator: Sequence[Number]) -> Array:
    """Limit of the ratio of two polynomials at infinity, by the highest power that either has."""
    limit = np.ones(())
    for top, bottom in zip(numerator, denominator, strict=True):
        n, d = np.asarray(top), np.asarray(bottom)
        limit = np.where(d != 0, n / np.where(d != 0, d, 1.0), np.where(n != 0, np.inf, limit))
    return limit


def _turning_points(numerator: Sequence[Number], denominator: Sequence[Number]) -> Array:
    """Places x > 0 where numerator/denominator has no slope, along a first axis; NaN where there is none."""
    if len(numerator) <= 2:
        return np.full((1,), np.nan)
    slope_n = [k * c for k, c in enumerate(numerator)][1:]
    slope_d = [k * c for k, c in enumerate(denominator)][1:]
    difference = poly.add(poly.multiply(slope_n, denominator), poly.scale(poly.multiply(numerator, slope_d), -1.0))
    return poly.positive_roots(difference[: 2 * len(numerator) - 3])


def flicker_span(start: Number, stop: Number, exponent: Number) -> Array:
    """Integral of f^-alpha from start to stop, exact also near alpha = 1. [Hz^(1-alpha)]"""
    rest = 1.0 - np.asarray(exponent)
    ratio = np.log(stop / start)
    near = np.abs(rest * ratio) < 1e-9
    grown = np.expm1(rest * ratio) / np.where(rest == 0, 1.0, rest)
    return np.asarray(start**rest * np.where(near, ratio * (1.0 + rest * ratio / 2.0), grown))


def _corner(white: Array, flicker: Sequence[tuple[Array, Array]]) -> Array:
    """f with sum of a f^-alpha = white: closed form for one exponent, else Newton's iteration in ln f."""
    total = sum((a for a, _ in flicker), np.zeros(()))
    exponent, one = flicker[-1][1], np.ones((), dtype=bool)
    for a, other in reversed(flicker[:-1]):  # that of the first source that has any
        exponent = np.where(a > 0, other, exponent)
    for a, other in flicker:
        one = one & ((a == 0) | (other == exponent))
    f = np.where(total == 0, 0.0, (total / white) ** (1.0 / exponent))
    return f if one.all() else np.where(one | (total == 0), f, _corner_of_several(white, flicker, np.log(f)))


def _corner_of_several(white: Array, flicker: Sequence[tuple[Array, Array]], start: Array) -> Array:
    x = start
    for _ in range(60):
        parts = [a * np.exp(-alpha * x) for a, alpha in flicker]
        level = sum(parts, np.zeros(()))
        slope = sum((alpha * part for (_, alpha), part in zip(flicker, parts, strict=True)), np.zeros(()))
        x = x + np.clip(np.log(level / white) * level / slope, -50.0, 50.0)
    return np.exp(x)
