"""Variants side by side: each is what a review of the sheet so edited says, and moves nothing of the sheet itself."""

from __future__ import annotations

import csv
import io
import json
from pathlib import Path
from typing import Any

import pytest

from tests.cli.books import AMPLIFIER, FOLLOWER, PROCESS, PROJECT
from tests.support import review, run, write_project

VARIANTS = """
[variant.fast]
note = "speed first"
bias_current = "9 uA"
load_capacitance = "1 pF"

[variant.cold]
temperature = ["0 °C"]
line = "0.2 pF"
fingers = 2

[variant.open]
bias_current = "propose"
"""
EDITED = {
    "fast": FOLLOWER.replace('"4 uA"', '"9 uA"').replace('value = "1.2 pF"', 'value = "1 pF"'),
    "cold": FOLLOWER.replace("[own]", 'temperature = ["0 °C"]\n\n[own]')
    .replace('value = "0.4 pF"', 'value = "0.2 pF"')
    .replace("[choose]", "[choose]\nfingers = 2"),
    "open": FOLLOWER.replace('"4 uA"', '"propose"'),
}


def _variants(folder: Path, text: str = FOLLOWER + VARIANTS) -> dict[str, Any]:
    write_project(folder, PROJECT, PROCESS, {"lamp": text})
    done = run("variants", str(folder / "sheets" / "lamp.toml"), "--json")
    assert done.status == 0, done.err
    found: dict[str, Any] = json.loads(done.out)
    return found


def test_each_is_what_a_review_of_the_edited_sheet_says(tmp_path: Path) -> None:
    found = _variants(tmp_path / "beside")
    assert [one["variant"] for one in found["variants"]] == [None, "fast", "cold", "open"]
    for one in found["variants"]:
        text = FOLLOWER if one["variant"] is None else EDITED[one["variant"]]
        sheet = review(tmp_path / str(one["variant"]), PROJECT, PROCESS, {"lamp": text})["sheets"][0]
        assert one["targets"] == sheet["targets"]
        assert one["supply_current"] == sheet["metrics"]["supply_current"]["value"]
        assert one["gate_area"] == sheet["metrics"]["gate_area"]["value"]
    assert found["changed"] == ["choose.bias_current", "assume.load_capacitance", "assume.temperature", "own.line"]
    values = {one["variant"]: one["values"] for one in found["variants"]}
    assert values["fast"]["choose.bias_current"] == 9e-6
    assert values["cold"]["assume.temperature"] == 273.15
    assert values[None]["fingers"] == 1
    assert values["open"]["choose.bias_current"] == "propose"


def test_variants_move_nothing_of_the_sheet_itself(tmp_path: Path) -> None:
    with_them = review(tmp_path / "with", PROJECT, PROCESS, {"lamp": FOLLOWER + VARIANTS})["sheets"]
    assert with_them == review(tmp_path / "without", PROJECT, PROCESS, {"lamp": FOLLOWER})["sheets"]


def test_a_variant_that_cannot_be_reviewed_hides_no_other(tmp_path: Path) -> None:
    text = FOLLOWER.replace("[own]", 'step_size = { formula = "1e12*(line - 0.3e-12)" }\n\n[own]') + VARIANTS
    write_project(tmp_path, PROJECT, PROCESS, {"lamp": text})
    done = run("variants", str(tmp_path / "sheets" / "lamp.toml"), "--json")
    assert done.status == 2
    by_name = {one["variant"]: one for one in json.loads(done.out)["variants"]}
    assert not by_name["cold"]["targets"]
    assert "expected above 0 V" in by_name["cold"]["problems"][0]["message"]
    assert by_name["fast"]["targets"]
    out = run("variants", str(tmp_path / "sheets" / "lamp.toml")).out
    assert "cold: the formula" in out


def test_text_and_table(tmp_path: Path) -> None:
    write_project(tmp_path, PROJECT, PROCESS, {"lamp": FOLLOWER + VARIANTS})
    sheet = str(tmp_path / "sheets" / "lamp.toml")
    out = run("variants", sheet).out
    assert "3 variants beside what it states" in out
    assert "speed first" in out
    assert all(len(line) <= 80 for line in out.splitlines())
    many = "".join(f'\n[variant.more_{k}]\nbias_current = "{k + 5} uA"\n' for k in range(7))
    write_project(tmp_path, PROJECT, PROCESS, {"lamp": FOLLOWER + VARIANTS + many})
    out = run("variants", sheet).out
    assert all(len(line) <= 80 for line in out.splitlines())
    assert all(f"more_{k}" in out for k in range(7))
    write_project(tmp_path, PROJECT, PROCESS, {"lamp": FOLLOWER + VARIANTS})
    rows = list(csv.DictReader(io.StringIO(run("variants", sheet, "--csv", "-").out)))
    assert [row["variant"] for row in rows] == ["as it stands", "fast", "cold", "open"]
    assert float(rows[1]["choose.bias_current"]) == 9e-6
    assert rows[1]["bandwidth verdict"] == "met"
    assert run("variants", str(tmp_path / "sheets" / "lomp.toml")).status == 2
    write_project(tmp_path, PROJECT, PROCESS, {"lamp": AMPLIFIER})
    assert "no variants; a table [variant.NAME]" in run("variants", sheet).out


def test_a_table_that_cannot_be_written_is_said(tmp_path: Path) -> None:
    write_project(tmp_path, PROJECT, PROCESS, {"lamp": FOLLOWER})
    done = run("variants", str(tmp_path / "sheets" / "lamp.toml"), "--csv", str(tmp_path))
    assert done.status == 2
    assert "cannot be written" in done.err


@pytest.mark.parametrize("name", ["", "path"])
def test_chains_have_a_command(tmp_path: Path, name: str) -> None:
    chain = '\n[chain.path]\nsheets = ["lamp"]\nbandwidth = { min = "1 THz" }\n'
    write_project(tmp_path, PROJECT + chain, PROCESS, {"lamp": FOLLOWER})
    done = run("chain", str(tmp_path), *([name] if name else []))
    assert done.status == 1
    assert "MISSED" in done.out
    assert run("chain", str(tmp_path), "pith").status == 2
    document = json.loads(run("chain", str(tmp_path), "--json").out)
    assert document["chains"][0]["targets"][0]["verdict"] == "missed"
