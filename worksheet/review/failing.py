"""What would have to be true for a block to fail: every input that can break a target, the weakest trust first."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from worksheet.model.keys import TRUST
from worksheet.review.fragility import Fragile, Fragility
from worksheet.review.judge import missed_by_value
from worksheet.review.results import TargetReview

NOMINAL, WORST = "nominal", "worst"


@dataclass(frozen=True, slots=True)
class Failing:
    """One input and one target that it can break.

    Attributes:
        row: The input, the target, the break value and the room.
        where: "nominal", or "worst" for the target's worst condition.
    """

    row: Fragile
    where: str


def failing(ranked: Fragility) -> list[Failing]:
    """Every pair with a break value, of an input and a target the condition with less room.

    Args:
        ranked: The sheet's fragility.
    Returns: least trust first (nothing stated is least), least room first among equals
    """
    least: dict[tuple[str, str], Failing] = {}
    for where, rows in ((WORST, ranked.worst), (NOMINAL, ranked.nominal)):
        for row in rows:
            if row.room is None:
                continue
            known = least.get((row.name, row.target))
            if known is None or row.room < (known.row.room or 0.0):
                least[row.name, row.target] = Failing(row, where)
    return sorted(least.values(), key=_order)


def missed_at(target: TargetReview, where: str) -> bool:
    """Whether a target is missed at the nominal condition, or at its worst one; no number counts as a miss."""
    value = target.nominal if where == NOMINAL else target.worst
    return value is None or bool(missed_by_value(target.target, np.array([value])).any())


def _order(one: Failing) -> tuple[int, float, str]:
    trust = TRUST.index(one.row.trust) if one.row.trust in TRUST else -1
    return trust, one.row.room or 0.0, one.row.name
