"""Settling at 50 digits: exact linear step responses, and the large-signal law of a source output.

The linear one is the last crossing of a sum of exponentials, found exactly for real poles by the zeros of its
derivatives, and by a scan under its envelope where poles are complex.
"""

from __future__ import annotations

from collections.abc import Callable
from itertools import pairwise
from typing import Any

from mpmath import mp, mpf

from tests.precision.reference_device import Real, charge_from_drive, drive_from_charge
from tests.precision.reference_network import Polynomial, derivative, value_at

Terms = list[tuple[Any, Any]]
"""Pairs of factor and rate: the sum of factor exp(rate t)."""


def bisect(function: Callable[[Any], Any], low: Real, high: Real) -> Real:
    rising = function(high) > 0
    for _ in range(4 * mp.prec):
        mid = (low + high) / 2
        if mid in {low, high}:
            break
        if (function(mid) > 0) == rising:
            high = mid
        else:
            low = mid
    return (low + high) / 2


def total(terms: Terms, t: Real) -> Real:
    return mp.re(sum(factor * mp.exp(rate * t) for factor, rate in terms))


def real_zeros(terms: Terms, end: Real) -> list[Any]:
    """Zeros in (0, end) of a sum of real exponentials, by Rolle's theorem."""
    if len(terms) == 1:
        return []
    anchor = terms[0][1]
    slope = [(factor * (rate - anchor), rate - anchor) for factor, rate in terms[1:]]
    edges = [mpf(0), *real_zeros(slope, end), end]
    found = []
    for low, high in pairwise(edges):
        if total(terms, low) * total(terms, high) < 0:
            found.append(bisect(lambda t: total(terms, t), low, high))
    return found


def last_exit(error: Terms, tolerance: Real) -> Real:
    """Last time at which abs(error) is above the tolerance; 0 if never."""

    def envelope(t: Real) -> Real:
        return sum(abs(factor) * mp.exp(mp.re(rate) * t) for factor, rate in error) - tolerance / 2

    if envelope(mpf(0)) <= 0:
        return mpf(0)
    slowest = 1 / min(-mp.re(rate) for _, rate in error)
    end = slowest
    while envelope(end) > 0:
        end *= 2
    if all(isinstance(rate, mpf) for _, rate in error):
        crossings = [zero for sign in (1, -1) for zero in real_zeros([(sign * tolerance, mpf(0)), *error], end)]
    else:
        crossings = scanned(error, tolerance, end)
    return max(crossings, default=mpf(0))


def scanned(error: Terms, tolerance: Real, end: Real) -> list[Any]:
    """Crossings of abs(error) with the tolerance where poles are complex: a grid finer than every ripple."""

    def excess(t: Real) -> Real:
        return abs(total(error, t)) - tolerance

    fastest = max(abs(rate) for _, rate in error)
    turning = max(abs(mp.im(rate)) for _, rate in error)
    step = mp.pi / turning / 40
    grid = {k * step for k in range(int(end / step) + 2)}
    grid |= {mpf(10) ** (mpf(k) / 40) / fastest for k in range(-120, int(40 * mp.log10(end * fastest)) + 2)}
    times = sorted(t for t in grid if t <= end)
    values = [excess(t) for t in times]
    turns = [k for k in range(1, len(times)) if values[k - 1] * values[k] < 0]
    for k in range(1, len(times) - 1):
        if values[k] < 0 and values[k] > max(values[k - 1], values[k + 1]) and values[k] > -tolerance / 100:
            raise ArithmeticError("a ripple comes so close to the tolerance that the scan cannot tell")
    return [bisect(excess, times[k - 1], times[k]) for k in turns]


def linear(numerator: Polynomial, denominator: Polynomial, poles: list[Any], tolerance: Real) -> Real:
    """From a step until the output stays within `tolerance` of its final change."""
    gain = numerator[0] / denominator[0]
    slope = derivative(denominator)
    error = [(value_at(numerator, pole) / (pole * value_at(slope, pole)) / gain, pole) for pole in poles]
    return last_exit(error, tolerance)


def large_signal_formula(a: Real, tolerance: Real, inversion: Real, time: Real) -> Real:
    """Section 5: `a` is the step of u at time 0, `time` is C_o U_T/I_spec (over kappa + sigma with its own bulk)."""
    resting = (mp.sqrt(1 + 4 * inversion) - 1) / 2
    start = charge_from_drive(drive_from_charge(resting) + a)
    stop = charge_from_drive(drive_from_charge(resting) + tolerance * a)

    def bracket(q: Real) -> Real:
        above = mp.log(abs(q - resting)) / resting - mp.log(q + resting + 1) / (resting + 1)
        return above - mp.log(q) / inversion

    return -time * (bracket(stop) - bracket(start))


def large_signal_integral(a: Real, tolerance: Real, inversion: Real, time: Real) -> Real:
    """The same time by integrating dV/(I - I_b): u falls from a to tolerance a, and dV_S = -U_T du."""
    resting = drive_from_charge((mp.sqrt(1 + 4 * inversion) - 1) / 2)

    def pace(z: Real) -> Real:
        rest = a * mp.exp(-z)
        q = charge_from_drive(resting + rest)
        return rest / (q * q + q - inversion)

    end = -mp.log(tolerance)
    pieces = mp.linspace(mpf(0), end, 12)
    return time * mp.quad(pace, pieces)


def two_phase(change: Real, tolerance: Real, slew_rate: Real, tau: Real) -> Real:
    """Slewing, then linear: drain outputs with a step."""
    corner = slew_rate * tau
    if change <= corner:
        return tau * mp.log(1 / tolerance)
    return (change - corner) / slew_rate + tau * mp.log(corner / (tolerance * change))
