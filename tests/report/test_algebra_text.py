"""Algebra as a designer reads it in a terminal: whole, within its columns, with the place each number came from."""

from __future__ import annotations

import random
from pathlib import Path

import pytest

from tests.precision.draw import draw
from tests.solver.drawn import KINDS, case_of
from tests.solver.test_hand import bounds_of, follower, limit_of
from worksheet.project.case import Case
from worksheet.report import algebra_text
from worksheet.report.table import width_of
from worksheet.solver.algebra import explain, explainable
from worksheet.solver.hand import hand_bound
from worksheet.solver.present import Effect
from worksheet.solver.stated import Origin
from worksheet.stages import catalogue


def case(folder: Path) -> Case:
    found = case_of(folder, follower())
    assert found is not None
    return found


def test_a_number_with_everything_about_it(tmp_path: Path) -> None:
    lines = list(algebra_text.explanation(explain(case(tmp_path), "bandwidth"), 80, use_unicode=False))
    text = " ".join(" ".join(lines).split())
    assert lines[0].startswith("Bandwidth f_3dB = ")
    assert lines[0].endswith("Hz at typical 27 °C 1.8 V")
    for part in ("c_gs", "follows: main.gate_source_capacitance", "Behind it: ", "Holds: every device is saturated",
                 "feed-through: -", "Without feed-through: "):  # fmt: skip
        assert part in text, part


def test_a_stated_number_with_its_place(tmp_path: Path) -> None:
    text = "\n".join(algebra_text.explanation(explain(case(tmp_path), "main.source_conductance"), 80))
    assert "sheets/drawn.toml:" in text
    lines = list(algebra_text.explanation(explain(case(tmp_path), "load_capacitance"), 80))
    assert lines[0].startswith("Load capacitance C_L = 1.2 pF")
    assert any("assume.load_capacitance" in line for line in lines)


def test_it_says_what_does_not_hold_and_why_a_number_is_missing(tmp_path: Path) -> None:
    project, process, sheet = follower()
    sheet["assume"]["output_level"] = 1.75
    found = case_of(tmp_path, (project, process, sheet))
    assert found is not None
    lines = list(algebra_text.explanation(explain(found, "unity_gain_frequency"), 80))
    assert "gain below 1" in lines[0]
    assert any(line.startswith("Out of range: main is not saturated") for line in lines)


@pytest.mark.parametrize("width", [60, 80, 120])
@pytest.mark.parametrize("kind", KINDS[2::7], ids="-".join)
def test_nothing_is_wider_than_the_terminal(kind: tuple[str, str, str], width: int, tmp_path: Path) -> None:
    found = next(
        c
        for seed in range(20)
        if (c := case_of(tmp_path / str(seed), draw(random.Random(f"{kind}{seed}"), *kind, want_invalid=False)))
    )
    for key in explainable(found)[::5]:
        for use_unicode in (True, False):
            lines = list(algebra_text.explanation(explain(found, key), width, use_unicode))
            assert max(map(width_of, lines)) <= width, key


def test_a_bound_with_its_formula(tmp_path: Path) -> None:
    found = case(tmp_path)
    (bound,) = [b for name, b in bounds_of(found) if name == "bias_current" and b.target == "bandwidth"]
    algebra = hand_bound(found, bound.target, bound.side, limit_of(found, bound), "bias_current", bound.point)
    assert algebra is not None
    lines = list(algebra_text.bound(algebra, "I", bound.side, "1.5 uA", 80, "  "))
    assert lines[:2] == ["  I ≥ I_spec*(y + y**2) = 1.5 uA by hand", "    y = 2*pi*C_o*U_T*bandwidth/I_spec"]
    assert lines[2].startswith("    neglects feed-through (-")
    assert "parasitics that move with current (" in " ".join(lines[2:])


def test_how_an_effect_reads() -> None:
    assert algebra_text.share(Effect("feed-through", -0.0123)) == "-1.23 %"
    assert algebra_text.share(Effect("feed-through", None)) == "no value would be left"
    assert "for each 100 % of the unknown" in algebra_text.share(Effect("parasitics", 0.1, moving=True))


def test_how_an_origin_reads() -> None:
    place = Origin("sheet", "sheets/buffer.toml", 12, "assume.load_capacitance", "floor plan, rev 3", "estimate")
    assert algebra_text.origin(place) == "sheets/buffer.toml:12 assume.load_capacitance, floor plan, rev 3 (estimate)"
    assert algebra_text.origin(Origin("default", key="noise_from")) == "default noise_from"


@pytest.mark.parametrize(
    "stage",
    [pytest.param(one, marks=() if k % 2 else pytest.mark.full) for k, one in enumerate(catalogue.stages())],
    ids=lambda stage: stage.key,
)
def test_every_metric_of_a_stage_has_its_formula(stage: object) -> None:
    from worksheet.model import metrics
    from worksheet.stages.stage import Stage

    assert isinstance(stage, Stage)
    drawn, plain = list(algebra_text.stage(stage, 80)), list(algebra_text.stage(stage, 80, use_unicode=False))
    assert max(map(width_of, (*drawn, *plain))) <= 80
    assert not any("─" in line for line in plain)
    for metric in metrics.all_metrics():
        starts = [line for line in plain if line == f"  {metric.key}"]
        assert len(starts) == (stage.absent_metric(metric.key) is None), metric.key
    assert any(line.strip().startswith("I = ") for line in plain)
