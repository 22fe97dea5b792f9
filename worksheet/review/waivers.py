"""Waivers: a miss that was accepted holds until its date, and for nothing worse than the value that was accepted."""

from __future__ import annotations

import datetime
from collections.abc import Sequence

from worksheet.model.sheet import TOLERANCE, Target, Waiver
from worksheet.review.results import MISSED, UNKNOWN, WAIVED


def waived(
    waivers: Sequence[Waiver], target: Target, verdict: str, worst: float | None, today: datetime.date
) -> tuple[str, str | None]:
    """A verdict with waivers taken into account, and the reason where a waiver decides it.

    Args:
        waivers: The sheet's.
        target: What is judged.
        verdict: Without waivers.
        worst: Worst value. [unit of the metric]
        today: The last day on which a waiver may still end.
    Returns: (verdict, reason or None)
    """
    if verdict not in (MISSED, UNKNOWN):
        return verdict, None
    lapsed: str | None = None
    for waiver in waivers:
        if waiver.target != target.name:
            continue
        lapsed = _lapsed(waiver, target, worst, today)
        if lapsed is None:
            return WAIVED, f"waived by {waiver.by}: {waiver.reason}"
    return verdict, lapsed


def _lapsed(waiver: Waiver, target: Target, worst: float | None, today: datetime.date) -> str | None:
    """Say why a waiver no longer holds, or None where it does."""
    if waiver.until is not None and today > waiver.until:
        return f"the waiver by {waiver.by} ended on {waiver.until.isoformat()}"
    if waiver.value is None:
        return None
    if worst is None:
        return f"the waiver by {waiver.by} accepts a value, and there is none to compare"
    slack = TOLERANCE * abs(waiver.value)
    below = target.minimum is not None and worst < target.minimum and worst < waiver.value - slack
    above = target.maximum is not None and worst > target.maximum and worst > waiver.value + slack
    return f"worse than what the waiver by {waiver.by} accepts" if below or above else None
