"""Whether an input breaks a target or makes it hold: judged at the condition that the row looks at."""

from __future__ import annotations

from types import SimpleNamespace
from typing import Any, cast

import pytest

from worksheet.model.sheet import Target
from worksheet.review.failing import NOMINAL, WORST, missed_at
from worksheet.review.results import TargetReview


def reviewed(nominal: float | None, worst: float | None) -> TargetReview:
    wanted: Any = SimpleNamespace(target=Target("bandwidth", minimum=5e6), nominal=nominal, worst=worst)
    return cast("TargetReview", wanted)


@pytest.mark.parametrize(
    ("nominal", "worst", "missed"),
    [(6e6, 5.5e6, (False, False)), (6e6, 4e6, (False, True)), (4.5e6, 4e6, (True, True)), (6e6, None, (False, True))],
)
def test_a_target_is_judged_where_the_row_looks(
    nominal: float, worst: float | None, missed: tuple[bool, bool]
) -> None:  # fmt: skip
    found = reviewed(nominal, worst)
    assert (missed_at(found, NOMINAL), missed_at(found, WORST)) == missed
