"""Many brackets drawn together at once, each on the change of one constraint between met and not met.

Slack is the least over conditions: smooth, with bends where another condition becomes the worst. A bracket is looked at
where the lines through its ends and their neighbours cross zero, from either side and through both, so that a bend on
one side of the change does not matter.
"""

from __future__ import annotations

from collections.abc import Callable

import numpy as np

from worksheet.device.arrays import Array
from worksheet.solver import goals
from worksheet.solver.trials import Index, Mask

_ROUNDS = 40
_CLOSE, _CLOSE_AT_STEP, _STEP = 2e-13, 1e-11, 1e-6
"""How narrow a bracket is drawn, and one in which the slack jumps by more than a step."""

_MET_BY, _WIDE = 2e-9, 2e-8
_BESIDE = np.array([0.0, -1e-3, 1e-3, -1e-6, 1e-6])
"""Where a round looks around each place that the lines give, in shares of the bracket."""

_JUMP = 0.5 * goals.FAR
_TOGETHER = 256
"""At how many places a round looks in all brackets together in which the metric jumps."""

Look = Callable[[Index, Array], Array]
"""Slack (zero or more where met) for brackets by number at places, one number and one place each."""


def refined(look: Look, places: Array, gaps: Array) -> tuple[Array, Array]:
    """Both ends of every bracket drawn together, several places in each at once.

    Args:
        look: Gives the slack.
        places: The neighbour below, the low end, the high end and the neighbour above, shape (4, brackets); met at one
            end and not at the other. A neighbour may be missing (NaN).
        gaps: Slack there, same shape.
    Returns: places and gaps, drawn together; the met end is within rounding of the change
    """
    places, gaps = places.copy(), gaps.copy()
    rising: Mask = np.asarray(gaps[2] >= 0)
    for k in range(_ROUNDS):
        open_ones = np.flatnonzero(np.logical_not(_drawn(places, np.where(rising, gaps[2], gaps[1]))))
        if not len(open_ones):
            break
        inside = _inside(places[:, open_ones], gaps[:, open_ones], even=k % 4 == 3)
        found = look(np.repeat(open_ones, inside.shape[1]), inside.reshape(-1)).reshape(inside.shape)
        xs = np.column_stack([places[:2, open_ones].T, inside, places[2:, open_ones].T])
        slack = np.column_stack([gaps[:2, open_ones].T, found, gaps[2:, open_ones].T])
        met = (slack[:, 1:-1] >= 0) == rising[open_ones, None]
        change = np.argmax(met[:, 1:], axis=1)  # of the inner places, the first met one (or unmet) after the low end
        rows = np.arange(len(open_ones))
        for end in range(4):
            places[end, open_ones], gaps[end, open_ones] = xs[rows, change + end], slack[rows, change + end]
    return places, gaps


def _drawn(places: Array, met_gap: Array) -> Mask:
    """Which brackets are narrow enough."""
    width = places[2] - places[1]
    near = (np.abs(met_gap) <= _MET_BY) & (width <= _WIDE)
    enough = np.where(np.abs(met_gap) > _STEP, _CLOSE_AT_STEP, _CLOSE)
    return np.asarray(near | (width <= enough * np.maximum(1.0, np.abs(places[1]))))


def _inside(places: Array, gaps: Array, even: bool) -> Array:
    """Places inside each bracket in rising order, shape (brackets, places)."""
    low, high = places[1], places[2]
    width = (high - low)[:, None]
    jumps = np.maximum(np.abs(gaps[1]), np.abs(gaps[2])) >= _JUMP
    count = 4 * len(_BESIDE)
    if even or jumps.all():
        count = max(count, _TOGETHER // len(low))
    evenly = low[:, None] + width * (np.arange(1, count + 1) / (count + 1))
    if even or jumps.all():
        return np.asarray(evenly)
    with np.errstate(all="ignore"):
        guesses = np.stack([_line(places, gaps, 0, 1), _line(places, gaps, 2, 3),
                            _curve(places, gaps, 0), _curve(places, gaps, 1)])  # fmt: skip
        secant = _line(places, gaps, 1, 2)
    good = np.isfinite(guesses) & (guesses > low) & (guesses < high)
    guesses = np.where(good, guesses, np.where(np.isfinite(secant), secant, 0.5 * (low + high)))
    around = (guesses.T[:, :, None] + width[:, :, None] * _BESIDE).reshape(len(low), -1)
    around = np.sort(np.clip(around, low[:, None], high[:, None]), axis=1)
    return np.where(jumps[:, None], evenly, around)


def _line(places: Array, gaps: Array, i: int, j: int) -> Array:
    """Where the line through two of the places crosses zero."""
    return np.asarray((places[i] * gaps[j] - places[j] * gaps[i]) / (gaps[j] - gaps[i]))


def _curve(places: Array, gaps: Array, first: int) -> Array:
    """Where the place as a parabola in the slack, through three neighbouring places, crosses zero."""
    (x0, x1, x2), (g0, g1, g2) = places[first : first + 3], gaps[first : first + 3]
    return np.asarray(
        x0 * g1 * g2 / ((g0 - g1) * (g0 - g2))
        + x1 * g0 * g2 / ((g1 - g0) * (g1 - g2))
        + x2 * g0 * g1 / ((g2 - g0) * (g2 - g1))
    )
