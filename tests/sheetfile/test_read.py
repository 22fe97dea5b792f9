"""What is read from the three kinds of file, value by value."""

import datetime
import math
from pathlib import Path

import pytest

from tests.sheetfile.texts import PROCESS, PROJECT, SHEET, line_of, written
from worksheet.model import metrics
from worksheet.model.sheet import Condition
from worksheet.sheetfile.read import (
    parse_process,
    parse_project,
    parse_sheet,
    read_process,
    read_project,
    read_sheet,
)


def test_sheet_is_read_whole(tmp_path: Path) -> None:
    sheet, problems = read_sheet(written(tmp_path, "buffer.toml", SHEET), shown="sheets/buffer.toml")
    assert problems == []
    assert sheet is not None
    assert (sheet.name, sheet.file, sheet.stage, sheet.device) == (
        "buffer",
        "sheets/buffer.toml",
        "source-follower",
        "nfet",
    )
    assert (sheet.count, sheet.state, sheet.owner) == (64, "draft", "R. Osei")
    assert sheet.notes == "Drives the column line.\nSecond line.\n"
    assert sheet.bias.ideal
    assert sheet.bias.values["capacitance"].number == 0.0
    load = sheet.assume["load_capacitance"]
    assert (load.number, load.low, load.high) == (1.2e-12, 0.9e-12, 1.6e-12)
    assert (load.source, load.trust, load.text) == ("floor plan", "estimate", "1.2 pF")
    assert load.line == line_of(SHEET, "load_capacitance")
    step = sheet.assume["step_size"]
    assert step.number is None
    assert step.formula is not None
    assert step.formula.names == ("own_step",)
    assert sheet.assume["supply"].numbers == (1.1, 1.2)
    assert (sheet.own["sample_rate"].number, sheet.own["sample_rate"].unit) == (4e4, "kHz")
    assert sheet.own["own_step"].unit == ""
    assert sheet.choose["bias_current"].number == 4e-6
    assert dict(sheet.fingers) == {"main": 4}
    assert (sheet.solve.keep, sheet.solve.inversion_coefficient) == ("geometry", 1.0)
    target = sheet.targets["bandwidth"]
    assert (target.minimum, target.maximum, target.guard, target.id) == (5e6, None, 0.1, "AFE-12")
    assert sheet.targets["output_noise"].at == "nominal"
    assert sheet.targets["offset_limit"].yield_fraction == 0.997
    assert sheet.targets["figure"].unit == "Hz/W"
    found, measured = sheet.evidence
    assert found.value == 5.6e6
    assert found.dated == datetime.date(2026, 11, 2)
    assert found.at == Condition("slow", 398.15, 1.62)
    assert (measured.low, measured.spread, measured.samples) == (1e11, 1e9, 30)
    (waiver,) = sheet.waivers
    assert (waiver.value, waiver.until) == (4e6, datetime.date(2027, 1, 31))
    assert sheet.lines["target.bandwidth.guard"] == line_of(SHEET, "bandwidth = {")
    assert sheet.lines["evidence.1.spread"] == line_of(SHEET, "spread =")


def test_process_is_read_whole(tmp_path: Path) -> None:
    process, problems = read_process(written(tmp_path, "example_180.toml", PROCESS), shown="process/example_180.toml")
    assert problems == []
    assert process is not None
    assert process.reference_temperature == 300.15
    device = process.devices["nfet"]
    assert (device.polarity, device.own_well) == ("n", False)
    assert device.number("kappa") == 0.7
    assert device.values["kappa"].standard_error == 0.002
    assert device.number("matching_factor") == 1e-8
    assert device.number("gate_capacitance") == 8.5e-3
    # What may be left out is off (contract: velocity_length, surface_potential, length_modulation).
    assert [device.number(key) for key in ("velocity_length", "surface_potential")] == [0.0, 0.0]
    assert process.corners["typical"] == {}
    assert process.corners["slow"]["nfet"] == {"threshold_shift": 0.04, "specific_current_factor": 0.85}


def test_project_is_read_whole(tmp_path: Path) -> None:
    project, problems = read_project(written(tmp_path, "biasbook.toml", PROJECT), shown="biasbook.toml")
    assert problems == []
    assert project is not None
    assert project.process == "example_180"
    assert project.processes == ("typical", "slow")
    assert project.temperatures == (233.15, 300.15)
    assert project.supplies == (1.8,)
    assert project.nominal == Condition("typical", 300.15, 1.8)
    assert project.budgets["gate_area"] == pytest.approx(2e-8, rel=1e-15)
    assert project.lines["conditions.temperature.1"] == line_of(PROJECT, '"27 °C",\n]')


