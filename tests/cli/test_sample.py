"""The sample project: what its review and its solver say is what it was made to show."""

from __future__ import annotations

import json
import math
import re
from pathlib import Path
from typing import Any

import pytest

from tests.paths import TOP
from tests.support import run
from worksheet.model.sheet import Process
from worksheet.project.discover import load
from worksheet.session.workbook import Workbook
from worksheet.stages import catalogue

SAMPLE = TOP / "sample_projects" / "tide_gauge"
VERDICTS = {
    "battery_watch": {"dc_gain": "met", "bandwidth": "met", "output_resistance": "met"},
    "converter_driver": {"unity_gain_frequency": "missed", "supply_current": "met", "dc_gain": "met"},
    "electrode_buffer": dict.fromkeys(("dc_gain", "bandwidth", "output_noise", "supply_current", "figure"), "met"),
    "level_amplifier": dict.fromkeys(("dc_gain", "unity_gain_frequency", "noise_density", "output_swing"), "met"),
    "mux_driver": dict.fromkeys(("settling_time", "dc_gain", "input_capacitance", "slew_rate"), "met"),
    "pressure_input": {
        "dc_gain": "missed",
        "bandwidth": "met",
        "noise_density": "met",
        "input_noise": "met",
        "offset_limit": "met",
    },
    "wake_comparator": {"dc_gain": "met", "bandwidth": "met", "offset_limit": "waived", "supply_rejection": "met"},
}


@pytest.fixture(scope="module")
def document() -> dict[str, Any]:
    done = run("review", str(SAMPLE), "--json")
    assert done.status == 1
    assert done.err == ""
    found: dict[str, Any] = json.loads(done.out)
    return found


def test_verdicts_are_those_intended(document: dict[str, Any]) -> None:
    found = {s["sheet"]: {t["metric"]: t["verdict"] for t in s["targets"]} for s in document["sheets"]}
    assert found == VERDICTS
    assert {b["metric"]: b["verdict"] for b in document["budget"]} == {
        "supply_current": "met",
        "power": "met",
        "gate_area": "met",
    }
    assert document["problems"] == []
    assert not any(sheet["validity"] for sheet in document["sheets"])


def test_one_piece_of_evidence_is_stale_and_the_others_belong_to_the_sheets_as_they_are(
    document: dict[str, Any],
) -> None:
    stale = {
        (s["sheet"], t["metric"]): e["stale"] for s in document["sheets"] for t in s["targets"] for e in t["evidence"]
    }
    assert stale == {
        ("electrode_buffer", "bandwidth"): True,
        ("pressure_input", "noise_density"): False,
        ("wake_comparator", "bandwidth"): False,
    }


@pytest.mark.parametrize(
    ("sheet", "status", "targets"),
    [("converter_driver", 1, {"unity_gain_frequency", "supply_current"}), ("pressure_input", 0, None)],
)
def test_one_miss_is_a_conflict_and_the_other_can_be_put_right(
    sheet: str, status: int, targets: set[str] | None
) -> None:
    done = run("solve", str(SAMPLE / "sheets" / f"{sheet}.toml"), "--json")
    assert done.status == status, done.err
    conflict = json.loads(done.out)["conflict"]
    assert (None if conflict is None else set(conflict["targets"])) == targets


def test_it_uses_what_there_is_to_use() -> None:
    project = load(SAMPLE)
    sheets = project.sheets.values()
    assert {sheet.stage for sheet in sheets} == set(catalogue.keys())
    assert {sheet.bulk for sheet in sheets} == {"rail", "source"}
    assert {sheet.bias.ideal for sheet in sheets} == {True, False}
    assert project.process is not None
    assert {project.process.devices[sheet.device].polarity for sheet in sheets} == {"n", "p"}
    assert any(sheet.count > 1 for sheet in sheets)
    assert any(v.propose for sheet in sheets for v in sheet.choose.values())
    assert any(v.low is not None for sheet in sheets for v in sheet.assume.values())
    assert all(sheet.owner for sheet in sheets)
    assert any(target.formula for sheet in sheets for target in sheet.targets.values())
    links = [n for sheet in sheets for v in sheet.assume.values() if v.formula for n in v.formula.names if "." in n]
    assert len(links) >= 4


def _process() -> Process:
    process = load(SAMPLE).process
    assert process is not None
    return process


def test_its_process_numbers_fit_each_other() -> None:
    """C_ox = 3.9 eps_0/t_ox (parallel plates, SiO2), I_sq = 2 n mu C_ox U_T^2 (Enz, Krummenacher, Vittoz 1995);
    constants of CODATA 2018. Oxide and mobilities are those that the file's own comments state."""
    text = (SAMPLE / "process" / "quay_180.toml").read_text("utf-8")
    oxide = _stated(text, r"Gate oxide ([\d.]+) nm") * 1e-9
    mobility = {p: _stated(text, rf"{p}-channel: .*mu = +(\d+) cm\^2/Vs") * 1e-4 for p in ("n", "p")}
    process = _process()
    thermal = 1.380649e-23 * process.reference_temperature / 1.602176634e-19
    for device in process.devices.values():
        capacitance = device.number("gate_capacitance")
        assert capacitance == pytest.approx(3.9 * 8.8541878128e-12 / oxide, rel=5e-3)
        expected = 2 / device.number("kappa") * mobility[device.polarity] * capacitance * thermal**2
        assert device.number("specific_current") == pytest.approx(expected, rel=5e-3)
        assert device.number("matching_threshold") == pytest.approx(1e-3 * 1e-6 * oxide * 1e9, rel=0.1)


def _stated(text: str, pattern: str) -> float:
    found = re.search(pattern, text)
    assert found is not None, pattern
    return float(found[1])


def test_its_corners_move_every_device_and_two_of_them_are_mixed() -> None:
    process = _process()
    shifts = {
        corner: {name: changes["threshold_shift"] for name, changes in devices.items()}
        for corner, devices in process.corners.items()
        if devices
    }
    assert all(set(of_corner) == set(process.devices) for of_corner in shifts.values())
    signs = {c: (math.copysign(1, s["nfet"]), math.copysign(1, s["pfet"])) for c, s in shifts.items()}
    assert set(signs.values()) == {(1, 1), (-1, -1), (1, -1), (-1, 1)}


def test_demo_copies_it_and_prints_its_review(tmp_path: Path) -> None:
    folder = tmp_path / "copy"
    done = run("demo", str(folder))
    assert done.status == 0
    assert str(folder) in done.out
    assert "Tide gauge readout: 7 blocks" in done.out
    for path in SAMPLE.rglob("*.*"):
        assert (folder / path.relative_to(SAMPLE)).read_bytes() == path.read_bytes()
    assert run("review", str(folder)).out in done.out


def test_demo_makes_a_folder_of_its_own(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr("tempfile.tempdir", str(tmp_path))
    done = run("demo")
    (folder,) = tmp_path.iterdir()
    assert done.status == 0
    assert str(folder) in done.out
    assert Workbook.read(folder).project.problems == ()


def test_demo_leaves_what_is_there_alone(tmp_path: Path) -> None:
    (tmp_path / "mine.txt").write_text("mine", encoding="utf-8")
    done = run("demo", str(tmp_path))
    assert done.status == 2
    assert "not empty" in done.err
    assert [path.name for path in tmp_path.iterdir()] == ["mine.txt"]
    assert run("demo", str(tmp_path / "mine.txt")).status == 2
    assert run("start", str(tmp_path)).status == 2
    assert [path.name for path in tmp_path.iterdir()] == ["mine.txt"]
