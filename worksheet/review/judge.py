"""One target judged over points: which are met, which is worst, what follows for the verdict.

A point is a condition, or a condition with assumptions at ends of their ranges. Rules: contract of the review.
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from worksheet.device.arrays import Array
from worksheet.engine.measured import Measured
from worksheet.model.metrics import Reason
from worksheet.model.sheet import TOLERANCE, Target
from worksheet.review.results import MET, MISSED, UNKNOWN
from worksheet.solver.goals import limits

Mask = NDArray[np.bool_]

NONE_VALID = "no condition is valid"


class Judgement(NamedTuple):
    """What a target's values over points come to.

    Attributes:
        verdict: MET, MISSED or UNKNOWN.
        worst: Index of the worst valid point, None where there is none.
        invalid: Number of points that are not valid.
        reason: Why, where the numbers do not say it.
        room: Relative distance to the nearer limit over the points, plain for a limit of 0: -inf for a number that does
            not exist and counts as missed, inf for any other that does not count.
    """

    verdict: str
    worst: int | None
    invalid: int
    reason: str | None
    room: Array


def missed_by_value(target: Target, values: Array) -> Mask:
    """Where values miss a target; False where there is no number."""
    low, high = limits(target)
    if low is None and high is None:
        return np.zeros(np.shape(values), dtype=bool)
    under = None if low is None else values < low - TOLERANCE * abs(low)
    over = None if high is None else values > high + TOLERANCE * abs(high)
    found = [mask for mask in (under, over) if mask is not None]
    missed: Mask = found[0] if len(found) == 1 else found[0] | found[1]
    return missed


def margins(target: Target, values: Array) -> Array:
    """Relative distance to the nearer limit, negative where it is passed; NaN for a limit of 0 or no number. [-]"""
    found = np.full(np.shape(values), np.nan)
    if target.minimum:
        found = np.fmin(found, (values - target.minimum) / abs(target.minimum))
    if target.maximum:
        found = np.fmin(found, (target.maximum - values) / abs(target.maximum))
    return found


def margin(target: Target, value: float) -> float | None:
    """As margins, of one number; None where there is none. [-]"""
    found = [
        gap / abs(limit)
        for gap, limit in (
            (value - (target.minimum or 0.0), target.minimum),
            ((target.maximum or 0.0) - value, target.maximum),
        )
        if limit
    ]
    return min(found, default=None)


def distance(target: Target, values: Array) -> Array:
    """What orders points from worst to best: the margin, or the plain distance where a limit is 0. NaN: no number."""
    low, high = target.minimum, target.maximum
    above = None if low is None else (values - low) / (abs(low) or 1.0)
    below = None if high is None else -1.0 * (values - high) / (abs(high) or 1.0)
    sides = [side for side in (above, below) if side is not None]
    found: Array = sides[0] if len(sides) == 1 else np.minimum(*sides)
    return found


def judge(target: Target, measured: Measured, valid: Mask) -> Judgement:
    """Judge a target over points.

    Args:
        target: What is wanted.
        measured: Values over points, shape (points,).
        valid: Points that are valid, same shape.
    Returns: Judgement
    """
    values = measured.values
    missed, room = missed_by_value(target, values), distance(target, values)
    invalid = len(values) - int(np.count_nonzero(valid))
    if not measured.complete:
        return _incomplete(target, measured, valid, missed, room)
    if invalid:
        missed, room = missed & valid, np.where(valid, room, np.inf)
    verdict = MISSED if missed.any() else UNKNOWN if invalid else MET
    if invalid == len(values):
        return Judgement(verdict, None, invalid, NONE_VALID, room)
    reason = _some_invalid(invalid, len(values)) if verdict == UNKNOWN else None
    return Judgement(verdict, int(room.argmin()), invalid, reason, room)


def _incomplete(target: Target, measured: Measured, valid: Mask, missed: Mask, room: Array) -> Judgement:
    """As judge, where some numbers do not exist."""
    absent, invalid = ~np.isfinite(measured.values), int(np.count_nonzero(~valid))
    lost, unknown = _judge_absent(target, measured, absent)
    missed = missed | lost
    verdict = MISSED if (missed & valid).any() else UNKNOWN if invalid or (unknown & valid).any() else MET
    worst, reason = _worst(measured, valid, missed & absent, unknown, np.where(valid, room, np.nan))
    if reason is None and verdict == UNKNOWN and invalid:
        reason = _some_invalid(invalid, len(valid))
    room = np.where(lost, -np.inf, np.where(absent, np.inf, room))
    return Judgement(verdict, worst, invalid, reason, np.where(valid, room, np.inf))


def _some_invalid(invalid: int, points: int) -> str:
    return f"{invalid} of {points} points are not valid"


def _judge_absent(target: Target, measured: Measured, absent: Mask) -> tuple[Mask, Mask]:
    """Points whose number does not exist: missed, and unknown, by what the reason means for the target's sides."""
    missed, unknown = np.zeros(absent.shape, dtype=bool), np.zeros(absent.shape, dtype=bool)
    if target.formula is not None:  # whatever its parts mean for themselves, a figure over a missing metric is unknown
        return missed, absent
    sides = [side for side, limit in (("min", target.minimum), ("max", target.maximum)) if limit is not None]
    reasons = np.broadcast_to(Reason.NOT_A_NUMBER if measured.reasons is None else measured.reasons, absent.shape)
    for number in sorted(set(reasons[absent].tolist())):  # np.unique would load masked arrays
        means = {Reason(int(number)).verdict(side) for side in sides}
        where = absent & (reasons == number)
        missed |= where & (MISSED in means)
        unknown |= where & (MISSED not in means and UNKNOWN in means)
    return missed, unknown


def _worst(measured: Measured, valid: Mask, lost: Mask, unknown: Mask, room: Array) -> tuple[int | None, str | None]:
    for absent in (lost & valid, unknown & valid):
        if absent.any():
            first = int(np.argmax(absent))
            return first, measured.reason((first,)).text or Reason.NOT_A_NUMBER.text
    if np.isnan(room).all():
        if not valid.any():
            return None, NONE_VALID
        place = int(np.argmax(valid))
        return place, measured.reason((place,)).text or None
    return int(np.nanargmin(room)), None
