"""Yields and what a variance is made of against closed forms of the normal law, and the same however counted."""

from __future__ import annotations

import json
import math
from pathlib import Path

import numpy as np
import pytest

from tests.cli.books import PROJECT
from tests.documents import Document
from tests.support import run, write_project
from worksheet.review import yields
from worksheet.session.workbook import Workbook

DEVICE = """\
own_well = true
kappa = {kappa}
threshold = 0.45
specific_current = {specific}
drain_coupling = 0.02
drain_coupling_length = 1.8e-7
drain_coupling_exponent = 1.0
gate_capacitance = 8.5e-3
overlap_capacitance = 3.5e-10
junction_capacitance = 8e-10
flicker = 0
flicker_exponent = 1.0
matching_threshold = {matching_threshold}
matching_factor = {matching_factor}
threshold_drift = 8e-4
mobility_exponent = 1.5
min_length = 1.8e-7
max_length = 5e-5
min_width = 2.2e-7
max_width = 1e-2
grid = 5e-9
max_voltage = 5.0
"""

SHEET = """\
schema = 1
title = "Counted"
stage = "{stage}"
device = "nfet"

[bias]
device = "{bias}"

[choose]
load_capacitance = 1e-12
bias_current = 4e-6
width = 2e-5
length = 5e-7
{sizes}

[target]
{targets}
"""

SIZES = "bias_width = 4e-6\nbias_length = 1e-6"
AREA = 4e-12
COUNT = 20_000


def book(
    folder: Path,
    targets: str,
    *,
    stage: str = "source-follower",
    bias: str = "nfet",
    kappa: str = "0.7",
    specific: str = "6e-7",
    matching_threshold: float = 4e-9,
    matching_factor: float = 1e-8,
) -> Path:
    device = DEVICE.format(
        kappa=kappa, specific=specific, matching_threshold=matching_threshold, matching_factor=matching_factor
    )
    plain = DEVICE.format(kappa="0.7", specific="6e-7", matching_threshold=4e-9, matching_factor=1e-8)
    process = f"""schema = 1
title = "Counted"
reference_temperature = 300.15

[device.nfet]
polarity = "n"
{device}
[device.pfet]
polarity = "p"
{plain}
[corner.slow.nfet]
threshold_shift = 0.04
"""
    sheet = SHEET.format(stage=stage, bias=bias, sizes=SIZES if bias != "ideal" else "", targets=targets)
    return write_project(folder, PROJECT, process, {"counted": sheet})


def counted(folder: Path, *more: str, samples: int = COUNT) -> dict[str, Document]:
    (sheet,) = json.loads(run("review", str(folder), "--json", "--samples", str(samples), *more).out)["sheets"]
    return {target["metric"]: target for target in sheet["targets"]} | {"": sheet}


def normal(z: float) -> float:
    """Share of a normal law below z standard deviations. Source: its definition by the error function (DLMF 7.2)."""
    return 0.5 * (1.0 + math.erf(z / math.sqrt(2.0)))


def agrees(target: Document, share: float) -> bool:
    """Within four standard deviations of a count."""
    return bool(abs(target["yield"] - share) <= 4.0 * math.sqrt(share * (1 - share) / COUNT))


@pytest.mark.parametrize("z", [-1.5, 0.0, 0.7, 2.0])
def test_a_current_factor_moves_the_supply_current_in_proportion(z: float, tmp_path: Path) -> None:
    """Without threshold mismatch the current is I (1 + d), sd(d) = A_beta/sqrt(2 W L): linear, so the law is exact."""
    deviation = 1e-8 / math.sqrt(2 * AREA)
    limit = 4e-6 * (1 + z * deviation)
    folder = book(tmp_path, f"supply_current = {{ max = {limit!r} }}", matching_threshold=0.0)
    target = counted(folder)["supply_current"]
    assert agrees(target, normal(z))
    assert target["yield_low"] <= target["yield"] <= target["yield_high"]
    assert target["variance"] == [{"of": "bias", "share": 1.0}, {"of": "main", "share": 0.0}]


@pytest.mark.parametrize("z", [-1.0, 0.5, 1.8])
def test_a_stated_standard_error_moves_the_gain_in_proportion(z: float, tmp_path: Path) -> None:
    """The gain of a source follower under an ideal source is kappa: its spread is the standard error of kappa."""
    limit = 0.7 + z * 0.004
    targets = f"dc_gain = {{ max = {limit!r} }}\nslew_rate = {{ min = 1e5 }}"
    folder = book(tmp_path, targets, bias="ideal", kappa="{ value = 0.7, standard_error = 0.004 }")
    found = counted(folder)
    assert agrees(found["dc_gain"], normal(z))
    parts = {part["of"]: part["share"] for part in found["dc_gain"]["variance"]}
    assert parts == pytest.approx({"process.nfet.kappa": 1.0, "main": 0.0}, abs=1e-12)
    assert found[""]["yield"] == found["dc_gain"]["yield"]


