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
from worksheet.engine.measured import Measured
from worksheet.model.sheet import Target
from worksheet.review.judge import distance, reads_as_missed
from worksheet.review.results import Breaking, Cause
from worksheet.review.solved import Points

MOST = 3
"""Conditions that are listed; of those with the same room the first alone."""

RANGE = "range"
"""The cause that is no axis of the conditions: an assumption at an end of its range."""


class First(NamedTuple):
    """The conditions that break a target first, the nearest to breaking in front, and what costs it most."""

    order: tuple[Breaking, ...] = ()
    cause: Cause | None = None


def breaks_first(points: Points, target: Target, measured: Measured) -> First:
    """Find which valid conditions are nearest to breaking a target.

    Args:
        points: The solved sheet.
        target: The target.
        measured: What it is about, over the points.
    Returns: nothing for a target that looks at the nominal condition alone
    """
    if target.at == "nominal" or len(points.valid) == 1:
        return First()
    room = distance(target, measured.values)
    if measured.reasons is not None:
        room = np.where(reads_as_missed(target, measured), -np.inf, np.where(np.isnan(room), np.inf, room))
    if not points.all_valid:
        room = np.where(points.valid, room, np.inf)
    table = room.reshape(points.shape)
    least = table[0] if len(table) == 1 else np.minimum.reduce(table, axis=0)
    order = least.argsort(kind="stable")
    rising = least[order]
    steps = [0, *((rising[1:] > rising[:-1]).nonzero()[0][: MOST - 1] + 1).tolist()]  # of equals the first alone
    places, rooms = order[steps].tolist(), rising[steps].tolist()
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
