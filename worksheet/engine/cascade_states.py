"""A path of stages as first-order sections: its state matrix is lower triangular, with the poles on the diagonal.

Of a stage with the poles -1/tau_i, section i obeys tau_i x_i' = -x_i + x_(i-1) + b_i u, and the last section, with
what feeds through, is the output; whatever enters a stage (its signal, a noise current) differs in the b_i alone.
Equal poles are no special case here.
"""

from __future__ import annotations

from collections.abc import Sequence
from functools import cached_property
from itertools import pairwise
from typing import Protocol

import numpy as np

from worksheet.device.arrays import Array, Complex, Number
from worksheet.engine import polynomial as poly

_TINY = 1e-12
"""What stands for a time constant that is 0 in some conditions alone, of the largest one."""
_TAYLOR = 18
_STEPS = 2400
_HALVINGS = 48


class Source(Protocol):
    """A noise current of a link."""

    @property
    def numerator(self) -> poly.Poly:
        """Of its transfer to the link's output."""
        ...

    @property
    def white(self) -> Number:
        """[A^2/Hz]"""
        ...


class Linked(Protocol):
    """What is asked of a link; see cascade.Link."""

    @property
    def numerator(self) -> poly.Poly:
        """Of H(s)."""
        ...

    @property
    def denominator(self) -> poly.Poly:
        """Of H(s)."""
        ...

    @property
    def noise(self) -> Sequence[Source]:
        """Sources of noise current."""
        ...

    @property
    def constants(self) -> Complex:
        """-1/pole along a first axis. [s]"""
        ...


class States:
    """The state equations of a path, over conditions.

    Attributes:
        matrix: Shape (conditions, states, states), lower triangular. [1/s]
        entry: How the signal at the path's input enters, shape (conditions, states). [1/s]
        output: What of the states is the output, same shape.
        direct: What of the signal feeds through the whole path at once, shape (conditions,). [V/V]
        places: The states of each link, as a range.
    """

    def __init__(self, links: Sequence[Linked], shape: tuple[int, ...]) -> None:
        """Set the equations up."""
        self._shape = shape
        self._links = links
        self._taus = [_present(np.broadcast_to(one.constants, (len(one.constants), *shape))) for one in links]
        ends = np.cumsum([0, *(len(tau) for tau in self._taus)]).tolist()
        self.places = [range(a, b) for a, b in pairwise(ends)]
        count = ends[-1]
        self.matrix = np.zeros((*shape, count, count), dtype=np.complex128)
        self.entry = np.zeros((*shape, count), dtype=np.complex128)
        row, direct = np.zeros((*shape, count), dtype=np.complex128), np.ones(shape, dtype=np.complex128)
        for link, tau, place in zip(links, self._taus, self.places, strict=True):
            entering, feed = self._entering(link, tau, link.numerator)
            for i, k in enumerate(place):
                self.matrix[..., k, : place.start] += entering[i][..., None] * row[..., : place.start]
                self.entry[..., k] = entering[i] * direct
                self.matrix[..., k, k] = -1.0 / tau[i]
                if i:
                    self.matrix[..., k, k - 1] = 1.0 / tau[i]
            row, direct = feed[..., None] * row, feed * direct
            if len(place):
                row[..., place.stop - 1] += 1.0
        self.output, self.direct = row, direct

    def _entering(self, link: Linked, tau: Complex, numerator: Sequence[Number]) -> tuple[list[Complex], Complex]:
        """b_i/tau_i of each section and what feeds through, for a numerator over the link's denominator."""
        rest = [self._over(c) / self._over(link.denominator[0]) for c in numerator]
        found = []
        for one in tau:
            value, quotient = _divided(rest, -1.0 / one)
            found.append(value / one)
            rest = [part / one for part in quotient]
        return found, rest[0] if rest else np.zeros(self._shape, dtype=np.complex128)

    def _over(self, values: Number) -> Complex:
        return np.broadcast_to(np.asarray(values, dtype=np.complex128), self._shape)

    def noise_entry(self, place: int, numerator: Sequence[Number]) -> Complex:
        """How a noise current of a link enters, shape (conditions, states). [1/s]"""
        entry = np.zeros_like(self.entry)
        entering, _ = self._entering(self._links[place], self._taus[place], numerator)
        for value, k in zip(entering, self.places[place], strict=True):
            entry[..., k] = value
        return entry

    @cached_property
    def gramian(self) -> Complex:
        """W with A^H W + W A + c^H c = 0, shape (conditions, states, states): b^H W b is what an entry b integrates to.

        Source: the observability gramian; solved entry by entry from the last, since A is triangular.
        """
        a, c = self.matrix, self.output
        n = a.shape[-1]
        w = np.zeros_like(a)
        for i in range(n - 1, -1, -1):
            for j in range(n - 1, -1, -1):
                known = np.conj(c[..., i]) * c[..., j]
                known = known + np.sum(np.conj(a[..., i + 1 :, i]) * w[..., i + 1 :, j], axis=-1)
                known = known + np.sum(w[..., i, j + 1 :] * a[..., j + 1 :, j], axis=-1)
                w[..., i, j] = -known / (np.conj(a[..., i, i]) + a[..., j, j])
        return w


