"""Settling: linear from the exact step response, and large steps at a source or a drain output."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from worksheet.device import charge
from worksheet.device.arrays import Array, Complex, Number
from worksheet.engine import polynomial as poly

_ROUNDS, _HALVE = 80, 5
"""Steps of false position (Illinois) to the last crossing; every fifth halves the bracket."""
_CLOSE, _LEVEL = 1e-14, 2e-14
"""How narrow a bracket, and how near the tolerance, relative to it, an error has to be."""
_LOGARITHMIC, _EVEN = 96, 400
"""Points in time at which the error of three or more poles is looked at: even ones only where it can ring."""
_AT_ONCE = 8
"""Points of that grid that are looked at together."""
_APART = 1e-7


def linear(numerator: Sequence[Number], denominator: Sequence[Number], tolerance: Number) -> Array:
    """Time from a small step until the output stays within the tolerance of its final change.

    Args:
        numerator, denominator: H(s), coefficients lowest first.
        tolerance: Share of the final change. [-]
    Returns: [s], 0 where the output starts within it; NaN where the response does not settle
    Source: exact partial fractions; one pole: tau ln(abs(1 - h)/tolerance). JEDEC JESD99B: until the band is entered
        for the last time.
    """
    with np.errstate(all="ignore"):
        constants = poly.inverse_roots(denominator)
        if len(constants) == 1:
            tau = constants[0].real
            start = np.abs(1.0 - numerator[1] / np.asarray(numerator[0]) / tau)
            settled = tau * np.log(np.where(start > 0, start, tolerance) / tolerance)
            return np.where(np.isfinite(tau) & (tau >= 0), np.maximum(settled, 0.0), np.nan)
        return of_poles([numerator], constants, tolerance)[0]


def of_poles(numerators: Sequence[Sequence[Number]], constants: Complex, tolerance: Number) -> tuple[Array, Array]:
    """Settling of a product of transfer functions whose poles are known, by partial fractions.

    Args:
        numerators: Of every factor of H(s), coefficients lowest first.
        constants: -1/pole of all poles along a first axis; 0 for a pole at infinity. [s]
        tolerance: Share of the final change. [-]
    Returns: [s] as linear, and the sum of the magnitudes of the weights [-]: its square times the rounding of a double
        is what the error that is compared with the tolerance is uncertain by
    """
    constants = _apart(constants)
    weights = _residues(numerators, constants)
    return _last_crossing(weights, constants, np.asarray(tolerance)), np.sum(np.abs(weights), axis=0)


def _apart(constants: Complex) -> Complex:
    """Move two equal time constants apart by a relative 1e-7, whose effect is of second order."""
    constants = constants.copy()
    for i in range(len(constants)):
        for j in range(i):
            near = np.abs(constants[i] - constants[j]) < _APART * np.abs(constants[i])
            constants[i] = np.where(near, constants[i] * (1.0 + _APART), constants[i])
            constants[j] = np.where(near, constants[j] * (1.0 - _APART), constants[j])
    return constants


def _residues(numerators: Sequence[Sequence[Number]], constants: Complex) -> Complex:
    """Weights c_k of the error sum c_k exp(-t/tau_k), relative to the final change."""
    relative = [[np.asarray(x / np.asarray(numerator[0])) for x in numerator] for numerator in numerators]
    weights = []
    for k, tau in enumerate(constants):
        inverse = np.where(tau == 0, 0.0, -1.0 / np.where(tau == 0, 1.0, tau))
        weight = -poly.evaluate_complex(relative[0], inverse)
        for further in relative[1:]:
            weight = weight * poly.evaluate_complex(further, inverse)
        for j, other in enumerate(constants):
            if j != k:
                weight = weight / (1.0 - other / np.where(tau == 0, 1.0, tau))
        weights.append(np.where(tau == 0, 0.0, weight))
    return np.stack(np.broadcast_arrays(*weights))


def _last_crossing(weights: Complex, constants: Complex, tolerance: Array) -> Array:
    shape = np.broadcast_shapes(weights.shape[1:], constants.shape[1:], tolerance.shape)
    weights = np.broadcast_to(weights, (len(weights), *shape)).reshape(len(weights), -1)
    constants = np.broadcast_to(constants, (len(constants), *shape)).reshape(len(constants), -1)
    tolerance = np.broadcast_to(tolerance, shape).reshape(-1)
    rates = np.where(constants == 0, np.inf, 1.0 / np.where(constants == 0, 1.0, constants))
    fine = np.all((rates.real > 0) & np.isfinite(weights), axis=0)
    rates, weights = np.where(fine, rates, 1.0), np.where(fine, weights, 1.0)
    rates = np.where(np.isfinite(rates.real), rates, 1.0)
    rings = np.any(rates.imag != 0, axis=0)
    settled = np.full(rings.shape, np.nan)
    for part in (rings, ~rings):  # apart: a number must not depend on whether its neighbours ring
        if part.any():
            settled[part] = _last(_Error(weights[:, part], rates[:, part], tolerance[part]), len(weights))
    return np.where(fine, settled, np.nan).reshape(shape)


def _last(error: _Error, poles: int) -> Array:
    """The last crossing of each case: false position (Illinois) on the logarithm, which falls nearly straight."""
    low, high, never = error.bracket_of_two() if poles == 2 else error.bracket_by_scan()
    above, below = error.level(low), error.level(high)
    time, last = 0.5 * (low + high), np.zeros(low.shape)
    done = np.asarray(never, dtype=np.bool_)
    for k in range(_ROUNDS):
        done = done | ~(high - low > _CLOSE * high)
        if done.all():
            break
        with np.errstate(all="ignore"):
            middle = low + (high - low) * (above / (above - below))
        stuck = ~((middle > low) & (middle < high)) | (k % _HALVE == _HALVE - 1)
        time = np.where(done, time, np.where(stuck, 0.5 * (low + high), middle))
        level = error.level(time)
        outside = level > 0
        to_low, to_high = outside & ~done, ~outside & ~done
        below = np.where(to_high, level, np.where(to_low & (last > 0), below / 2.0, below))
        above = np.where(to_low, level, np.where(to_high & (last < 0), above / 2.0, above))
        low, high = np.where(to_low, time, low), np.where(to_high, time, high)
        last = np.where(outside, 1.0, -1.0)
        done = done | (np.abs(level) <= _LEVEL)
    return np.where(never, 0.0, time)


class _Error:
    """The error sum w_k exp(-r_k t) of a step response, relative to its final change, for many cases at once."""

    def __init__(self, weights: Complex, rates: Complex, tolerance: Array) -> None:
        self._rings = bool(np.any(rates.imag != 0))
        self._tolerance = tolerance
        self._weights, self._rates = weights, rates
        self._plain = list(zip(weights.real, rates.real, strict=True))
        slowest = np.max(np.where(weights == 0, 0.0, 1.0 / rates.real), axis=0)
        envelope = np.sum(np.abs(weights), axis=0) / tolerance
        self._bound = slowest * np.maximum(np.log(envelope), 0.0) * 1.0001 + 1e-300

    def excess(self, times: Array) -> Array:
        """abs(error) - tolerance at times of shape (points, cases)."""
        total = np.zeros(times.shape)
        if not self._rings:
            for weight, rate in self._plain:
                total += weight * np.exp(-times * rate)
            return np.asarray(np.abs(total) - self._tolerance)
        for weight, rate in zip(self._weights, self._rates, strict=True):
            total += (weight * np.exp(-times * rate)).real
        return np.asarray(np.abs(total) - self._tolerance)

    def level(self, times: Array) -> Array:
        """ln(abs(error)/tolerance) at one time for each case."""
        with np.errstate(divide="ignore"):
            return np.asarray(np.log1p(self.excess(times[None])[0] / self._tolerance))

    def bracket_of_two(self) -> tuple[Array, Array, Array]:
        """Times before and after the last crossing of two poles, from the extrema in closed form."""
        first, period = self._extrema()
        zero, bound = np.zeros(first.shape), self._bound
        height = self.excess(first[None])[0] + self._tolerance
        decay = np.abs(self._rates[0].real) * period
        with np.errstate(all="ignore"):
            turns = np.where(np.isfinite(period), np.floor(np.log(height / self._tolerance) / decay), 0.0)
        turns = np.where(np.isfinite(turns), np.maximum(turns, 0.0), 0.0)
        step = np.where(np.isfinite(period), period, 0.0)
        last = np.clip(first + turns * step, 0.0, bound)
        following = np.where(np.isfinite(period), np.minimum(last + step, bound), bound)
        beyond = self.excess(last[None])[0] > 0
        low, high = np.where(beyond, last, zero), np.where(beyond, following, last)
        return low, high, ~beyond & (self.excess(zero[None])[0] <= 0)

    def _extrema(self) -> tuple[Array, Array]:
        """First extremum from 0 on, and the time between extrema (not finite for real poles: there is one at most)."""
        (w0, w1), (r0, r1) = self._weights, self._rates
        turn = r0.imag
        complex_pair = turn != 0
        with np.errstate(all="ignore"):
            single = np.log((-w1 * r1 / (w0 * r0)).real) / (r1 - r0).real
            period = np.where(complex_pair, np.pi / np.abs(turn), np.inf)
            regular = np.mod((np.angle(w0 * r0) + np.pi / 2.0) / turn, np.pi / np.abs(turn))
        first = np.where(complex_pair, regular, single)
        return np.where(np.isfinite(first), np.clip(first, 0.0, self._bound), 0.0), period

    def bracket_by_scan(self) -> tuple[Array, Array, Array]:
        """Times before and after the last crossing of more poles, from a grid with even and with logarithmic steps.

        The crossing lies near the end, where the slowest pole alone is left, so the grid is looked through from there.
        """
        shares = 10.0 ** np.linspace(-9, 0, _LOGARITHMIC)
        if self._rings:
            shares = np.sort(np.concatenate([shares, np.linspace(0, 1, _EVEN)]))
        last = np.full(self._bound.shape, -1, dtype=np.intp)
        left = np.arange(len(last))
        for stop in range(len(shares), 0, -_AT_ONCE):
            start = max(stop - _AT_ONCE, 0)
            above = self._at(left).excess(self._bound[left] * shares[start:stop, None]) > 0
            found = above.any(axis=0)
            last[left[found]] = stop - 1 - np.argmax(above[::-1, found], axis=0)
            left = left[~found]
            if not len(left):
                break
        low, high = np.maximum(last, 0), np.minimum(last + 1, len(shares) - 1)
        return self._bound * shares[low], self._bound * shares[high], np.asarray(last < 0)

    def _at(self, columns: NDArray[np.intp]) -> _Error:
        """The same for some of the cases."""
        if len(columns) == len(self._bound):
            return self
        return _Error(self._weights[:, columns], self._rates[:, columns], self._tolerance[columns])


def source_step(
    step: Number, inversion: Number, specific: Number, capacitance: Number, thermal: Number, tolerance: Number
) -> Array:
    """Settling of a source output after a step of its drive, in every region of inversion.

    Args:
        step: Change of the drive kappa dV_G (or sigma dV_D), signed. [V]
        inversion: I_bias/I_spec. [-]
        specific: I_spec. [A]
        capacitance: C_o, over kappa + sigma with the bulk on the source. [F]
        thermal: U_T. [V]
        tolerance: Share of the final change. [-]
    Returns: [s]
    Source: integral of C_o dV_S/dt = I_D - I_bias with the charge equation; agrees with numerical integration.
    Valid: long channel, saturation; feed-through and the current source's conductance neglected, C_o held.
    """
    settled = charge.charge_from_inversion(inversion)
    drive = charge.drive_from_charge(settled)
    start = _antiderivative(drive + step / thermal, settled)
    end = _antiderivative(drive + tolerance * step / thermal, settled)
    return np.asarray(capacitance * thermal / specific * (start - end))


def _antiderivative(u: Array, settled: Array) -> Array:
    """-ln q/i_b + ln abs(q - q_b)/q_b - ln(q + q_b + 1)/(q_b + 1), grouped so that weak inversion loses no digits."""
    q, log_q = charge.charge_from_drive(u), charge.log_charge_from_drive(u)
    distance = np.abs(_charge_difference(u, q, settled))
    share = np.log(distance) - log_q
    return np.asarray(share / settled + (log_q - np.log(q + settled + 1.0)) / (settled + 1.0))


def _charge_difference(u: Array, q: Array, settled: Array) -> Array:
    """q - q_b, from the drives where the two are close."""
    du = u - charge.drive_from_charge(settled)
    near = np.abs(du) < 1e-3
    slope = settled / (1.0 + 2.0 * settled)
    curve = settled / (1.0 + 2.0 * settled) ** 3
    third = settled * (1.0 - 4.0 * settled) / (1.0 + 2.0 * settled) ** 5
    series = du * (slope + du * (curve / 2.0 + du * third / 6.0))
    return np.asarray(np.where(near, series, q - settled))


def drain_step(step: Number, gain: Number, slew_rate: Number, tau: Number, tolerance: Number) -> Array:
    """Settling of a drain output after a step at the input: slewing, then linear.

    Args:
        step: At the input. [V]
        gain: abs(H(0)). [V/V]
        slew_rate: I_bias/C_o. [V/s]
        tau: 1/(2 pi pole_frequency). [s]
        tolerance: Share of the final change. [-]
    Returns: [s]
    Source: common practice, the two-phase rule.
    """
    change, linear_part = np.asarray(gain * step), np.asarray(slew_rate * tau)
    with np.errstate(all="ignore"):
        slewing = (change - linear_part) / slew_rate + tau * np.log(linear_part / (tolerance * change))
        return np.where(change <= linear_part, tau * np.log(1.0 / np.asarray(tolerance)), slewing)
