"""One sheet reviewed: from its solved case to metrics, validity, targets and notes."""

from __future__ import annotations

import datetime
from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from functools import cached_property

import numpy as np

from worksheet.device.arrays import Array
from worksheet.engine.measured import Measured
from worksheet.engine.solution import NumericSolution
from worksheet.engine.validity import Shortfall, shortfalls
from worksheet.model import metrics, operating
from worksheet.model.problem import Problem
from worksheet.model.sheet import Condition, Target
from worksheet.project.case import Case
from worksheet.review import digest, judge, notes, state
from worksheet.review.evidence import evidence_verdicts
from worksheet.review.judge import Mask
from worksheet.review.results import Choice, Invalid, Number, SheetReview, TargetReview
from worksheet.review.waivers import waived
from worksheet.solver import goals, ranges


@dataclass(frozen=True, eq=False)
class Points:
    """A case solved over points: its conditions, times the ends of its assumptions' ranges.

    Arrays that it gives have shape (points,): the stated values at the nominal condition first, conditions running
    fastest.
    """

    case: Case
    moves: Mapping[str, Array]
    solution: NumericSolution

    @cached_property
    def shape(self) -> tuple[int, int]:
        """(vertices, conditions)"""
        return max((len(values) for values in self.moves.values()), default=1), len(self.case.conditions)

    def spread(self, values: Array) -> Array:
        """Values over points, from any shape that broadcasts to (vertices, conditions)."""
        return np.broadcast_to(values, self.shape).reshape(-1)

    def measured(self, measured: Measured) -> Measured:
        """A measured number over points."""
        reasons = None if measured.reasons is None else np.broadcast_to(measured.reasons, self.shape).reshape(-1)
        return Measured(self.spread(measured.values), reasons)

    @cached_property
    def shortfalls(self) -> tuple[Shortfall, ...]:
        """Everything that can fail to hold, over points."""
        return tuple(Shortfall(s.device, s.what, self.spread(s.short_by)) for s in shortfalls(self.solution))

    @cached_property
    def valid(self) -> Mask:
        """Points at which everything holds."""
        broken = np.zeros(self.shape[0] * self.shape[1], dtype=bool)
        for shortfall in self.shortfalls:
            broken |= shortfall.broken
        return ~broken

    def condition(self, point: int) -> Condition:
        """The condition of a point."""
        return self.case.conditions.conditions[point % self.shape[1]]

    def moved(self, point: int) -> dict[str, float]:
        """Assumptions at an end of their range at a point, by name."""
        vertex = point // self.shape[1]
        return {
            name: float(values[vertex, 0]) for name, values in self.moves.items() if values[vertex, 0] != values[0, 0]
        }

    def target(self, target: Target) -> Measured:
        """What a target is about, over points."""
        return self.measured(goals.measure(self.case.moved(self.moves), target, self.solution))


def points_of(case: Case, extra: Mapping[str, Array] | None = None) -> Points:
    """Solve a case over its conditions and the ends of its ranges. CaseError where a value does not resolve."""
    moves = ranges.worst_points(case) if extra is None else dict(extra)
    return Points(case, moves, case.held(moves).solution if moves else case.solution)


def review_points(points: Points, today: datetime.date) -> SheetReview:
    """Review a solved sheet.

    Args:
        points: The solved sheet.
        today: For waivers with an end.
    Returns: SheetReview
    """
    case = points.case
    digits = digest.basis(case)
    holds, reason = state.state_of(case.sheet, digits)
    return SheetReview(
        sheet=case.sheet,
        basis=digits,
        state=holds,
        state_reason=reason,
        choices=dict(_choices(case)),
        operating_point={name: dict(_operating(points, name)) for name in points.solution.devices},
        metrics=dict(_metrics(points)),
        validity=tuple(_validity(points)),
        targets=tuple(_target(points, target, digits, today) for target in case.sheet.targets.values()),
        notes=tuple(notes.of_points(points.solution, points.case, points.spread)),
    )


