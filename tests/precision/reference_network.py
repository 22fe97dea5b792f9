"""Nodal analysis at 50 digits: a network of conductances, capacitances and transistors, and its transfers.

A transfer is a ratio of two polynomials in s, found by Cramer's rule on polynomial matrices: no frequency grid, no
assumption on the number of nodes.
"""

from __future__ import annotations

from collections import defaultdict
from typing import Any

from mpmath import mp, mpf

from tests.precision.reference_device import Point, Real

Polynomial = list[Any]
"""Coefficients in s, constant first."""


def add(a: Polynomial, b: Polynomial) -> Polynomial:
    size = max(len(a), len(b))
    return [(a[k] if k < len(a) else 0) + (b[k] if k < len(b) else 0) for k in range(size)]


def scale(a: Polynomial, factor: Real) -> Polynomial:
    return [factor * value for value in a]


def times(a: Polynomial, b: Polynomial) -> Polynomial:
    result = [mpf(0)] * (len(a) + len(b) - 1)
    for j, left in enumerate(a):
        for k, right in enumerate(b):
            result[j + k] += left * right
    return result


def derivative(a: Polynomial) -> Polynomial:
    return [k * value for k, value in enumerate(a)][1:] or [mpf(0)]


def value_at(a: Polynomial, s: Real) -> Real:
    total = mpf(0)
    for coefficient in reversed(a):
        total = total * s + coefficient
    return total


def determinant(matrix: list[list[Polynomial]]) -> Polynomial:
    if not matrix:
        return [mpf(1)]
    total: Polynomial = [mpf(0)]
    for k, entry in enumerate(matrix[0]):
        minor = [row[:k] + row[k + 1 :] for row in matrix[1:]]
        total = add(total, scale(times(entry, determinant(minor)), mpf((-1) ** k)))
    return total


def trimmed(a: Polynomial, rate: Real) -> Polynomial:
    """Without leading coefficients that a cancellation left as rounding; `rate` is a typical angular frequency."""
    if rate == 0:
        return list(a)
    sizes = [abs(value) * rate**k for k, value in enumerate(a)]
    result = list(a)
    while len(result) > 1 and sizes[len(result) - 1] <= max(sizes) * mpf(10) ** -48:
        result.pop()
    return result


def roots(a: Polynomial) -> list[Any]:
    """All roots, complex ones included, of a polynomial whose coefficients may differ by many decades."""
    while len(a) > 1 and a[0] == 0:
        return [mpf(0), *roots(a[1:])]
    if len(a) == 1:
        return []
    degree = len(a) - 1
    rate = abs(a[0] / a[-1]) ** (mpf(1) / degree)
    scaled = [value * rate**k for k, value in enumerate(a)]
    scaled = scale(scaled, 1 / scaled[-1])
    found = mp.polyroots(list(reversed(scaled)), maxsteps=2000, extraprec=400, error=False)
    return [rate * (root if abs(mp.im(root)) > abs(root) * mpf(10) ** -25 else mp.re(root)) for root in found]


def magnitude_squared(a: Polynomial) -> Polynomial:
    """abs(a(j w))^2 as a polynomial in w^2."""
    mirrored = [value * (-1) ** k for k, value in enumerate(a)]
    even = times(a, mirrored)[::2]
    return [value * (-1) ** k for k, value in enumerate(even)]


class Network:
    """Conductances and capacitances between named nodes; nodes that are not `unknown` are held."""

    def __init__(self, unknown: list[str]) -> None:
        self.unknown = unknown
        self.g: dict[tuple[str, str], Any] = defaultdict(mpf)
        self.c: dict[tuple[str, str], Any] = defaultdict(mpf)

    def conductance(self, a: str, b: str, value: Real) -> None:
        self._two_terminal(self.g, a, b, value)

    def capacitance(self, a: str, b: str, value: Real) -> None:
        self._two_terminal(self.c, a, b, value)

    @staticmethod
    def _two_terminal(table: dict[tuple[str, str], Any], a: str, b: str, value: Real) -> None:
        table[a, a] += value
        table[b, b] += value
        table[a, b] -= value
        table[b, a] -= value

    def transistor(self, point: Point, *, gate: str, source: str, drain: str, bulk: str) -> None:
        controls = (
            (gate, point.transconductance),
            (drain, point.drain_conductance),
            (bulk, point.bulk_conductance),
            (source, -point.source_conductance),
        )
        for node, conductance in controls:
            self.g[drain, node] += conductance
            self.g[source, node] -= conductance
        for a, b, value in (
            (gate, source, point.gate_source),
            (gate, drain, point.gate_drain),
            (gate, bulk, point.gate_bulk),
            (source, bulk, point.source_bulk),
            (drain, bulk, point.drain_bulk),
        ):
            self.capacitance(a, b, value)

    def matrix(self) -> list[list[Polynomial]]:
        return [[[self.g[row, column], self.c[row, column]] for column in self.unknown] for row in self.unknown]

    def denominator(self) -> Polynomial:
        return determinant(self.matrix())

    def numerator(self, watched: str, *, held: dict[str, Real], injected: dict[str, Real]) -> Polynomial:
        """Of the voltage of `watched`, with known nodes at the voltages `held` and currents `injected` into nodes."""
        matrix = self.matrix()
        column = self.unknown.index(watched)
        for row, node in enumerate(self.unknown):
            right: Polynomial = [mpf(injected.get(node, 0)), mpf(0)]
            for known, voltage in held.items():
                right = add(right, [-self.g[node, known] * voltage, -self.c[node, known] * voltage])
            matrix[row][column] = right
        return determinant(matrix)
