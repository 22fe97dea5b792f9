"""Sizes left out of a current source's transistor: the main length, and the highest inversion that ranges allow."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest

from tests.bench.solve_speed import case_of
from worksheet.project.case import Case
from worksheet.session.workbook import Workbook
from worksheet.solver import needed

OPEN = {"bias_current": "propose", "width": "propose", "length": "propose"}
TARGET = {"unity_gain_frequency": {"min": 2e6}, "dc_gain": {"min": 30.0}, "output_swing": {"min": 0.9}}


def inversion(case: Case) -> float:
    device = case.inputs.devices["bias"]
    return float(np.ravel(case.inputs.current / device.specific)[0])


def test_with_everything_open_the_source_follows_the_main_device(tmp_path: Path) -> None:
    case = case_of(tmp_path, "common-source", bias={"device": "pfet"}, choose=OPEN, target=TARGET)
    sizes = {name: float(np.ravel(case.value(name))[0]) for name in ("length", "bias_length", "bias_width")}
    assert sizes["bias_length"] == pytest.approx(sizes["length"], rel=1e-9)
    assert inversion(case) == pytest.approx(10.0) or sizes["bias_width"] == 2.2e-7
    trials = needed.trials_of(case)
    slack = trials.clear({"width": np.ravel(case.value("width"))[:1]}).slack
    assert slack.min() >= -1e-9


def test_a_stated_current_gives_inversion_ten(tmp_path: Path) -> None:
    target = {"power": {"max": 1e-3}}
    case = case_of(tmp_path, "common-source", bias={"device": "pfet"}, target=target)
    assert float(np.ravel(case.value("bias_length"))[0]) == 5e-7
    assert inversion(case) == pytest.approx(10.0, rel=1e-9)


@pytest.mark.parametrize("waived", [False, True])
def test_a_range_target_makes_the_source_weaker_unless_it_is_waived(waived: bool, tmp_path: Path) -> None:
    """Over all conditions: swing = supply less both saturation voltages."""
    target = {"output_swing": {"min": 1.15}}
    case = case_of(tmp_path, "common-source", bias={"device": "pfet"}, target=target)
    if waived:
        file = tmp_path / "sheets" / "drawn.toml"
        waiver = '\n[[waiver]]\ntarget = "output_swing"\nby = "A"\nreason = "trial"\ndated = 2026-01-01\n'
        file.write_text(file.read_text("utf-8") + waiver, "utf-8")
        evaluator = Workbook.read(tmp_path).evaluator
        assert evaluator is not None
        assert inversion(evaluator.case("drawn")) == pytest.approx(10.0, rel=1e-9)
        return
    assert inversion(case) < 9.9
    worst = float(np.min(case.solution["output_swing"]))
    assert worst == pytest.approx(1.15, rel=1e-6)
