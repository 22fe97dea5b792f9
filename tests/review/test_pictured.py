"""What pictures are drawn from agrees with the numbers beside them."""

from __future__ import annotations

import datetime

import numpy as np
import pytest

from tests.paths import TOP
from worksheet.review.pictured import margins, response
from worksheet.review.review import solve
from worksheet.session.workbook import Workbook

DAY = datetime.date(2026, 12, 1)
SHEETS = ("battery_watch", "converter_driver", "electrode_buffer", "level_amplifier", "mux_driver", "pressure_input")


@pytest.fixture(scope="module")
def workbook() -> Workbook:
    return Workbook.read(TOP / "sample_projects" / "tide_gauge")


@pytest.mark.parametrize("name", SHEETS)
def test_a_response_starts_at_the_dc_gain_and_has_fallen_by_3_db_at_the_bandwidth(
    workbook: Workbook, name: str
) -> None:
    assert workbook.evaluator is not None
    points, problems = solve(workbook.evaluator, name)
    assert points is not None, problems
    found = response(points)
    assert found is not None
    solution = points.case.solution
    gain, bandwidth = (np.broadcast_to(solution[k], len(found.magnitude)) for k in ("dc_gain", "bandwidth"))
    assert found.magnitude[:, 0] == pytest.approx(gain, rel=1e-4)
    for row, corner, still in zip(found.magnitude, bandwidth, gain, strict=True):
        at = np.interp(np.log(corner), np.log(found.frequency), np.log(row))
        assert np.exp(at) == pytest.approx(still / np.sqrt(2), rel=2e-3)
    assert np.abs(found.phase[:, 0]) == pytest.approx(0.0 if _follows(name) else 180.0, abs=1.0)


def _follows(name: str) -> bool:
    """Whether the output goes the way of the input."""
    return name in ("electrode_buffer", "mux_driver", "pressure_input", "battery_watch")


def test_the_least_margin_over_conditions_is_the_target_s_own(workbook: Workbook) -> None:
    assert workbook.evaluator is not None
    held = 0
    for sheet in workbook.review(DAY).sheets:
        points, _ = solve(workbook.evaluator, sheet.sheet.name)
        assert points is not None
        found = margins(points)
        assert found.valid.all()
        for target in sheet.targets:
            assert float(found.by_target[target.target.name].min()) == pytest.approx(target.margin, rel=1e-12)
            held += 1
    assert held > 20
