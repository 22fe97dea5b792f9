"""Stages one behind the other: the product of their exact transfer functions, and what it makes of their noise.

No polynomial of the whole product is ever formed, since its roots would lose digits. The bandwidth is sought on the
factors; noise is integrated over a realisation of the path in first-order sections, whose matrix is triangular with
the poles on its diagonal; the step response is summed by partial fractions, or run through the same realisation where
poles lie so close that the fractions cancel. Arrays run over conditions.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from worksheet.device.arrays import Array, Complex, Number
from worksheet.engine import polynomial as poly
from worksheet.engine import settling
from worksheet.engine.cascade_states import States, noise_gains, settled
from worksheet.engine.measured import Measured, missing_where
from worksheet.engine.solution import NumericSolution, flicker_span
from worksheet.model.metrics import Reason

Mask = NDArray[np.bool_]

_TWO_PI = 2.0 * np.pi
_POINTS = 1200
_BEYOND = 1e3
"""How far beyond the poles and zeros the fall of 3 dB is sought: 36 equal poles fall at 0.14 of their frequency."""
_BISECTIONS = 60
_CANCELS = 1e-7
"""Uncertainty of the step response, as a share of the tolerance, above which partial fractions are left."""


@dataclass(frozen=True, eq=False, slots=True)
class Noise:
    """One source of noise current of a stage: `numerator` of its transfer to the stage's output, densities [A^2/Hz]."""

    numerator: poly.Poly
    white: Number
    flicker: Number
    exponent: Number


@dataclass(frozen=True, eq=False)
class Link:
    """One stage of a path.

    Attributes:
        numerator, denominator: H(s), coefficients lowest first, each a scalar or over conditions.
        noise: Its sources of noise.
        noise_from: From where flicker counts. [Hz]
        constants: -1/pole of its poles along a first axis. [s]
    """

    numerator: poly.Poly
    denominator: poly.Poly
    noise: tuple[Noise, ...]
    noise_from: Number
    constants: Complex

    @property
    def gain(self) -> Array:
        """H(0), with its sign. [V/V]"""
        with np.errstate(all="ignore"):
            return np.asarray(self.numerator[0] / np.asarray(self.denominator[0]))


def link_of(solution: NumericSolution, pick: Callable[[Number], Number]) -> Link:
    """A solved stage as a link.

    Args:
        solution: The stage, over conditions.
        pick: Takes from a value over those the conditions of the path.
    """

    def picked(coefficients: Sequence[Number]) -> poly.Poly:
        return [pick(one) for one in coefficients]

    noise = tuple(
        Noise(picked(s.numerator), pick(s.white), pick(s.flicker), pick(s.exponent)) for s in solution.noise_sources
    )
    denominator = picked(solution.network.denominator)
    with np.errstate(all="ignore"):
        constants = poly.inverse_roots(denominator)
    return Link(picked(solution.network.transfer), denominator, noise, pick(solution.inputs.noise_from), constants)


