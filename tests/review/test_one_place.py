"""A stage and a metric are each described in one place: entered inside a test, every command knows them."""

from __future__ import annotations

import json
from collections.abc import Iterator
from pathlib import Path

import pytest

from tests.support import run
from worksheet.model import dimension as dim
from worksheet.model import metrics
from worksheet.model.metrics import Metric
from worksheet.stages import catalogue
from worksheet.stages.stage import GROUND, IN, LINE, OUT, Stage, Transistor

TALL = Stage(
    key="tall-stack",
    title="Tall stack",
    purpose="A common source under two common gates.",
    transistors=(
        Transistor("main", gate=IN, drain="first", source=GROUND),
        Transistor("lower", gate=LINE, drain="second", source="first"),
        Transistor("upper", gate=LINE, drain=OUT, source="second"),
    ),
    levels=("output_level",),
)

PRODUCT = Metric(
    "gain_bandwidth",
    "Gain-bandwidth product",
    "GBW",
    dim.FREQUENCY,
    "DC gain times bandwidth.",
    lambda s: s["dc_gain"] * s["bandwidth"],
    "high",
    relation="A_0 f_3dB",
)

SHEET = """
schema = 1
stage = "{stage}"
device = "nfet"
[bias]
device = "pfet"
[assume]
load_capacitance = "1 pF"
[choose]
bias_current = "2 uA"
width = "20 um"
length = "0.5 um"
{sizes}bias_width = "4 um"
bias_length = "1 um"
[target]
dc_gain = {{ min = 50 }}
bandwidth = {{ min = "1 kHz" }}
output_noise = {{ max = "1 V" }}
"""
SIZES = 'lower_width = "20 um"\nlower_length = "0.5 um"\nupper_width = "20 um"\nupper_length = "0.5 um"\n'


@pytest.fixture
def tall() -> Iterator[None]:
    """The stage is known while a test runs."""
    catalogue.register(TALL)
    yield
    catalogue.withdraw(TALL.key)


@pytest.fixture
def product() -> Iterator[None]:
    """The metric is known while a test runs."""
    metrics.register(PRODUCT)
    yield
    metrics.withdraw(PRODUCT.key)


def book(folder: Path, text: str) -> Path:
    """A new project whose one sheet says `text`."""
    assert run("start", str(folder)).status == 0
    sheet = folder / "sheets/first_block.toml"
    sheet.write_text(text, encoding="utf-8")
    return sheet


@pytest.mark.full
@pytest.mark.usefixtures("tall")
def test_a_sixth_stage_is_reviewed_solved_and_listed(tmp_path: Path) -> None:
    sheet = book(tmp_path / "book", SHEET.format(stage=TALL.key, sizes=SIZES))
    document = json.loads(run("review", str(tmp_path / "book"), "--json").out)
    assert document["problems"] == []
    (reviewed,) = document["sheets"]
    assert list(reviewed["operating_point"]) == ["main", "lower", "upper", "bias"]
    assert all(
        reviewed["metrics"][key]["value"] is not None for key in ("dc_gain", "bandwidth", "output_noise", "power")
    )
    assert reviewed["metrics"]["gate_area"]["value"] == pytest.approx(3 * 20e-6 * 0.5e-6 + 4e-6 * 1e-6)
    low = reviewed["metrics"]["output_low"]["value"]
    saturation = [reviewed["operating_point"][d]["saturation_voltage"] for d in ("main", "lower", "upper")]
    assert low == pytest.approx(sum(saturation))
    solved = json.loads(run("solve", str(sheet), "--json").out)
    assert {"bias_current", "lower_width", "upper_length"} & set(solved["needed"]) >= {"bias_current"}
    listed = json.loads(run("stages", "--json").out)["stages"]
    assert listed[-1]["stage"] == TALL.key
    assert "upper_width" in listed[-1]["design"]
    assert "lower_width" in run("stages", TALL.key).out


@pytest.mark.usefixtures("tall")
def test_a_sixth_stage_refuses_what_it_does_not_take(tmp_path: Path) -> None:
    text = SHEET.format(stage=TALL.key, sizes=SIZES).replace("[choose]", 'input_level = "0.4 V"\n[choose]')
    book(tmp_path / "book", text)
    done = run("review", str(tmp_path / "book"))
    assert done.status == 2
    assert "input_level" in done.err


@pytest.mark.full
@pytest.mark.usefixtures("product")
def test_a_new_metric_is_a_target_a_name_and_a_row(tmp_path: Path) -> None:
    text = SHEET.format(stage="common-source", sizes="")
    text += (
        'gain_bandwidth = { min = "1 MHz" }\nfigure = { formula = "gain_bandwidth/power", min = 1, unit = "Hz/W" }\n'
    )
    sheet = book(tmp_path / "book", text)
    (reviewed,) = json.loads(run("review", str(tmp_path / "book"), "--json").out)["sheets"]
    values = {key: entry["value"] for key, entry in reviewed["metrics"].items()}
    assert values["gain_bandwidth"] == pytest.approx(values["dc_gain"] * values["bandwidth"], rel=1e-12)
    figure = next(t for t in reviewed["targets"] if t["metric"] == "figure")
    assert figure["nominal"] == pytest.approx(values["gain_bandwidth"] / values["power"], rel=1e-12)
    assert "gain_bandwidth" in run("stages", "common-source").out
    solved = json.loads(run("solve", str(sheet), "--json").out)
    assert any(b["target"] == "gain_bandwidth" for b in solved["needed"]["bias_current"]["bounds"])
