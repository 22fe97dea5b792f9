"""One target judged over points: which are met, which is worst, what follows for the verdict.

A point is a condition, or a condition with assumptions at ends of their ranges. Rules: contract of the review.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from worksheet.device.arrays import Array
from worksheet.engine.measured import Measured
from worksheet.model.metrics import Reason
from worksheet.model.sheet import Target
from worksheet.review.results import MET, MISSED, UNKNOWN
from worksheet.solver.goals import TOLERANCE, limits

Mask = NDArray[np.bool_]


@dataclass(frozen=True, eq=False, slots=True)
class Judgement:
    """What a target's values over points come to.

    Attributes:
        verdict: MET, MISSED or UNKNOWN.
        worst: Index of the worst valid point, None where there is none.
        invalid: Number of points that are not valid.
        reason: Why, where the numbers do not say it.
    """

    verdict: str
    worst: int | None
    invalid: int
    reason: str | None


def missed_by_value(target: Target, values: Array) -> Mask:
    """Where values miss a target; False where there is no number."""
    low, high = limits(target)
    missed = np.zeros(np.shape(values), dtype=bool)
    with np.errstate(invalid="ignore"):
        if low is not None:
            missed |= values < low - TOLERANCE * abs(low)
        if high is not None:
            missed |= values > high + TOLERANCE * abs(high)
    return missed


def margins(target: Target, values: Array) -> Array:
    """Relative distance to the nearer limit, negative where it is passed; NaN for a limit of 0 or no number. [-]"""
    found = np.full(np.shape(values), np.nan)
    if target.minimum:
        found = np.fmin(found, (values - target.minimum) / abs(target.minimum))
    if target.maximum:
        found = np.fmin(found, (target.maximum - values) / abs(target.maximum))
    return found


def _distance(target: Target, values: Array) -> Array:
    """What orders points from worst to best: the margin, or the plain distance where a limit is 0."""
    found = np.full(np.shape(values), np.nan)
    for limit, sign in ((target.minimum, 1.0), (target.maximum, -1.0)):
        if limit is not None:
            found = np.fmin(found, sign * (values - limit) / (abs(limit) or 1.0))
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
    missed, unknown = missed_by_value(target, values), np.zeros(values.shape, dtype=bool)
    absent = ~np.isfinite(values)
    if absent.any():
        lost, open_ = _judge_absent(target, measured, absent)
        missed, unknown = missed | lost, unknown | open_
    invalid = int(np.count_nonzero(~valid))
    verdict = MISSED if (missed & valid).any() else UNKNOWN if invalid or (unknown & valid).any() else MET
    worst, reason = _worst(target, measured, valid, missed & absent, unknown)
    if reason is None and verdict == UNKNOWN and invalid:
        reason = f"{invalid} of {len(values)} points are not valid"
    return Judgement(verdict, worst, invalid, reason)


def _judge_absent(target: Target, measured: Measured, absent: Mask) -> tuple[Mask, Mask]:
    """Points whose number does not exist: missed, and unknown, by what the reason means for the target's sides."""
    missed, unknown = np.zeros(absent.shape, dtype=bool), np.zeros(absent.shape, dtype=bool)
    if target.formula is not None:  # whatever its parts mean for themselves, a figure over a missing metric is unknown
        return missed, absent
    sides = [side for side, limit in (("min", target.minimum), ("max", target.maximum)) if limit is not None]
    reasons = np.broadcast_to(Reason.NOT_A_NUMBER if measured.reasons is None else measured.reasons, absent.shape)
    for number in np.unique(reasons[absent]):
        means = {Reason(int(number)).verdict(side) for side in sides}
        where = absent & (reasons == number)
        missed |= where & (MISSED in means)
        unknown |= where & (MISSED not in means and UNKNOWN in means)
    return missed, unknown


def _worst(target: Target, measured: Measured, valid: Mask, lost: Mask, unknown: Mask) -> tuple[int | None, str | None]:
    for absent in (lost & valid, unknown & valid):
        if absent.any():
            first = int(np.argmax(absent))
            return first, measured.reason((first,)).text or Reason.NOT_A_NUMBER.text
    distance = np.where(valid, _distance(target, measured.values), np.nan)
    if np.isnan(distance).all():
        if not valid.any():
            return None, "no condition is valid"
        place = int(np.argmax(valid))
        return place, measured.reason((place,)).text or None
    return int(np.nanargmin(distance)), None
