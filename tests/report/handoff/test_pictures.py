"""Pictures show what the numbers say: read back as XML, and what they are drawn from is held against the metrics."""

from __future__ import annotations

import base64
import json
from hashlib import sha256
from pathlib import Path
from typing import Any
from xml.etree import ElementTree

import numpy as np
import pytest

from tests.cli.books import PROCESS
from tests.report.handoff.reading import Page
from tests.support import run
from worksheet.extract import curves
from worksheet.extract.law import Reference
from worksheet.model.sheet import Process
from worksheet.report import wording
from worksheet.report.handoff import pictures
from worksheet.review.pictured import margins, response
from worksheet.review.review import solve
from worksheet.session.handoff_fits import fits_of
from worksheet.session.workbook import Workbook
from worksheet.sheetfile.read import parse_process

SVG = "{http://www.w3.org/2000/svg}"


@pytest.fixture(scope="module")
def sheets(sample: Path) -> list[dict[str, Any]]:
    document = json.loads(run("review", str(sample), "--json").out)
    found: list[dict[str, Any]] = document["sheets"]
    return found


@pytest.fixture(scope="module")
def book(sample: Path) -> Workbook:
    return Workbook.read(sample)


def _pictures(page: Page) -> list[tuple[str, ElementTree.Element]]:
    """Every picture: what is said of it, and its drawing."""
    found = []
    for picture in page.named("img"):
        data = (picture["src"] or "").partition("base64,")[2]
        found.append((picture["alt"] or "", ElementTree.fromstring(base64.b64decode(data))))
    return found


def test_a_drawing_names_every_device_its_sizes_and_what_flows(page: Page, sheets: list[dict[str, Any]]) -> None:
    drawings = [(alt, tree) for alt, tree in _pictures(page) if "top to bottom" in alt]
    assert len(drawings) == len(sheets)
    for sheet, (alt, tree) in zip(sheets, drawings, strict=True):
        shown = ["".join(text.itertext()) for text in tree.iter(f"{SVG}text")]
        assert any(text.startswith(("V_DD", "ground")) for text in shown)
        assert any(text.startswith("out ") and "drives" in text for text in shown)
        for device, point in sheet["operating_point"].items():
            assert any(text.startswith(f"{device} (") for text in shown), (sheet["sheet"], device)
            flows = f"{wording.number(point['current'], 'A', digits=3)}, IC {point['inversion_coefficient']:.3g}"
            assert any(text.startswith(flows) for text in shown)
            assert flows in alt
            size = f"W {wording.number(point['width'], 'm')} L {wording.number(point['length'], 'm')}"
            assert any(text.startswith(size) for text in shown)


def test_drawn_things_stay_within_the_picture(page: Page) -> None:
    for alt, tree in _pictures(page):
        if "top to bottom" not in alt:
            continue
        width, height = (float(tree.attrib[key]) for key in ("width", "height"))
        for line in tree.iter(f"{SVG}line"):
            assert 0 <= float(line.attrib["x1"]) <= width
            assert 0 <= float(line.attrib["y2"]) <= height
        for text in tree.iter(f"{SVG}text"):
            place = float(text.attrib["x"])
            reach = 7.5 * len("".join(text.itertext()))
            assert place - reach >= 0 if text.get("text-anchor") == "end" else place + reach <= width


def test_pictures_hold_nothing_that_acts(page: Page) -> None:
    for _, tree in _pictures(page):
        for element in tree.iter():
            assert element.tag.rpartition("}")[2] not in ("script", "foreignObject", "image", "a", "iframe", "set")
            for key, value in element.attrib.items():
                assert not key.lower().startswith("on")
                assert "href" not in key or value.startswith("#")


def test_margins_in_words_are_those_of_the_review(page: Page, sheets: list[dict[str, Any]]) -> None:
    said = [alt for alt, _ in _pictures(page) if alt.startswith("Margins of")]
    assert len(said) == len(sheets)
    for sheet, alt in zip(sheets, said, strict=True):
        for target in sheet["targets"]:
            assert f"{target['metric']} {wording.margin(target['margin'])}" in alt


def test_margins_are_drawn_from_the_margin_of_every_condition(book: Workbook, sheets: list[dict[str, Any]]) -> None:
    assert book.evaluator is not None
    for sheet in sheets:
        points, _ = solve(book.evaluator, sheet["sheet"])
        assert points is not None
        drawn = margins(points)
        for target in sheet["targets"]:
            values = drawn.by_target[target["metric"]]
            assert len(values) in (1, len(drawn.conditions))
            assert float(np.nanmin(values)) == pytest.approx(target["margin"], rel=1e-9)