def _present(tau: Complex) -> Complex:
    """Time constants without those that are 0 in every condition; the rest of the zeros become tiny, slowest first."""
    kept = tau[np.any(tau != 0, axis=tuple(range(1, tau.ndim)))]
    if not len(kept):
        return kept
    largest = np.max(np.abs(kept), axis=0)
    kept = np.where(kept == 0, _TINY * np.where(largest > 0, largest, 1.0), kept)
    return np.take_along_axis(kept, np.argsort(-np.abs(kept), axis=0, kind="stable"), axis=0)


def _divided(a: Sequence[Complex], root: Complex) -> tuple[Complex, list[Complex]]:
    """Value of a polynomial at a place, and the quotient by (s - place), lowest power first."""
    quotient: list[Complex] = []
    total = np.zeros(np.shape(root), dtype=np.complex128)
    for coefficient in reversed(a):
        quotient.append(total)
        total = total * root + coefficient
    return total, quotient[1:][::-1]


def noise_gains(states: States, links: Sequence[Linked]) -> list[Array]:
    """White noise of each link at the path's output, over all frequency. [V^2], each over conditions"""
    powers = []
    for place, link in enumerate(links):
        total = np.zeros(states.entry.shape[:-1])
        for source in link.noise if len(states.places[place]) else ():
            entry = states.noise_entry(place, source.numerator)
            gain = np.einsum("...i,...ij,...j->...", np.conj(entry), states.gramian, entry).real
            total = total + np.asarray(source.white) / 2.0 * gain
        powers.append(total)
    return powers


def settled(states: States, place: int, tolerance: float) -> float:
    """Settling time of a small step at one condition, by running the state equations. [s]

    Args:
        states: The path.
        place: Which condition.
        tolerance: Share of the final change. [-]
    Returns: NaN where the response does not settle
    Source: y(inf) - y(t) = -c A^-1 exp(A t) b; the exponential by scaling and squaring.
    """
    a, b, c = states.matrix[place], states.entry[place], states.output[place]
    if not (np.diagonal(a).real < 0).all():
        return float("nan")
    row = np.linalg.solve(a.T, c)
    final = -row @ b + _direct(states, place)
    slowest = float(np.max(-1.0 / np.diagonal(a).real))
    end = slowest * (2.0 * len(a) + 4.0 * float(np.log(1.0 / tolerance)))
    step = end / _STEPS
    forward, state, last = _exponential(a * step), b, None
    for k in range(_STEPS + 1):
        if abs((row @ state / final).real) > tolerance:
            last = k
            before = state
        state = forward @ state
    if last is None:
        return 0.0
    low, high = 0.0, step
    for _ in range(_HALVINGS):
        middle = 0.5 * (low + high)
        outside = abs((row @ (_exponential(a * middle) @ before) / final).real) > tolerance
        low, high = (middle, high) if outside else (low, middle)
    return last * step + 0.5 * (low + high)


def _direct(states: States, place: int) -> complex:
    """What feeds through the whole path at once, at one condition. [V/V]"""
    return complex(np.broadcast_to(states.direct, states.entry.shape[:-1])[place])


def _exponential(a: Complex) -> Complex:
    """Exponential of a small square matrix.

    Source: scaling and squaring of the Taylor series (Moler and Van Loan 2003).
    """
    size = float(np.max(np.sum(np.abs(a), axis=1), initial=0.0))
    halvings = max(0, int(np.ceil(np.log2(size))) + 1) if size > 0.5 else 0
    scaled = a / 2.0**halvings
    term = total = np.eye(len(a), dtype=np.complex128)
    for k in range(1, _TAYLOR):
        term = term @ scaled / k
        total = total + term
    for _ in range(halvings):
        total = total @ total
    return total
