"""Which condition breaks a target first, and which change from the nominal condition costs it most.

The room at a condition is the relative distance to the nearer limit (for a limit of 0 the plain distance), the worst
over the ranges of assumptions; the least room breaks first. A cause is looked for one by one: another process corner,
temperature or supply with everything else nominal and as it is stated, or the ends of the ranges at the nominal condition.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from worksheet.engine.measured import Measured
from worksheet.model.sheet import Target
from worksheet.review.judge import distance, reads_as_missed
from worksheet.review.results import Breaking, Cause
from worksheet.review.solved import Points

MOST = 3
"""Conditions that are listed; of those with the same room the first alone."""

RANGE = "range"
"""The cause that is no axis of the conditions: an assumption at an end of its range."""


@dataclass(frozen=True, slots=True)
class First:
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
        room = np.where(reads_as_missed(target, measured), -np.inf, room)
    if not points.valid.all():
        room = np.where(points.valid, room, np.nan)
    table = room.reshape(points.shape)
    least = table[0] if len(table) == 1 else np.fmin.reduce(table, axis=0)
    order = least.argsort(kind="stable")
    rising = least[order]
    steps = [0, *(np.flatnonzero(rising[1:] > rising[:-1])[: MOST - 1] + 1).tolist()]  # of equals the first alone
    found = [Breaking(points.condition(int(order[k])), _number(rising[k])) for k in steps if rising[k] == rising[k]]
    return First(tuple(found), _cause(points, table))


def _cause(points: Points, table: np.ndarray[tuple[int, int], np.dtype[np.float64]]) -> Cause | None:
    """The single change from what is nominal and stated that costs most; None where none costs anything."""
    stated, best, least = table[0], None, table[0, 0]
    for axis, indices in points.case.conditions.axes.items():
        if len(indices):
            here = stated[indices]
            k = int(np.nanargmin(here)) if not np.isnan(here).all() else 0
            if here[k] < least:
                best, least = (axis, indices[k], 0), here[k]
    if len(table) > 1:
        ends = table[:, 0]
        k = int(np.nanargmin(ends)) if not np.isnan(ends).all() else 0
        if ends[k] < least:
            best, least = (RANGE, 0, k), ends[k]
    if best is None:
        return None
    axis, condition, vertex = best
    moved = points.moved(vertex * points.shape[1]) if vertex else {}
    return Cause(axis, points.condition(condition), moved, _number(least))


def _number(value: float) -> float | None:
    return float(value) if np.isfinite(value) else None
