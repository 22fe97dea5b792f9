"""Ranges of assumptions: the points at which worst cases are looked for besides the stated values."""

from __future__ import annotations

from itertools import product

import numpy as np

from worksheet.device.arrays import Array
from worksheet.model.sheet import Sheet
from worksheet.solver import goals
from worksheet.solver.subject import Subject

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

    Every vertex up to six ranges; beyond that each range alone at either end, to which `worst_points` adds the vertices
    that the signs of the sensitivities point to.
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


def worst_points(subject: Subject) -> dict[str, Array]:
    """All points at which the worst of a sheet's targets is looked for, shape (points, 1).

    As vertices, and beyond six ranges also, for each target and condition, all ranges at the ends that lower and that
    raise it there.

    Args:
        subject: The sheet, with a number for everything it leaves open.
    Source: physics, section 6: the signs are those of the change over each range alone.
    """
    alone = vertices(subject.sheet)
    if len(alone) <= FULL_UP_TO:
        return alone
    solution = subject.moved(alone).solution
    points: dict[tuple[float, ...], None] = {}
    for target in subject.sheet.targets.values():
        values = goals.measure(subject.moved(alone), target, solution).values
        values = np.broadcast_to(values, (1 + 2 * len(alone), len(subject.conditions)))
        rises = values[2::2] >= values[1::2]
        for rising in np.unique(rises, axis=1).T:
            ends = zip(rising, ranged(subject.sheet).values(), strict=True)
            up, down = zip(*((high, low) if up else (low, high) for up, (low, high) in ends), strict=True)
            points |= {up: None, down: None}
    steered = _columns(list(alone), list(points)) if points else {}
    return {name: np.concatenate([alone[name], *([steered[name]] if steered else [])]) for name in alone}


def merged(points: dict[str, Array], more: dict[str, Array]) -> dict[str, Array]:
    """Points with those of others that are not among them, each once and in order. Both of shape (points, 1)."""
    names = list(points)
    rows = [tuple(row) for table in (points, more) for row in np.hstack([table[name] for name in names]).tolist()]
    return _columns(names, list(dict.fromkeys(rows)))


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
