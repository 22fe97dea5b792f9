"""The front of current against area: no feasible point drawn at random beats any of its points in both."""

from __future__ import annotations

import json
from pathlib import Path

import numpy as np
import pytest

from tests.cli.books import AMPLIFIER, FOLLOWER, PROCESS, PROJECT
from tests.support import run, write_project
from worksheet.report import front_text
from worksheet.report.csv_rows import csv_lines
from worksheet.review.front import front
from worksheet.session.workbook import Workbook
from worksheet.solver import needed
from worksheet.solver.propose import gate_area
from worksheet.solver.trials import holds

QUIET = FOLLOWER.replace("[target]", '[target]\nnoise_density = { max = "30 nV/√Hz" }\noffset_limit = { max = "8 mV" }')
OPEN = AMPLIFIER.replace('length = "0.5 um"\nbias', 'length = "propose"\nbias').replace(
    "[target]", '[target]\nunity_gain_frequency = { min = "3 MHz" }\nnoise_density = { max = "40 nV/√Hz" }'
)
HELD = (
    QUIET.replace("[choose]\n", "[choose]\n")
    .replace('width = "20 um"', "")
    .replace("[assume]", '[assume]\nwidth = "20 um"')
)
_DRAWN = 4000


@pytest.mark.parametrize("sheet", [FOLLOWER, QUIET, OPEN], ids=["fast", "quiet", "open length"])
def test_no_random_feasible_point_dominates_the_front(tmp_path: Path, sheet: str) -> None:
    book = Workbook.read(write_project(tmp_path, PROJECT, PROCESS, {"lamp": sheet}))
    assert book.evaluator is not None
    assert not book.project.problems
    case = book.evaluator.case("lamp")
    found = front(case)
    assert len(found.points) > 3
    currents, areas = (
        np.array(values)
        for values in zip(*((p.values["bias_current"], p.gate_area) for p in found.points), strict=True)
    )
    assert (np.diff(currents) > 0).all()
    assert (np.diff(areas) < 0).all()

    drawn = np.random.default_rng(20)
    near = drawn.integers(0, len(found.points), _DRAWN)
    spread = np.exp(drawn.normal(0.0, 0.3, (_DRAWN, len(found.free))))
    moves = {
        name: np.array([found.points[k].values[name] for k in near]) * spread[:, column]
        for column, name in enumerate(found.free)
    }
    wide = drawn.random(_DRAWN) < 0.3
    moves["bias_current"] = np.where(wide, currents[0] * np.exp(drawn.uniform(-1, 5, _DRAWN)), moves["bias_current"])
    moves["width"] = np.where(wide, 0.22e-6 * np.exp(drawn.uniform(0, 6, _DRAWN)), moves["width"])
    moves = {name: np.clip(values, 0.22e-6, 1e-2) if name == "width" else values for name, values in moves.items()}
    if "length" in moves:
        moves["length"] = np.clip(moves["length"], 0.18e-6, 50e-6)
    trials = needed.trials_of(case)
    slack = np.concatenate(
        [trials.clear({n: v[k : k + 500] for n, v in moves.items()}).slack for k in range(0, _DRAWN, 500)], axis=1
    )
    good = holds(trials.constraints, slack).all(axis=0)
    assert good.sum() > 100
    for current, area in zip(
        moves["bias_current"][good], np.broadcast_to(gate_area(case, moves), _DRAWN)[good], strict=True
    ):
        beaten = (current < currents * (1 - 1e-4)) & (area < areas * (1 - 1e-4))
        assert not beaten.any(), (current, area, found.points[int(np.argmax(beaten))])


def test_every_point_of_the_front_meets_every_target(tmp_path: Path) -> None:
    root = write_project(tmp_path / "open", PROJECT, PROCESS, {"lamp": QUIET})
    document = json.loads(run("front", str(root / "sheets" / "lamp.toml"), "--json").out)
    for point in document["points"][:: max(1, len(document["points"]) // 3)]:
        text = QUIET.replace('"4 uA"', repr(point["bias_current"])).replace('"20 um"', repr(point["width"]))
        root = write_project(tmp_path / "put", PROJECT, PROCESS, {"lamp": text})
        assert run("review", str(root)).status == 0
        found = json.loads(run("review", str(root), "--json").out)["sheets"][0]["metrics"]["gate_area"]["value"]
        assert found == pytest.approx(point["gate_area"], rel=1e-9)


def test_the_present_choice_stands_beside_it(tmp_path: Path) -> None:
    book = Workbook.read(write_project(tmp_path, PROJECT, PROCESS, {"lamp": QUIET}))
    assert book.evaluator is not None
    found = front(book.evaluator.case("lamp"), 5)
    document = front_text.document(found, "lamp")
    assert document["present"]["bias_current"] == 4e-6
    assert document["present"]["gate_area"] == pytest.approx(1e-11)
    assert document["present"]["missed"] == []
    out = list(front_text.text(found, "lamp", 80))
    assert any("X" in line for line in out)
    assert any("The present choice meets every target" in line for line in out)
    assert all(len(line) <= 80 for line in out)
    rows = list(csv_lines(front_text.rows(found)))
    assert len(rows) == len(document["points"]) + 2
    assert rows[-1].startswith("present,4e-06,2e-05,5e-07,")


def test_no_point_and_one_point_are_said(tmp_path: Path) -> None:
    never = FOLLOWER.replace('min = "5 MHz"', 'min = "500 THz"')
    root = write_project(tmp_path / "never", PROJECT, PROCESS, {"lamp": never})
    done = run("front", str(root / "sheets" / "lamp.toml"))
    assert done.status == 1
    assert "no point meets every target" in done.out
    assert "The present choice misses bandwidth." in done.out
    root = write_project(tmp_path / "held", PROJECT, PROCESS, {"lamp": HELD})
    document = json.loads(run("front", str(root / "sheets" / "lamp.toml"), "--json").out)
    assert document["free"] == ["bias_current"]
    assert len(document["points"]) == 1
