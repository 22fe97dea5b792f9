"""Which condition breaks a target first, and which change from the nominal condition costs it most.

The room at a condition is the relative distance to the nearer limit (for a limit of 0 the plain distance), the worst
over the ranges of assumptions; the least room breaks first. A cause is looked for one by one: another process corner,
temperature or supply with everything else nominal and as stated, or the ends of the ranges at the nominal condition.
"""

from __future__ import annotations

from math import isfinite
from typing import NamedTuple

import numpy as np

from worksheet.device.arrays import Array
from worksheet.review.results import Breaking, Cause
from worksheet.review.solved import Points

MOST = 3
"""Conditions that are listed; of those with the same room the first alone."""

_DIGITS = 9

RANGE = "range"
"""The cause that is no axis of the conditions: an assumption at an end of its range."""


class First(NamedTuple):
    """The conditions that break a target first, the nearest to breaking in front, and what costs it most."""

    order: tuple[Breaking, ...] = ()
    cause: Cause | None = None


def breaks_first(points: Points, room: Array, worst: int | None) -> First:
    """Find which valid conditions are nearest to breaking a target.

    Args:
        points: The solved sheet.
        room: Of the target over its points, see judge.Judgement.
        worst: The point that is worst; among conditions with the same room it is the one that is listed.
    """
    if len(room) == 1 or worst is None:
        return First()
    table = room.round(_DIGITS).reshape(points.shape)  # what differs by rounding alone is the same
    least = table[0] if len(table) == 1 else np.minimum.reduce(table, axis=0)
    order = least.argsort(kind="stable")
    rising = least[order]
    steps = [0, *((rising[1:] > rising[:-1]).nonzero()[0][: MOST - 1] + 1).tolist()]  # of equals the first alone
    places, rooms = order[steps].tolist(), rising[steps].tolist()
    if least[worst % points.shape[1]] == rooms[0]:
        places[0] = worst % points.shape[1]
    found = [Breaking(points.condition(k), _number(r)) for k, r in zip(places, rooms, strict=True) if r < np.inf]
    return First(tuple(found), _cause(points, table))


def _cause(points: Points, table: Array) -> Cause | None:
    """The single change from what is nominal and stated that costs most; None where none costs anything."""
    stated, least, best = table[0], table[0, 0], None
    places, axes = points.case.conditions.single_changes
    if places:
        here = stated[places]
        k = here.argmin()
        if here[k] < least:
            best, least = (axes[k], places[k], 0), here[k]
    if len(table) > 1:
        vertex = int(table[:, 0].argmin())
        if table[vertex, 0] < least:
            best, least = (RANGE, 0, vertex), table[vertex, 0]
    if best is None:
        return None
    axis, condition, vertex = best
    moved = points.moved(vertex * points.shape[1]) if vertex else {}
    return Cause(axis, points.condition(condition), moved, _number(float(least)))


def _number(value: float) -> float | None:
    return value if isfinite(value) else None
