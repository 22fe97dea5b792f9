"""A target as numbers: what it measures, its limits, and by how much a value clears them."""

from __future__ import annotations

from typing import Protocol

import numpy as np

from worksheet.device.arrays import Array, Number
from worksheet.engine.measured import Measured, with_reasons_of
from worksheet.model import metrics
from worksheet.model.metrics import Reason
from worksheet.model.sheet import Target
from worksheet.solver.subject import Subject

FAR = 1e3
"""Slack that stands for a number that does not exist but counts as met; its negative for missed or unknown."""

SIDES = ("low", "high")


class Metrics(Protocol):
    """Metrics by key: a solved stage, or one sheet's part of a solved batch."""

    def measure(self, key: str) -> Measured:
        """One metric with the reasons where it does not exist."""
        ...

    def __getitem__(self, key: str) -> Array:
        """One metric's values."""
        ...


def measure(subject: Subject, target: Target, solution: Metrics) -> Measured:
    """What a target is about, over the solution's points: a metric, a bound at a yield, a figure. [its unit]"""
    metric = metrics.find(target.name)
    if target.formula is not None or metric is None:
        names = target.formula.names if target.formula is not None else ()
        parts = [solution.measure(name) for name in names if metrics.find(name) is not None]
        return with_reasons_of(subject.figure(target, solution), parts)
    if metric.of_yield and target.yield_fraction is not None:
        base = solution.measure(metric.of_yield)
        return Measured(base.values * metrics.deviations(target.yield_fraction), base.reasons)
    return solution.measure(target.name)


def limits(target: Target) -> tuple[float | None, float | None]:
    """Least and greatest value that meets a target, its guard band counted. [unit of the target]"""
    low = None if target.minimum is None else target.minimum + target.guard * abs(target.minimum)
    high = None if target.maximum is None else target.maximum - target.guard * abs(target.maximum)
    return low, high


def slack(measured: Measured, limit: Number, side: str) -> Array:
    """By how much values clear one limit: positive where met.

    Args:
        measured: Values over points.
        limit: The limit, guard band counted; one for all values, or one each. [unit of the target]
        side: "low" for a minimum, "high" for a maximum.
    Returns: ln(value/limit) where both are positive, else the relative (limit 0: plain) distance; +-FAR where there is
        no number. [-]
    """
    values = measured.values
    with np.errstate(all="ignore"):
        bound = np.asarray(limit)
        plain = (values - bound) / np.where(bound == 0, 1.0, np.abs(bound))
        room = np.where((values > 0) & (bound > 0), np.log(values / bound), plain)
        room = room if side == "low" else -room
    absent = ~np.isfinite(values)
    if absent.any():
        room = np.where(absent, _absent(measured, side), room)
    return np.asarray(np.clip(room, -FAR, FAR))


def _absent(measured: Measured, side: str) -> Array:
    reasons = np.broadcast_to(
        Reason.NOT_A_NUMBER if measured.reasons is None else measured.reasons, measured.values.shape
    )
    means = np.full(len(Reason), -FAR)
    for reason in Reason:
        if reason.verdict("min" if side == "low" else "max") == "met":
            means[reason] = FAR
    return np.asarray(means[reasons])
