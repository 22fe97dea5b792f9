"""Calculation against evidence: by how much the hand model is off, piece by piece and metric by metric."""

from __future__ import annotations

import math
from collections.abc import Iterator, Sequence
from dataclasses import dataclass

import numpy as np

from worksheet.model import metrics, operating
from worksheet.model.sheet import Condition, Evidence
from worksheet.project.case import Case, CaseError
from worksheet.project.conditions import ConditionSet
from worksheet.project.evaluate import Evaluator
from worksheet.review.evidence import is_stale
from worksheet.review.results import Review, SheetReview
from worksheet.solver import goals


@dataclass(frozen=True, slots=True)
class Deviation:
    """One piece of evidence beside what the sheet gives at its condition.

    Attributes:
        sheet: The block.
        evidence: What was found.
        unit: SI unit of its numbers.
        at: Where it was found.
        calculated: What the sheet gives there, None where it gives nothing. [unit]
        off: (found - calculated)/abs(calculated); None where that does not exist. [-]
        stale: Whether the sheet has moved since.
    """

    sheet: str
    evidence: Evidence
    unit: str
    at: Condition
    calculated: float | None
    off: float | None
    stale: bool


@dataclass(frozen=True, slots=True)
class Summary:
    """One metric over the project: pieces that are not stale, their mean and root-mean-square deviation. [-]"""

    metric: str
    count: int
    mean: float
    rms: float


def deviations(evaluator: Evaluator | None, review: Review) -> tuple[Deviation, ...]:
    """Every piece of evidence of a project beside the calculation, in the order of the sheets."""
    if evaluator is None:
        return ()
    return tuple(one for sheet in review.sheets for one in _of_sheet(evaluator, sheet))


def summaries(found: Sequence[Deviation]) -> tuple[Summary, ...]:
    """By how much each metric is off over the project, stale evidence left out; the worst first."""
    rows = []
    for metric in dict.fromkeys(one.evidence.metric for one in found):
        off = [one.off for one in found if one.evidence.metric == metric and one.off is not None and not one.stale]
        if off:
            rms = math.sqrt(math.fsum(x * x for x in off) / len(off))
            rows.append(Summary(metric, len(off), math.fsum(off) / len(off), rms))
    return tuple(sorted(rows, key=lambda row: -row.rms))


def _of_sheet(evaluator: Evaluator, result: SheetReview) -> Iterator[Deviation]:
    name = result.sheet.name
    own = evaluator.conditions(name)
    for item in result.sheet.evidence:
        at = item.at or own.nominal
        try:
            case = evaluator.over(name, ConditionSet(own.process, (own.nominal, at)))
            value, unit = _calculated(case, item.metric)
        except CaseError:
            value, unit = None, ""
        off = None if not value else (item.value - value) / abs(value)
        yield Deviation(name, item, unit, at, value, off, is_stale(item, result.basis))


def _calculated(case: Case, metric: str) -> tuple[float | None, str]:
    """What a sheet gives at the last condition, and its unit."""
    solution = case.solution
    known, target = metrics.find(metric), case.sheet.targets.get(metric)
    device, _, value = metric.partition(".")
    if value:
        numbers = getattr(solution.devices[device], value)
        unit = operating.named((device,))[metric].unit
    elif known is not None:
        numbers, unit = solution.measure(metric).values, known.dimension.unit
    else:
        assert target is not None  # the reader refuses evidence of anything else
        numbers, unit = goals.measure(case, target, solution).values, target.unit
    number = float(np.broadcast_to(np.asarray(numbers), np.broadcast_shapes(np.shape(numbers), (1,))).reshape(-1)[-1])
    return (number if math.isfinite(number) else None), unit
