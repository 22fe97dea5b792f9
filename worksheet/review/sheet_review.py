"""One sheet reviewed: from its solved case to metrics, validity, targets and notes."""

from __future__ import annotations

import datetime
from collections.abc import Iterator, Mapping, Sequence
from math import isfinite

import numpy as np

from worksheet.engine.measured import Measured
from worksheet.model import metrics, operating
from worksheet.model.problem import Problem
from worksheet.model.sheet import Target
from worksheet.project.case import Case
from worksheet.review import digest, judge, notes, state
from worksheet.review.breaking import breaks_first
from worksheet.review.evidence import evidence_verdicts
from worksheet.review.results import Choice, Invalid, Number, SheetReview, TargetReview
from worksheet.review.solved import Points
from worksheet.review.waivers import waived


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
        operating_point={name: dict(_operating(points, found)) for name, found in points.solved.operating.items()},
        metrics=dict(_metrics(points)),
        validity=tuple(_validity(points)),
        targets=tuple(_target(points, target, digits, today) for target in case.sheet.targets.values()),
        notes=tuple(notes.of_points(points)),
    )


def _choices(case: Case) -> Iterator[tuple[str, Choice]]:
    sheet = case.sheet
    for key in case.stage.design_keys(sheet.bias.ideal):
        if key.dimension is None:
            continue
        origin = "assumed" if key.name in sheet.assume else "proposed" if key.name in case.open_keys else "chosen"
        value = float(np.ravel(case.value(key.name))[0])
        yield key.name, Choice(value, key.dimension.unit, origin)


def _operating(points: Points, found: Mapping[str, Sequence[float | None]]) -> Iterator[tuple[str, float | str | None]]:
    for key, numbers in found.items():
        number = numbers[points.number]
        yield key, number
        if key == "inversion_coefficient" and number is not None:
            yield "region", operating.region(number)


def _metrics(points: Points) -> Iterator[tuple[str, Number]]:
    for key, (numbers, reasons) in points.solved.metrics.items():
        yield key, Number(numbers[points.number], _unit(key), reasons[points.number])


def _unit(key: str) -> str:
    metric = metrics.find(key)
    return "" if metric is None else metric.dimension.unit


def _validity(points: Points) -> Iterator[Invalid]:
    """One entry a device, kind and condition, with the greatest shortfall over the ranges."""
    for shortfall in points.broken():
        by_condition = shortfall.short_by.max(axis=0)
        for place in np.flatnonzero(shortfall.broken.any(axis=0)).tolist():
            yield Invalid(shortfall.device, shortfall.what, float(by_condition[place]), "V", points.condition(place))


def _number(value: float) -> float | None:
    return float(value) if isfinite(value) else None


def _target(points: Points, target: Target, digits: str, today: datetime.date) -> TargetReview:
    measured = points.target(target)
    covered, valid = measured, points.valid
    if target.at == "nominal":
        reasons = None if measured.reasons is None or not measured.reasons[0] else measured.reasons[:1]
        covered, valid = Measured(measured.values[:1], reasons), valid[:1]
    judgement = judge.judge(target, covered, valid)
    metric = metrics.find(target.name)
    unit = target.unit if target.formula is not None or metric is None else metric.dimension.unit
    worst = None if judgement.worst is None else _number(covered.values[judgement.worst])
    margin = None if worst is None else judge.margin(target, worst)
    verdict, reason = waived(points.case.sheet.waivers, target, judgement.verdict, worst, today)
    first = breaks_first(points, judgement.room, judgement.worst)
    return TargetReview(
        target=target,
        unit=unit,
        nominal=_number(measured.values[0]),
        worst=worst,
        worst_at=None if judgement.worst is None else points.condition(judgement.worst),
        worst_with={} if judgement.worst is None else points.moved(judgement.worst),
        invalid=judgement.invalid,
        margin=margin,
        verdict=verdict,
        reason=reason or judgement.reason or _nominal_reason(measured),
        judged=judgement.verdict,
        evidence=evidence_verdicts(points.case.sheet, target, digits),
        breaks_first=first.order,
        cause=first.cause,
    )


def _nominal_reason(measured: Measured) -> str | None:
    return measured.reason((0,)).text or None


def level_problems(points: Points) -> list[Problem]:
    """A level that is sought in an empty range: there is none, so nothing can be computed from it."""
    short = points.solved.firsts("empty", points.solution.levels.empty)[points.number]
    if short is None or short <= 0:
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
