"""Sweeps against what a review of the edited sheet says, and against the conditions of the sheet itself."""

from __future__ import annotations

import csv
import io
import json
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from tests.cli.books import AMPLIFIER, FOLLOWER, PROCESS, PROJECT
from tests.support import review, run, write_project

RANGED = FOLLOWER.replace('value = "1.2 pF"', 'value = "1.2 pF", low = "0.8 pF", high = "1.5 pF"')


def _swept(folder: Path, sheet: str, *asked: str) -> dict[str, Any]:
    write_project(folder, PROJECT, PROCESS, {"lamp": sheet})
    done = run("sweep", str(folder / "sheets" / "lamp.toml"), *asked, "--json")
    assert done.status == 0, done.err
    found: dict[str, Any] = json.loads(done.out)
    return found


@pytest.mark.parametrize(
    ("sheet", "name", "written", "values"),
    [
        (RANGED, "bias_current", '"4 uA"', (2e-6, 4e-6, 9e-6)),
        (RANGED, "choose.width", '"20 um"', (5e-6, 20e-6, 40e-6)),
        (RANGED, "line", '"0.4 pF"', (1e-13, 4e-13, 1e-12)),
        (FOLLOWER.replace('"1.2 pF"', '"1 pF"'), "load_capacitance", '"1 pF"', (5e-13, 1e-12, 2e-12)),
        (AMPLIFIER, "bias_length", '"1 um"', (5e-7, 1e-6, 2e-6)),
    ],
)
def test_every_point_is_what_a_review_of_the_edited_sheet_says(
    tmp_path: Path, sheet: str, name: str, written: str, values: tuple[float, ...]
) -> None:
    found = _swept(
        tmp_path / "swept", sheet, "--of", name, "--from", repr(values[0]), "--to", repr(values[-1]), "--points", "2"
    )
    for k in (0, 1):
        edited = sheet.replace(written, repr(values[(0, -1)[k]]))
        assert edited != sheet
        document = review(tmp_path / f"edited{k}", PROJECT, PROCESS, {"lamp": edited})
        for target in document["sheets"][0]["targets"]:
            curve = next(curve for curve in found["curves"] if curve["metric"] == target["metric"])
            assert curve["nominal"][k] == pytest.approx(target["nominal"], rel=1e-9)
            assert curve["worst"][k] == pytest.approx(target["worst"], rel=1e-9)
            assert curve["met"][k] is (target["verdict"] == "met")


def test_a_process_parameter_moves_what_it_moves_in_the_file(tmp_path: Path) -> None:
    asked = ("--of", "process.nfet.kappa", "--from", "0.6", "--to", "0.8", "--points", "3")
    found = _swept(tmp_path / "swept", FOLLOWER, *asked, "--metric", "dc_gain", "--metric", "bandwidth")
    for k, kappa in enumerate((0.6, 0.7, 0.8)):
        process = PROCESS.replace("kappa = 0.7", f"kappa = {kappa}", 1)
        metrics = review(tmp_path / f"edited{k}", PROJECT, process, {"lamp": FOLLOWER})["sheets"][0]["metrics"]
        for curve in found["curves"]:
            assert curve["nominal"][k] == pytest.approx(metrics[curve["metric"]]["value"], rel=1e-9)


def test_temperature_is_swept_as_a_condition(tmp_path: Path) -> None:
    """At a temperature of the project the worst of a sweep is the worst of the conditions at that temperature."""
    proportional = FOLLOWER.replace("[own]", "bias_temperature_exponent = 1\n\n[own]")
    asked = ("--of", "temperature", "--from", "0 °C", "--to", "27 °C", "--points", "2", "--metric", "bandwidth")
    (curve,) = _swept(tmp_path / "swept", proportional, *asked)["curves"]
    target = review(tmp_path / "stated", PROJECT, PROCESS, {"lamp": proportional})["sheets"][0]["targets"][0]
    assert target["metric"] == "bandwidth"
    at = {(b["at"]["process"], b["at"]["temperature"], b["at"]["supply"]): b["room"] for b in target["breaks_first"]}
    worst: dict[float, float] = {}
    for (_, temperature, _), room in at.items():
        worst[temperature] = min(room, worst.get(temperature, np.inf))
    for value, temperature in zip(curve["worst"], (273.15, 300.15), strict=True):
        if temperature in worst:
            assert value / 5e6 - 1 == pytest.approx(worst[temperature], rel=1e-9)
    assert 273.15 in worst or 300.15 in worst
    assert curve["nominal"][1] == pytest.approx(target["nominal"], rel=1e-12)