def test_a_response_falls_by_half_the_power_at_the_bandwidth(book: Workbook, sheets: list[dict[str, Any]]) -> None:
    assert book.evaluator is not None
    held = 0
    for sheet in sheets:
        points, _ = solve(book.evaluator, sheet["sheet"])
        assert points is not None
        found = response(points)
        assert found is not None
        gain, bandwidth = (sheet["metrics"][key]["value"] for key in ("dc_gain", "bandwidth"))
        assert found.magnitude[0, 0] == pytest.approx(abs(gain), rel=0.01)
        if bandwidth is not None:
            there = np.exp(np.interp(np.log(bandwidth), np.log(found.frequency), np.log(found.magnitude[0])))
            assert there == pytest.approx(abs(gain) / np.sqrt(2.0), rel=0.01)
            held += 1
    assert held >= 5


FITTED = """
[fitted.nfet]
inversion_low = 0.001
inversion_high = 30
drain_voltage_high = "1.2 V"
length_high = "2 um"
rms_log_error = 0.01
dated = 2026-05-04
files = "nfet.csv"
digest = "{digest}"
"""


def _process(text: str) -> Process:
    found, problems = parse_process(text.encode(), "plain_180", "process/plain_180.toml")
    assert not problems
    assert found is not None
    return found


def _table(process: Process, offset: float) -> str:
    """A table of the device's own currents, times exp(offset)."""
    numbers = {key: one.number for key, one in process.devices["nfet"].values.items() if one.number is not None}
    reference = Reference(process.reference_temperature, numbers["drain_coupling_length"])
    gate = np.linspace(0.2, 1.2, 21).tolist()
    rows = curves.grid(gate, [0.0], [0.1, 1.0], width=1e-5, length=2e-6, temperature=300.15)
    implied = curves.implied(curves.law_values(numbers, {}), rows, reference)
    moved = ((*row[:3], row[3] * float(np.exp(offset)), *row[4:7]) for row in implied)
    return "\n".join(["vg,vs,vd,id,w,l,temperature", *(",".join(map(repr, row)) for row in moved)]) + "\n"


@pytest.mark.parametrize("offset", [0.0, 0.3])
def test_a_fitted_device_is_drawn_over_its_table(tmp_path: Path, offset: float) -> None:
    table = _table(_process(PROCESS), offset)
    (tmp_path / "evidence").mkdir()
    (tmp_path / "evidence" / "nfet.csv").write_text(table, encoding="utf-8")
    process = _process(PROCESS + FITTED.format(digest=sha256(table.encode()).hexdigest()))
    (found,) = fits_of(tmp_path, process)
    assert sorted(found.measured) == sorted(found.currents) == pytest.approx([0.1, 1.0])
    assert (found.width, found.length) == pytest.approx((1e-5, 2e-6))
    for across, rows in found.measured.items():
        gate, current = np.array(rows).T
        there = np.interp(gate, found.gate, np.log(found.currents[across]))
        assert np.log(current) - there == pytest.approx(np.full(len(gate), offset), abs=0.02)
    drawn = pictures.fit(found)
    assert "Tables are drawn for 2 of them" in drawn.alt
    assert ElementTree.fromstring(drawn.svg).tag == f"{SVG}svg"


def test_a_table_that_was_changed_since_the_fit_is_not_drawn(tmp_path: Path) -> None:
    (tmp_path / "evidence").mkdir()
    (tmp_path / "evidence" / "nfet.csv").write_text("vg,vs,vd,id\n0.5,0,1,1e-6\n", encoding="utf-8")
    process = _process(PROCESS + FITTED.format(digest=sha256(b"another").hexdigest()))
    (found,) = fits_of(tmp_path, process)
    assert found.measured == {}
    assert len(found.currents) == 3
    assert all(np.all(np.diff(current) > 0) for current in found.currents.values())


def test_the_same_data_make_the_same_picture() -> None:
    process = _process(PROCESS + FITTED.format(digest="none"))
    (one,), (other,) = fits_of(Path("/nowhere"), process), fits_of(Path("/nowhere"), process)
    assert pictures.fit(one).svg == pictures.fit(other).svg
    assert "<dc:date>" not in pictures.fit(one).svg
