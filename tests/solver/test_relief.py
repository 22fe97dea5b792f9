"""Slack over two variables: boundaries run where bounds lie and where the map in cells has them."""

from __future__ import annotations

import numpy as np
import pytest

from tests.paths import TOP
from worksheet.session.workbook import Workbook
from worksheet.solver import needed
from worksheet.solver import plane as planes
from worksheet.solver.relief import relief
from worksheet.solver.trials import Trials

ACROSS, UP = "bias_current", "load_capacitance"


@pytest.fixture(scope="module")
def trials() -> Trials:
    evaluator = Workbook.read(TOP / "sample_projects" / "tide_gauge").evaluator
    assert evaluator is not None
    return needed.trials_of(evaluator.case("electrode_buffer"))


def test_it_holds_where_the_map_in_cells_says(trials: Trials) -> None:
    spans = (planes.Span(5e-8, 2e-6), planes.Span(1e-13, 1e-11))
    land = relief(trials, ACROSS, spans[0], UP, spans[1], (12, 9))
    cells = planes.plane(trials, ACROSS, spans[0], 12, UP, spans[1], 9)
    assert (land.met == cells.met).all()
    assert land.slack.shape == land.met.shape == (len(land.constraints), 10, 13)
    clear = np.abs(land.slack) > 1e-6
    assert ((land.slack > 0) == land.met)[clear].all()


def test_slack_is_nought_at_a_bound_of_the_present_point(trials: Trials) -> None:
    window = needed.windows(trials)[ACROSS]
    held = 0
    for bound in window.bounds:
        load = trials.subject.value(UP)
        here = float(np.ravel(load)[0])
        spans = (planes.Span(bound.value, bound.value * 1.01), planes.Span(here, here * 1.01))
        land = relief(trials, ACROSS, spans[0], UP, spans[1], (1, 1))
        slack = [s[0, 0] for c, s in zip(land.constraints, land.slack, strict=True) if c.name == bound.target]
        assert min(map(abs, slack)) < 1e-3  # the map holds one load, which follows another block's capacitance
        held += 1
    assert held
