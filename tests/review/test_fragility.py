"""Break values put back, sensitivities against closed forms, yields against the normal law and each other."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from tests.support import run
from worksheet.review.yields import wilson

EDITED = {
    "assume.load_capacitance": ('value = "1.2 pF"', "value = {!r}"),
    "choose.bias_current": ('bias_current = "4 uA"', "bias_current = {!r}"),
    "choose.width": ('width = "20 um"', "width = {!r}"),
    "choose.length": ('length = "0.5 um"', "length = {!r}"),
}


@pytest.fixture
def project(tmp_path: Path) -> Path:
    """A new project whose sheet has targets of several kinds, at the nominal condition."""
    folder = tmp_path / "book"
    assert run("start", str(folder)).status == 0
    sheet = folder / "sheets/first_block.toml"
    text = sheet.read_text(encoding="utf-8")
    targets = (
        'bandwidth = { min = "15 MHz", at = "nominal" }\n'
        'output_noise = { max = "80 uV", at = "nominal" }\n'
        'offset_limit = { max = "4 mV", at = "nominal" }\n'
        'dc_gain = { min = 0.65, at = "nominal" }\n'
    )
    sheet.write_text(text[: text.index("bandwidth = ")] + targets, encoding="utf-8")
    return folder


def reviewed(folder: Path, *more: str) -> dict[str, Any]:
    (sheet,) = json.loads(run("review", str(folder), "--json", *more).out)["sheets"]
    assert isinstance(sheet, dict)
    return sheet


def test_break_values_put_back_make_the_target_just_met(project: Path) -> None:
    rows = reviewed(project, "--fragile")["fragile"]
    path = project / "sheets/first_block.toml"
    original = path.read_text(encoding="utf-8")
    checked = 0
    for row in rows:
        if row["name"] not in EDITED or row["break_value"] is None:
            continue
        old, new = EDITED[row["name"]]
        assert old in original
        path.write_text(original.replace(old, new.format(row["break_value"])), encoding="utf-8")
        target = next(t for t in reviewed(project)["targets"] if t["metric"] == row["target"])
        assert target["margin"] == pytest.approx(0.0, abs=1e-6), row
        assert row["room"] == pytest.approx(abs(row["break_value"] - row["value"]) / row["value"])
        checked += 1
    assert checked >= 5


def test_sensitivities_of_closed_forms(project: Path) -> None:
    """Gain is kappa; the offset of a device alone falls as the root of its area, by the threshold's share."""
    rows = {(r["target"], r["name"]): r["sensitivity"] for r in reviewed(project, "--fragile")["fragile"]}
    assert rows["dc_gain", "process.nfet.kappa"] == pytest.approx(1.0, abs=1e-6)
    assert rows["offset_limit", "choose.width"] < 0
    assert ("dc_gain", "choose.width") not in rows


def test_rows_come_least_room_first_and_zeros_are_listed(project: Path) -> None:
    sheet = reviewed(project, "--fragile")
    rooms = [row["room"] for row in sheet["fragile"] if row["room"] is not None]
    assert rooms == sorted(rooms)
    assert "assume.drive_resistance" in sheet["not_ranked"]
    assert "process.nfet.length_modulation" in sheet["not_ranked"]


def test_yield_of_the_offset_is_the_normal_law(project: Path) -> None:
    sheet = reviewed(project, "--samples", "500")
    target = next(t for t in sheet["targets"] if t["metric"] == "offset_limit")
    sd = sheet["metrics"]["offset"]["value"]
    from scipy.stats import norm

    assert target["yield"] == pytest.approx(norm.cdf(4e-3 / sd) - norm.cdf(-4e-3 / sd), rel=1e-9)


def test_yield_is_the_same_from_the_same_seed(project: Path) -> None:
    first, again, other = (reviewed(project, "--samples", "3000", "--seed", s) for s in ("4", "4", "5"))
    assert [t["yield"] for t in first["targets"]] == [t["yield"] for t in again["targets"]]
    assert first["yield_low"] <= first["yield"] <= first["yield_high"]
    assert first["yield_low"] <= other["yield"] + 0.02


def test_yield_of_a_limit_at_the_intended_value_is_about_a_half(project: Path) -> None:
    """Bandwidth moves with the specific current's mismatch alone, evenly to both sides to first order."""
    sheet = reviewed(project)
    value = sheet["metrics"]["bandwidth"]["value"]
    path = project / "sheets/first_block.toml"
    text = path.read_text(encoding="utf-8").replace('min = "15 MHz"', f"min = {value!r}")
    path.write_text(text, encoding="utf-8")
    target = next(t for t in reviewed(project, "--samples", "4000")["targets"] if t["metric"] == "bandwidth")
    assert target["yield"] == pytest.approx(0.5, abs=0.03)


def test_wilson_s_interval_of_a_worked_example() -> None:
    """Recomputed from Wilson 1927 in its solved form: the roots of (p - share)^2 = z^2 p (1 - p)/n."""
    found = wilson(81, 263)
    z, share, n = 1.959963984540054, 81 / 263, 263
    roots = np.roots([1 + z * z / n, -(2 * share + z * z / n), share * share])
    assert [found.low, found.high] == pytest.approx(sorted(roots.real), rel=1e-9)