class Cascade:
    """A signal path of links over common conditions."""

    def __init__(self, links: Sequence[Link], conditions: int) -> None:
        """Take the links in the order of the signal; nothing is computed yet."""
        self.links = tuple(links)
        self._shape = (conditions,)

    def _over(self, values: Number) -> Array:
        return np.broadcast_to(np.asarray(values), self._shape)

    def without(self, place: int) -> Cascade:
        """The path with one link's poles, zeros and noise taken out and its gain at DC kept."""
        link = self.links[place]
        ideal = Link([link.gain], [1.0], (), link.noise_from, np.zeros((0, 1), dtype=np.complex128))
        return Cascade([ideal if k == place else one for k, one in enumerate(self.links)], *self._shape)

    def first(self) -> Cascade:
        """The path at its first condition alone."""

        def taken(values: Number) -> Number:
            array = np.asarray(values)
            return array if array.ndim == 0 else array[..., :1]

        def link(one: Link) -> Link:
            noise = tuple(
                Noise([taken(c) for c in n.numerator], taken(n.white), taken(n.flicker), taken(n.exponent))
                for n in one.noise
            )
            top, bottom = ([taken(c) for c in part] for part in (one.numerator, one.denominator))
            constants = one.constants if one.constants.ndim < 2 else one.constants[:, :1]
            return Link(top, bottom, noise, taken(one.noise_from), constants)

        return Cascade([link(one) for one in self.links], 1)

    @cached_property
    def _unlimited(self) -> Mask:
        return self._any([link.denominator[0] for link in self.links])

    @cached_property
    def _no_gain(self) -> Mask:
        return self._any([link.numerator[0] for link in self.links])

    def _any(self, values: Sequence[Number]) -> Mask:
        """Where any of the values is 0."""
        found = np.zeros(self._shape, dtype=np.bool_)
        for value in values:
            found |= np.asarray(value) == 0
        return found

    @cached_property
    def constants(self) -> Complex:
        """-1/pole of every pole of the path along a first axis, over conditions. [s]"""
        every = [np.broadcast_to(tau, (len(tau), *self._shape)) for tau in (link.constants for link in self.links)]
        return np.concatenate(every)

    def gain(self, first: int = 0) -> Array:
        """Product of H(0) with its sign from a link on, over conditions. [V/V]"""
        total = np.ones(self._shape)
        for link in self.links[first:]:
            total = total * link.gain
        return total

    def dc_gain(self) -> Measured:
        """abs of the product's H(0). [V/V]"""
        return missing_where(np.abs(self.gain()), (self._unlimited, Reason.UNLIMITED))

    def bandwidth(self) -> Measured:
        """Lowest frequency at which the product has fallen by 3 dB. [Hz], over conditions

        Source: the definition, sought on the factors over twelve hundred points a path and halved to the last digit.
        """
        with np.errstate(all="ignore"):
            low, high, found = self._bracket()
            for _ in range(_BISECTIONS):
                middle = np.sqrt(low * high)
                fallen = self._fallen(middle)
                low, high = np.where(fallen, low, middle), np.where(fallen, middle, high)
        nothing = np.asarray(np.all(self.constants == 0, axis=0), dtype=np.bool_)
        return missing_where(
            self._over(np.sqrt(low * high) / _TWO_PI),
            (self._unlimited | (nothing & ~found), Reason.UNLIMITED),
            (self._no_gain, Reason.NO_GAIN),
            (~found, Reason.FEED_THROUGH),
        )

    def _bracket(self) -> tuple[Array, Array, Mask]:
        """Angular frequencies on either side of the first fall below 3 dB, and whether there is one."""
        rates = 1.0 / np.abs(self.constants)
        zeros = [
            1.0 / np.abs(self._over_all(poly.inverse_roots(link.numerator))) for link in self.links if _rises(link)
        ]
        corners = np.concatenate([rates, *zeros]) if len(rates) else np.ones((1, *self._shape))
        fine = np.isfinite(corners) & (corners > 0)
        least = np.min(np.where(fine, corners, np.inf), axis=0)
        most = np.max(np.where(fine, corners, 0.0), axis=0)
        none = ~np.isfinite(least)
        least, most = np.where(none, 1.0, least), np.where(none, 1.0, most)
        grid = np.geomspace(least / _BEYOND, most * _BEYOND, _POINTS)
        fallen = self._fallen(grid)
        place = np.maximum(np.argmax(fallen, axis=0), 1)
        columns = np.arange(self._shape[0])
        return grid[place - 1, columns], grid[place, columns], np.asarray(fallen.any(axis=0))

    def _over_all(self, values: Complex) -> Complex:
        return np.broadcast_to(values, (len(values), *self._shape))

    def _fallen(self, omega: Array) -> Mask:
        """Whether the magnitude has fallen by more than 3 dB at angular frequencies, conditions along the last axis."""
        x, ratio = omega * omega, np.ones(np.shape(omega))
        for link in self.links:
            top, bottom = poly.squared_magnitude(link.numerator), poly.squared_magnitude(link.denominator)
            ratio = ratio * (poly.evaluate(top, x) / top[0]) / (poly.evaluate(bottom, x) / bottom[0])
        return np.asarray(ratio < 0.5)

    @cached_property
    def _states(self) -> States:
        return States(self.links, self._shape)

    def noise_powers(self) -> Array:
        """Noise that each link puts on the path's output. [V^2], shape (links, conditions)

        White: the density of each source, times the squared magnitude of its transfer to the link's output and of
        every later link's exact transfer function, over all frequency; exact, by the gramian of the path. Flicker: by
        the rule of a single stage, with the gains at DC, from the link's own `noise_from` up to the lowest pole that
        lies between the source and the output, the link's own included.
        """
        with np.errstate(all="ignore"):
            white = np.stack([self._over(power) for power in noise_gains(self._states, self.links)])
            return white + np.stack([self._flicker(k) for k in range(len(self.links))])

    def _flicker(self, place: int) -> Array:
        link = self.links[place]
        slowest = [np.max(np.abs(one.constants), axis=0) for one in self.links[place:] if len(one.constants)]
        if not slowest:
            return np.zeros(self._shape)
        stop = 1.0 / (_TWO_PI * np.max([self._over(tau) for tau in slowest], axis=0))
        after, total = self.gain(place + 1) ** 2, np.zeros(self._shape)
        for source in link.noise:
            at_dc = (source.numerator[0] / np.asarray(link.denominator[0])) ** 2
            span = flicker_span(link.noise_from, np.maximum(stop, link.noise_from), source.exponent)
            total = total + at_dc * source.flicker * span * after
        return total

    def output_noise(self) -> Measured:
        """Of all links together. [V rms], over conditions"""
        return missing_where(np.sqrt(self.noise_powers().sum(axis=0)), (self._unlimited, Reason.UNLIMITED))

    def input_noise(self) -> Measured:
        """output_noise over the path's gain. [V rms], over conditions"""
        with np.errstate(all="ignore"):
            referred = self.output_noise().values / np.abs(self.gain())
        return missing_where(referred, (self._unlimited, Reason.UNLIMITED), (self._no_gain, Reason.NO_GAIN))

    def settling_time(self, tolerance: float) -> Measured:
        """From a small step at the input until the output stays within the tolerance of its final change. [s]

        Args:
            tolerance: Share of the final change. [-]
        Source: exact step response of the product, by partial fractions; where they cancel, by the exponential of the
            path's state matrix.
        """
        constants = self.constants
        constants = constants[np.any(constants != 0, axis=1)]
        if not len(constants):
            return missing_where(np.zeros(self._shape), (self._no_gain, Reason.NO_GAIN))
        if len(constants) == 1:
            numerator: Sequence[Number] = [
                1.0,
                sum(link.numerator[1] / link.numerator[0] for link in self.links if _rises(link)),
            ]
            times = settling.linear(numerator, [1.0, constants[0].real], tolerance)
        else:
            with np.errstate(all="ignore"):
                times, weight = settling.of_poles([link.numerator for link in self.links], constants, tolerance)
                sure = self._over(weight**2 * np.finfo(float).eps) <= _CANCELS * tolerance
                near = ~sure & ~self._unlimited & ~self._no_gain
            if near.any():
                times = np.array(self._over(times))
                for place in np.flatnonzero(near).tolist():
                    times[place] = settled(self._states, place, tolerance)
        times = self._over(times)
        return missing_where(
            times,
            (self._unlimited, Reason.UNLIMITED),
            (self._no_gain, Reason.NO_GAIN),
            (np.isnan(times), Reason.UNSTABLE),
        )


def _rises(link: Link) -> bool:
    """Whether a transfer function has a zero."""
    return len(link.numerator) > 1 and any(np.any(np.asarray(x) != 0) for x in link.numerator[1:])
