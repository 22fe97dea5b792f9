"""Budgets: sums over all sheets, each times its count, against the project's limits."""

from __future__ import annotations

from collections.abc import Mapping, Sequence

import numpy as np

from worksheet.model import metrics
from worksheet.review.results import MET, MISSED, UNKNOWN, BudgetReview
from worksheet.review.sheet_review import Points
from worksheet.solver.goals import TOLERANCE


def review_budgets(budgets: Mapping[str, float], sheets: Sequence[Points], complete: bool) -> tuple[BudgetReview, ...]:
    """Judge every budget on the sum of the sheets' worst conditions.

    Args:
        budgets: Limits by metric. [unit of the metric]
        sheets: All sheets that could be solved.
        complete: Whether these are all sheets of the project.
    Returns: one BudgetReview a budget; unknown where a sheet is missing, unless already missed
    """
    found = []
    for key, limit in budgets.items():
        metric = metrics.find(key)
        assert metric is not None  # the reader refuses unknown metrics
        values = [(s.case.sheet.count, s.measured(s.solution.measure(key)).values) for s in sheets]
        nominal = float(sum(count * v[0] for count, v in values))
        worst = float(sum(count * np.max(v) for count, v in values))
        over = worst > limit * (1 + TOLERANCE)
        known = complete and np.isfinite(worst)
        verdict = MISSED if over else MET if known else UNKNOWN
        found.append(BudgetReview(key, metric.dimension.unit, limit, _finite(nominal), _finite(worst), verdict))
    return tuple(found)


def _finite(number: float) -> float | None:
    return number if np.isfinite(number) else None