def test_a_drive_resistance_may_be_swept_from_nothing(tmp_path: Path) -> None:
    asked = (
        "--of",
        "drive_resistance",
        "--from",
        "0 ohm",
        "--to",
        "100 kohm",
        "--points",
        "3",
        "--metric",
        "bandwidth",
    )
    (curve,) = _swept(tmp_path, FOLLOWER, *asked)["curves"]
    for k, text in ((0, FOLLOWER), (2, FOLLOWER.replace("[own]", 'drive_resistance = "100 kohm"\n\n[own]'))):
        metrics = review(tmp_path / f"stated{k}", PROJECT, PROCESS, {"lamp": text})["sheets"][0]["metrics"]
        assert curve["nominal"][k] == pytest.approx(metrics["bandwidth"]["value"], rel=1e-12)


def test_points_that_are_not_valid_are_counted_and_left_out(tmp_path: Path) -> None:
    asked = ("--of", "input_level", "--from", "0.1 V", "--to", "1.1 V", "--points", "5", "--metric", "dc_gain")
    found = _swept(tmp_path, FOLLOWER, *asked)
    assert found["not_valid"][0] == found["conditions"] == 8
    assert found["not_valid"][-1] == 0
    assert found["curves"][0]["low"][0] is None
    assert found["curves"][0]["low"][-1] is not None


def test_the_table_is_in_si_units(tmp_path: Path) -> None:
    write_project(tmp_path, PROJECT, PROCESS, {"lamp": FOLLOWER})
    asked = ("--of", "width", "--from", "10 um", "--to", "40 um", "--points", "3", "--log", "--metric", "bandwidth")
    done = run("sweep", str(tmp_path / "sheets" / "lamp.toml"), *asked, "--csv", "-")
    rows = list(csv.reader(io.StringIO(done.out)))
    assert rows[0][:3] == ["width [m]", "bandwidth nominal [Hz]", "bandwidth low [Hz]"]
    assert [float(row[0]) for row in rows[1:]] == pytest.approx([1e-5, 2e-5, 4e-5])
    assert float(rows[1][rows[0].index("bandwidth min [Hz]")]) == 5e6
    kept = tmp_path / "table.csv"
    done = run("sweep", str(tmp_path / "sheets" / "lamp.toml"), *asked, "--csv", str(kept))
    assert list(csv.reader(io.StringIO(kept.read_text("utf-8")))) == rows
    assert "bandwidth, wanted" in done.out
    assert all(len(line) <= 80 for line in done.out.splitlines())


@pytest.mark.parametrize(
    ("asked", "words"),
    [
        (("--of", "widht"), "did you mean width?"),
        (("--of", "width", "--from", "1 V"), "a length"),
        (("--of", "width", "--from", "0.1 um"), "the least that the process allows"),
        (("--of", "width", "--from", "1 um", "--to", "1 um"), "two equal ends"),
        (("--of", "width", "--points", "1"), "expected 2 to"),
        (("--of", "width", "--points", "many"), "many"),
        (("--of", "width", "--metric", "bandwith"), "did you mean bandwidth?"),
        (("--of", "drive_resistance"), "stands at 0"),
        (("--of", "drive_resistance", "--from", "0 ohm", "--to", "1 kohm", "--log"), "above it for a logarithmic"),
        (("--of", "load_capacitance", "--to", "-1 pF"), "at least 0 F"),
        (("--of", "line", "--to", "1 V"), "expected a value in F"),
    ],
)
def test_a_wrong_question_is_bad_input(tmp_path: Path, asked: tuple[str, ...], words: str) -> None:
    write_project(tmp_path, PROJECT, PROCESS, {"lamp": FOLLOWER})
    done = run("sweep", str(tmp_path / "sheets" / "lamp.toml"), *asked)
    assert done.status == 2
    assert words in done.err
    assert not done.out
    done = run("sweep", str(tmp_path / "sheets" / "lamp.toml"), *asked, "--json")
    assert words in json.loads(done.out)["problems"][0]["message"]