def _choices(case: Case) -> Iterator[tuple[str, Choice]]:
    sheet = case.sheet
    for key in case.stage.design_keys(sheet.bias.ideal):
        if key.dimension is None:
            continue
        origin = "assumed" if key.name in sheet.assume else "proposed" if key.name in case.open_keys else "chosen"
        value = float(np.ravel(case.value(key.name))[0])
        yield key.name, Choice(value, key.dimension.unit, origin)


def _operating(points: Points, device: str) -> Iterator[tuple[str, float | str | None]]:
    solved = points.solution.devices[device]
    for value in operating.OPERATING_POINT:
        number = _first(points.spread(np.asarray(getattr(solved, value.key))))
        yield value.key, number
        if value.key == "inversion_coefficient" and number is not None:
            yield "region", operating.region(number)


def _first(values: Array) -> float | None:
    number = float(values[0])
    return number if np.isfinite(number) else None


def _metrics(points: Points) -> Iterator[tuple[str, Number]]:
    for metric in metrics.all_metrics():
        if points.case.stage.absent_metric(metric.key) is None:
            measured = points.measured(points.solution.measure(metric.key))
            reason = measured.reason((0,))
            yield metric.key, Number(_first(measured.values), metric.dimension.unit, reason.text or None)


def _validity(points: Points) -> Iterator[Invalid]:
    """One entry a device, kind and condition, with the greatest shortfall over the ranges."""
    for shortfall in points.shortfalls:
        if shortfall.broken.any():
            by_condition = shortfall.short_by.reshape(points.shape).max(axis=0)
            broken = shortfall.broken.reshape(points.shape).any(axis=0)
            for place in np.flatnonzero(broken):
                yield Invalid(
                    shortfall.device, shortfall.what, float(by_condition[place]), "V", points.condition(int(place))
                )


def _target(points: Points, target: Target, digits: str, today: datetime.date) -> TargetReview:
    measured = points.target(target)
    every = slice(0, 1) if target.at == "nominal" else slice(None)
    covered = Measured(measured.values[every], None if measured.reasons is None else measured.reasons[every])
    judgement = judge.judge(target, covered, points.valid[every])
    metric = metrics.find(target.name)
    unit = target.unit if target.formula is not None or metric is None else metric.dimension.unit
    worst = None if judgement.worst is None else _first(covered.values[judgement.worst :])
    margin = None if worst is None else _first(judge.margins(target, np.array([worst])))
    verdict, reason = waived(points.case.sheet.waivers, target, judgement.verdict, worst, today)
    return TargetReview(
        target=target,
        unit=unit,
        nominal=_first(measured.values),
        worst=worst,
        worst_at=None if judgement.worst is None else points.condition(judgement.worst),
        worst_with={} if judgement.worst is None else points.moved(judgement.worst),
        invalid=judgement.invalid,
        margin=margin,
        verdict=verdict,
        reason=reason or judgement.reason or _nominal_reason(measured),
        judged=judgement.verdict,
        evidence=evidence_verdicts(points.case.sheet, target, digits),
    )


def _nominal_reason(measured: Measured) -> str | None:
    return measured.reason((0,)).text or None


def level_problems(points: Points) -> list[Problem]:
    """A level that is sought in an empty range: there is none, so nothing can be computed from it."""
    short = float(np.ravel(points.solution.levels.empty)[0])
    if short <= 0:
        return []
    case = points.case
    levels = case.stage.levels
    key = next((f"assume.{level}" for level in reversed(levels) if level not in case.sheet.assume), "assume")
    message = (
        f"no {key.split('.')[-1]} is assumed and the range that keeps every device saturated is empty by {short:.3g} V "
        f"at the nominal "
        f"condition; assume {' or '.join(levels)}, or change sizes, current or supply"
    )
    return [Problem(case.sheet.file, case.sheet.lines.get("assume", case.sheet.lines.get("stage")), key, message)]
