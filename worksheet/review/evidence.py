"""Evidence against targets: what was found, whether it still belongs to the sheet as it stands, and its verdict."""

from __future__ import annotations

import numpy as np

from worksheet.model.sheet import Evidence, Sheet, Target
from worksheet.review.judge import missed_by_value
from worksheet.review.results import MET, MISSED, EvidenceVerdict


def is_stale(evidence: Evidence, digits: str) -> bool:
    """Whether evidence belongs to other inputs than the sheet's digest stands for, or to none that is stated."""
    return evidence.basis != digits


def evidence_verdicts(sheet: Sheet, target: Target, digits: str) -> tuple[EvidenceVerdict, ...]:
    """Every piece of evidence for a target, judged at its value and at the ends of its range."""
    found = []
    for item in sheet.evidence:
        if item.metric == target.name:
            values = np.array([x for x in (item.value, item.low, item.high) if x is not None])
            verdict = MISSED if missed_by_value(target, values).any() else MET
            found.append(EvidenceVerdict(item.value, item.found_by, is_stale(item, digits), verdict))
    return tuple(found)