def test_what_a_sheet_says_of_its_own_assumptions_is_no_spread(tmp_path: Path) -> None:
    folder = book(tmp_path, "slew_rate = { min = 1e5 }", bias="ideal")
    path = folder / "sheets/counted.toml"
    text = path.read_text("utf-8").replace("load_capacitance = 1e-12\n", "")
    path.write_text(
        text.replace("[choose]", "[assume]\nload_capacitance = { value = 1e-12, standard_error = 5e-13 }\n\n[choose]"),
        "utf-8",
    )
    assert not any(part["of"].startswith("assume") for part in counted(folder, samples=100)["slew_rate"]["variance"])


def test_a_threshold_moves_the_current_by_the_device_law(tmp_path: Path) -> None:
    """In weak inversion I = I_0 exp(-kappa dV/U_T): lognormal, so its logarithm is normal."""
    thermal = 1.380649e-23 * 300.15 / 1.602176634e-19
    deviation = 0.7 / thermal * 4e-9 / math.sqrt(2 * AREA)
    limit = 4e-6 * math.exp(0.8 * deviation)
    folder = book(tmp_path, f"supply_current = {{ max = {limit!r} }}", specific="6e-3", matching_factor=0.0)
    assert agrees(counted(folder)["supply_current"], normal(0.8))


def test_shares_of_the_offset_are_those_of_pelgrom_s_law(tmp_path: Path) -> None:
    """Two devices of a common source: the bias device's share by the ratio of transconductances and areas."""
    folder = book(tmp_path, "offset_limit = { max = 0.01 }", stage="common-source", bias="pfet")
    found = counted(folder, samples=100)
    points = found[""]["operating_point"]
    parts = {}
    for name, area in (("main", 1e-11), ("bias", AREA)):
        parts[name] = ((points[name]["transconductance"] * 4e-9) ** 2 + (4e-6 * 1e-8) ** 2) / (2 * area)
    total = sum(parts.values())
    assert {p["of"]: p["share"] for p in found["offset_limit"]["variance"]} == pytest.approx(
        {name: part / total for name, part in parts.items()}
    )
    offset = math.sqrt(total) / points["main"]["transconductance"]
    assert found["offset_limit"]["yield"] == pytest.approx(2 * normal(0.01 / offset) - 1, rel=1e-9)


def test_shares_are_those_of_the_samples_own_variance(tmp_path: Path) -> None:
    """Of the spread of many samples, each part alone: half of it and more comes from the bias device."""
    folder = book(tmp_path, "bandwidth = { min = 1e6 }", kappa="{ value = 0.7, standard_error = 0.02 }")
    shares = {part["of"]: part["share"] for part in counted(folder, samples=100)["bandwidth"]["variance"]}
    assert sum(shares.values()) == pytest.approx(1.0)
    workbook = Workbook.read(folder)
    assert workbook.evaluator is not None
    case = workbook.evaluator.over("counted", workbook.evaluator.case("counted").conditions.only_nominal())
    spreads = yields.spreads_of(case)
    draws = yields.draws(len(spreads), COUNT, 0)
    variances: dict[str, float] = {}
    for owner in dict.fromkeys(spread.owner for spread in spreads):
        mine = np.array([spread.owner == owner for spread in spreads])[:, None]
        moved = yields.deviated(case, spreads, np.where(mine, draws, 0.0))
        variances[owner] = float(np.var(moved.solution["bandwidth"]))
    total = sum(variances.values())
    for owner, variance in variances.items():
        assert shares.get(owner, 0.0) == pytest.approx(variance / total, abs=0.03)


def test_samples_are_the_same_whatever_the_size_of_the_parts(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """As if they were shared out among more or fewer workers."""
    targets = "bandwidth = { min = 2e7 }\ndc_gain = { min = 0.69 }"
    folder = book(tmp_path, targets, kappa="{ value = 0.7, standard_error = 0.02 }")
    whole = counted(folder, "--seed", "7", samples=5_000)
    for part in (1_000, 333):
        monkeypatch.setattr(yields, "_PART", part)
        assert counted(folder, "--seed", "7", samples=5_000) == whole


def test_the_numbers_of_a_seed_are_written_down() -> None:
    """PCG64 and numpy's normal law promise a stream to a seed; these were drawn once and hold on every machine."""
    written = [[0.12573022, -0.13210486, 0.64042265], [0.10490012, -0.53566937, 0.36159505]]
    assert yields.draws(2, 3, 0) == pytest.approx(np.array(written), abs=5e-9)
