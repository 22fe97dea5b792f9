"""What a review adds on request, sheet by sheet: fragility and yield. Nothing of it is computed otherwise."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from worksheet.project.evaluate import Evaluator
    from worksheet.review.fragility import Fragility
    from worksheet.review.results import Review
    from worksheet.review.yields import Yields


@dataclass(frozen=True, slots=True)
class Wanted:
    """What is asked for: the ranking of inputs, and a number of samples (0 for none) from a seed."""

    fragile: bool = False
    samples: int = 0
    seed: int = 0


@dataclass(frozen=True, slots=True)
class Deeper:
    """Fragility and yields by sheet, as far as they were asked for."""

    fragile: Mapping[str, Fragility] = field(default_factory=dict)
    yields: Mapping[str, Yields] = field(default_factory=dict)


def deeper(review: Review, evaluator: Evaluator | None, wanted: Wanted) -> Deeper:
    """Compute what is asked for beside a review.

    Args:
        review: The review.
        evaluator: Its project; None where that cannot be read.
        wanted: What is asked for.
    """
    if evaluator is None or wanted == Wanted():
        return Deeper()
    from worksheet.review.fragility import fragility
    from worksheet.review.yields import yields

    ranked, shares = {}, {}
    if wanted.fragile:
        ranked = fragility(
            evaluator,
            {
                sheet.sheet.name: {t.target.name: t.worst_at for t in sheet.targets if t.worst_at is not None}
                for sheet in review.sheets
            },
        )
    if wanted.samples:
        for sheet in review.sheets:
            shares[sheet.sheet.name] = yields(evaluator, sheet.sheet.name, wanted.samples, wanted.seed)
    return Deeper(ranked, shares)
