"""Budgets: sums over all sheets, each times its count, against the project's limits."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import NamedTuple

import numpy as np

from worksheet.model import metrics
from worksheet.model.sheet import TOLERANCE
from worksheet.review.results import MET, MISSED, UNKNOWN, BudgetReview
from worksheet.review.solved import Points


class Spent(NamedTuple):
    """What one sheet, times its count, takes of a budget. [unit of the metric]"""

    nominal: float
    worst: float


def spent(points: Points) -> dict[str, Spent]:
    """What a solved sheet takes of every budget that there can be, by metric."""
    count = points.case.sheet.count
    found = {}
    for metric in metrics.all_metrics():
        if metric.additive:
            values = points.measured(metric.key).values
            found[metric.key] = Spent(count * float(values[0]), count * float(values.max()))
    return found


def review_budgets(
    budgets: Mapping[str, float], sheets: Sequence[Mapping[str, Spent]], complete: bool
) -> tuple[BudgetReview, ...]:
    """Judge every budget on the sum of the sheets' worst conditions.

    Args:
        budgets: Limits by metric. [unit of the metric]
        sheets: What each sheet that could be solved takes.
        complete: Whether these are all sheets of the project.
    Returns: one BudgetReview a budget; unknown where a sheet is missing, unless already missed
    """
    found = []
    for key, limit in budgets.items():
        metric = metrics.find(key)
        assert metric is not None  # the reader refuses unknown metrics
        nominal, worst = sum(s[key].nominal for s in sheets), sum(s[key].worst for s in sheets)
        over = worst > limit * (1 + TOLERANCE)
        known = complete and np.isfinite(worst)
        verdict = MISSED if over else MET if known else UNKNOWN
        found.append(BudgetReview(key, metric.dimension.unit, limit, _finite(nominal), _finite(worst), verdict))
    return tuple(found)


def _finite(number: float) -> float | None:
    return number if np.isfinite(number) else None
