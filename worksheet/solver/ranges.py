"""Ranges of assumptions: the points at which worst cases are looked for besides the stated values."""

from __future__ import annotations

from collections.abc import Mapping
from itertools import product

import numpy as np

from worksheet.device.arrays import Array
from worksheet.model.sheet import Sheet

FULL_UP_TO = 6
"""Up to so many ranges every vertex is a point."""


def ranged(sheet: Sheet) -> dict[str, tuple[float, float]]:
    """Assumptions and own names with a range: (low, high), the stated number for a missing end. [unit of the key]"""
    found = {}
    for name, value in (*sheet.assume.items(), *sheet.own.items()):
        if value.number is not None and (value.low is not None or value.high is not None):
            low = value.number if value.low is None else value.low
            high = value.number if value.high is None else value.high
            if low != high:
                found[name] = (low, high)
    return found


def vertices(sheet: Sheet) -> dict[str, Array]:
    """Values of each ranged name over the points, shape (points, 1); the first point is the stated values.

    Every vertex up to six ranges; beyond that each range alone at either end (the vertices to which the signs of the
    sensitivities point are added by `steered`).
    """
    ranges = ranged(sheet)
    if not ranges:
        return {}
    stated = [_stated(sheet, name) for name in ranges]
    if len(ranges) <= FULL_UP_TO:
        points = [tuple(stated), *product(*ranges.values())]
    else:
        points = [tuple(stated)]
        for k, ends in enumerate(ranges.values()):
            points += [(*stated[:k], end, *stated[k + 1 :]) for end in ends]
    return _columns(list(ranges), points)


def steered(sheet: Sheet, rising: Mapping[str, Mapping[str, bool]]) -> dict[str, Array]:
    """Further points for more than six ranges: for each metric, all ranges at the ends that lower and that raise it.

    Args:
        sheet: The sheet.
        rising: By metric, by ranged name: whether the metric rises with it.
    Returns: values of each ranged name, shape (points, 1)
    """
    ranges = ranged(sheet)
    points = []
    for signs in rising.values():
        up = tuple(high if signs.get(name, True) else low for name, (low, high) in ranges.items())
        down = tuple(low if signs.get(name, True) else high for name, (low, high) in ranges.items())
        points += [up, down]
    return _columns(list(ranges), list(dict.fromkeys(points)))


def _stated(sheet: Sheet, name: str) -> float:
    value = sheet.assume.get(name) or sheet.own[name]
    assert value.number is not None  # only plain numbers carry a range
    return value.number


def _columns(names: list[str], points: list[tuple[float, ...]]) -> dict[str, Array]:
    table = np.array(points, dtype=np.float64)
    return {name: table[:, k : k + 1] for k, name in enumerate(names)}


def waived_targets(sheet: Sheet) -> tuple[str, ...]:
    """Targets with a waiver: they are judged, but bind nothing that is proposed."""
    return tuple(dict.fromkeys(w.target for w in sheet.waivers))
