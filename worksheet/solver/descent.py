"""A feasible place improved step by step: everything is taken as a straight line near it, and the best corner of what
the lines allow is tried, nearer and nearer.

Where as many constraints bind as there are coordinates, the corner is the answer and is reached in a few steps; where
fewer bind, the steps get shorter around the best place.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from itertools import combinations

import numpy as np

from worksheet.device.arrays import Array
from worksheet.solver.trials import Index, Mask

_PROBE = 1e-7
_ROUNDS = 40
_LAST_REACH = 1e-8
_SHARES = np.array([1.0, 0.5, 0.2, 0.05])
_MOST_NEAR, _FEW_NEAR, _MANY = 14, 9, 5
_SETTLED = 1e-10
_FLAT, _MARGIN = 1e-9, 5e-10
"""By how much a step stays off every line."""


@dataclass(frozen=True, eq=False, slots=True)
class Slope:
    """What a descent asks of a search.

    Attributes:
        slack: Every slack, zero or more where it holds, at places of shape (places, coordinates); shape (slacks,
            places).
        score: What is to be least at such places, shape (places,).
        restored: For places, the nearest ones that hold with the same further coordinates, and whether there are such.
    """

    slack: Callable[[Array], Array]
    score: Callable[[Array], Array]
    restored: Callable[[Array, float], tuple[Array, Mask]]


_Lines = tuple[Array, Array, Array, Mask]


def improved(slope: Slope, start: Array, spans: Array, reach: float) -> Array:
    """A place with a lower score, where there is one nearby.

    Args:
        slope: The problem.
        start: A place that holds, first coordinate first.
        spans: Lowest and highest value of each coordinate, shape (coordinates, 2).
        reach: How far the first step may go along every coordinate but the first.
    """
    place, best = start, np.inf
    found, good = slope.restored(start[None], reach)
    if good[0]:
        place, best = found[0], float(slope.score(found)[0])
    for _ in range(_ROUNDS):
        lines = _lines(slope, place)
        step = _corner(*lines[:3], reach, spans - place[:, None])
        settled = np.isfinite(best) and -step @ lines[2] < _SETTLED * (1.0 + abs(best))
        if settled or reach < _LAST_REACH:
            break
        steps = np.concatenate([_bent(slope, place, step, lines, reach, spans)[None], _SHARES[:, None] * step])
        tried = np.clip(place + steps, *spans.T)
        found, good = slope.restored(tried, reach)
        scores = np.where(good, slope.score(found), np.inf)
        k = int(np.argmin(scores))
        if scores[k] < best:
            place, best = found[k], float(scores[k])
            reach = min(reach * (2.0, 2.0, 0.5, 0.25, 0.1)[k], 1.0)
        else:
            reach *= 0.1
    return place


def _bent(slope: Slope, place: Array, step: Array, lines: _Lines, reach: float, spans: Array) -> Array:
    """A step corrected for the bend of what it was reckoned from: the lines are moved to what its end clears."""
    _, slopes, down, fine = lines
    at_end = slope.slack(np.clip(place + step, *spans.T)[None])[fine, 0]
    known = np.isfinite(at_end)
    return _corner(at_end[known] - _MARGIN - slopes[known] @ step, slopes[known], down, reach, spans - place[:, None])


def _lines(slope: Slope, place: Array) -> _Lines:
    """Slacks at a place, their slopes, shape (slacks, coordinates), the score's slopes, and which slacks have any."""
    count = len(place)
    probes = np.concatenate([place[None], place + _PROBE * np.eye(count), place - _PROBE * np.eye(count)])
    slack, score = slope.slack(probes), slope.score(probes)
    with np.errstate(all="ignore"):
        slopes = (slack[:, 1 : 1 + count] - slack[:, 1 + count :]) / (2.0 * _PROBE)
    down = (score[1 : 1 + count] - score[1 + count :]) / (2.0 * _PROBE)
    fine: Mask = np.isfinite(slopes).all(axis=1) & np.isfinite(slack[:, 0]) & (np.abs(slopes).max(axis=1) > _FLAT)
    return slack[fine, 0] - _MARGIN, slopes[fine], down, fine


def _corner(slack: Array, slopes: Array, down: Array, reach: float, room: Array) -> Array:
    """The step of least score, by straight lines, within a reach along every coordinate but the first.

    Args:
        slack, slopes, down: As _lines gives them.
        reach: How far a step may go.
        room: Lowest and highest step along each coordinate, shape (coordinates, 2).
    """
    count = len(down)
    reaches = np.full(count, reach)
    reaches[0] = 4.0 * reach
    low, high = np.maximum(-reaches, room[:, 0]), np.minimum(reaches, room[:, 1])
    least = slack + np.minimum(slopes * low, slopes * high).sum(axis=1)
    near: Index = np.flatnonzero(least < 0)
    near = near[np.argsort(slack[near])][: _MOST_NEAR * 3]
    near = _distinct(slopes[near], slack[near], near)[: _MOST_NEAR if count < _MANY else _FEW_NEAR]
    rows = np.concatenate([slopes[near], np.eye(count), -np.eye(count)])
    offsets = np.concatenate([slack[near], -low, high])
    chosen = np.array(list(combinations(range(len(rows)), count)))
    matrices, right = rows[chosen], -offsets[chosen]
    with np.errstate(all="ignore"):
        solvable = np.abs(np.linalg.det(matrices)) > 1e-12
        steps = np.linalg.solve(matrices[solvable], right[solvable][..., None])[..., 0]
    holds = (steps @ rows.T + offsets >= -1e-9 * (1.0 + np.abs(offsets))).all(axis=1)
    if not holds.any():
        return np.zeros(count)
    steps = steps[holds]
    return np.asarray(steps[int(np.argmin(steps @ down))])


def _distinct(slopes: Array, slack: Array, places: Index) -> Index:
    """Places of lines none of which is a copy of one before it."""
    lines = np.round(np.column_stack([slopes, slack]), 9)
    _, first = np.unique(lines, axis=0, return_index=True)
    return np.asarray(places[np.sort(first)])
