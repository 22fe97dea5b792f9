"""What pictures of a sheet are drawn from: every target's margin at every condition, and the stage's response."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field

import numpy as np

from worksheet.device.arrays import Array, Complex
from worksheet.engine import polynomial as poly
from worksheet.model.sheet import Condition
from worksheet.review import judge
from worksheet.review.judge import Mask
from worksheet.review.solved import Points

_DECADES_BELOW, _DECADES_ABOVE = 2.5, 2.0
_STEPS = 121
_FALLBACK = 1e6


@dataclass(frozen=True, eq=False)
class Margins:
    """Margins over conditions, the least over the ranges of assumptions.

    Attributes:
        conditions: The nominal one first.
        by_target: Relative to the limit, plain where it is 0; NaN where there is no number. Shape (conditions,).
        valid: Where everything holds at every end of the ranges, shape (conditions,).
    """

    conditions: tuple[Condition, ...] = ()
    by_target: Mapping[str, Array] = field(default_factory=dict)
    valid: Mask = field(default_factory=lambda: np.zeros(0, dtype=np.bool_))


@dataclass(frozen=True, eq=False)
class Response:
    """The transfer from the input to the output over frequency, as stated.

    Attributes:
        frequency: [Hz], shape (frequencies,)
        magnitude: [V/V], shape (conditions, frequencies), the nominal condition first
        phase: Unwrapped from zero frequency. [degree], same shape
    """

    frequency: Array
    magnitude: Array
    phase: Array


def margins(points: Points) -> Margins:
    """Margins of a solved sheet's targets; those at the nominal condition alone have one value."""
    shape = points.shape
    found = {}
    for target in points.case.sheet.targets.values():
        values = points.target(target).values
        if len(values) != shape[0] * shape[1]:
            continue
        with np.errstate(all="ignore"):
            room = judge.distance(target, values).reshape(shape)
        least = np.where(np.isnan(room).any(axis=0), np.nan, room.min(axis=0))
        found[target.name] = least[:1] if target.at == "nominal" else least
    return Margins(points.case.conditions.conditions, found, np.asarray(points.valid.reshape(shape).all(axis=0)))


def response(points: Points) -> Response | None:
    """The response of a solved sheet around its poles; None where it has none."""
    network, count = points.case.solution.network, points.shape[1]
    top, bottom = (_table(part, count) for part in (network.transfer, network.denominator))
    poles = points.measured("pole_frequency").values[:count]
    corner = poles[np.isfinite(poles) & (poles > 0)]
    low, high = (float(f(corner)) if len(corner) else _FALLBACK for f in (np.min, np.max))
    frequency = np.geomspace(low / 10**_DECADES_BELOW, high * 10**_DECADES_ABOVE, _STEPS)
    s: Complex = np.asarray(2j * np.pi * frequency, dtype=np.complex128)
    with np.errstate(all="ignore"):
        transfer = _at(top, s) / _at(bottom, s)
    if not np.isfinite(transfer).all() or not np.all(np.abs(transfer) > 0):
        return None
    phase = np.degrees(np.unwrap(np.angle(transfer), axis=1))
    turns = np.round((phase[:, :1]) / 360.0)
    return Response(frequency, np.asarray(np.abs(transfer)), np.asarray(phase - 360.0 * turns))


def _table(polynomial: poly.Poly, count: int) -> list[Array]:
    """Coefficients as columns over conditions, each of shape (conditions, 1)."""
    return [np.broadcast_to(np.asarray(c, dtype=np.float64), (count,)).reshape(count, 1) for c in polynomial]


def _at(polynomial: list[Array], s: Complex) -> Complex:
    total = np.zeros((1, len(s)), dtype=np.complex128)
    for coefficient in reversed(polynomial):
        total = total * s + coefficient
    return np.asarray(total)