def test_least_sheet_takes_the_defaults() -> None:
    text = (
        'schema = 1\nstage = "common-source"\ndevice = "pfet"\n'
        '[assume]\nload_capacitance = "0 F"\n[target.offset_limit]\nmax = "1 mV"\n'
    )
    sheet, problems = parse_sheet(text, "least", "least.toml")
    assert problems == []
    assert sheet is not None
    assert (sheet.bulk, sheet.count, sheet.state, sheet.bias.device) == ("rail", 1, "draft", "ideal")
    assert (sheet.solve.over, sheet.solve.current_allowance) == ("all", 0.05)
    assert sheet.targets["offset_limit"].yield_fraction == metrics.DEFAULT_YIELD
    assert sheet.targets["offset_limit"].line == 6


def test_proposals_stand_in_choose_alone() -> None:
    text = SHEET.replace('bias_current = "4 uA"', 'bias_current = { value = "propose", note = "least" }')
    sheet, problems = parse_sheet(text.replace('"20 um"', '"propose"'), "s", "s.toml")
    assert problems == []
    assert sheet is not None
    assert sheet.choose["width"].propose
    assert sheet.choose["width"].number is None
    assert (sheet.choose["bias_current"].propose, sheet.choose["bias_current"].note) == (True, "least")


def test_floats_keep_how_they_were_typed() -> None:
    sheet, _ = parse_sheet(SHEET.replace("own_step = 0.1", "own_step = 1e-1"), "s", "s.toml")
    assert sheet is not None
    assert sheet.own["own_step"].text == "1e-1"
    assert type(sheet.own["own_step"].number) is float


def test_decibels_are_a_gain() -> None:
    sheet, _ = parse_sheet(SHEET.replace("min = 0.65, max = 1.0", 'min = "-6 dB", max = "0 dB"'), "s", "s.toml")
    assert sheet is not None
    assert sheet.targets["dc_gain"].minimum == pytest.approx(math.pow(10.0, -0.3), rel=1e-15)
    assert sheet.targets["dc_gain"].maximum == 1.0


def test_own_ranges_take_the_unit_of_their_value() -> None:
    text = SHEET.replace('{ value = "40 kHz", trust', '{ value = "40 kHz", low = "0.03 MHz", high = 5e4, trust')
    sheet, problems = parse_sheet(text, "s", "s.toml")
    assert problems == []
    assert sheet is not None
    assert (sheet.own["sample_rate"].low, sheet.own["sample_rate"].high) == (3e4, 5e4)


@pytest.mark.parametrize("mark", ["", "\ufeff"])
@pytest.mark.parametrize("end", ["\n", "\r\n"])
def test_byte_order_mark_and_line_ends_do_not_matter(mark: str, end: str) -> None:
    content = (mark + SHEET.replace("\n", end)).encode()
    plain, _ = parse_sheet(SHEET, "s", "s.toml")
    sheet, problems = parse_sheet(content, "s", "s.toml")
    assert problems == []
    assert sheet == plain
    assert sheet is not None
    assert plain is not None
    assert sheet.lines == plain.lines


def test_text_fields_keep_what_was_written() -> None:
    hostile = r"\u001b[31m [b]bold[/b] [/x] \u202eabc \u0007"
    text = SHEET.replace('title = "Element buffer"', f'title = "{hostile}"')
    sheet, problems = parse_sheet(text, "s", "s.toml")
    assert problems == []
    assert sheet is not None
    assert sheet.title == "\x1b[31m [b]bold[/b] [/x] \u202eabc \x07"


def test_a_value_in_a_table_of_its_own_is_read_alike() -> None:
    inline = 'input_level = { value = "0.9 V", source = "sensor", trust = "agreed" }\n'
    text = SHEET.replace(inline, "").replace(
        "[own]", '[assume.input_level]\nvalue = "0.9 V"\nsource = "sensor"\ntrust = "agreed"\n\n[own]'
    )
    plain, _ = parse_sheet(SHEET, "s", "s.toml")
    sheet, problems = parse_sheet(text, "s", "s.toml")
    assert problems == []
    assert sheet == plain


def test_a_metric_registered_later_is_a_target_and_a_budget() -> None:
    power = metrics.find("power")
    assert power is not None
    metrics.register(metrics.Metric("heat", "Heat", "Q", power.dimension, "Same as power.", power.rule, additive=True))
    try:
        sheet, problems = parse_sheet(SHEET.replace("[target]", '[target]\nheat = { max = "1 mW" }'), "s", "s.toml")
        assert problems == []
        assert sheet is not None
        assert sheet.targets["heat"].maximum == 1e-3
        project, problems = parse_project(PROJECT + 'heat = { max = "2 mW" }\n', "biasbook.toml")
        assert problems == []
        assert project is not None
        assert project.budgets["heat"] == 2e-3
    finally:
        metrics.withdraw("heat")


def test_process_names_come_from_the_file() -> None:
    process, problems = parse_process(PROCESS, "../up", "x.toml")
    assert process is None
    assert "../up" in problems[0].message
