"""Every number of a page is the documents' own, to the last bit behind it and to the digits that are shown."""

from __future__ import annotations

import json
from collections.abc import Mapping
from pathlib import Path
from typing import Any

import pytest

from tests.report.handoff.reading import Page, Shown, read_shown
from tests.support import run

ROUNDING = 1e-6
"""Relative: what two ways of rounding a number that lies half-way may differ by."""


@pytest.fixture(scope="module")
def reviewed(sample: Path) -> dict[str, Any]:
    document: dict[str, Any] = json.loads(run("review", str(sample), "--fragile", "--json").out)
    return document


def test_what_is_shown_is_the_value_behind_it_to_the_digits_shown(page: Page) -> None:
    assert len(page.numbers) > 900
    for number in page.numbers:
        value, half = read_shown(number.text)
        steps = 2 if number.of.endswith(("/low", "/high")) else 1  # an end is shown on the side that meets
        assert abs(value - number.value) <= steps * half * (1 + ROUNDING), number


def test_numbers_of_a_review_are_those_of_its_document(page: Page, reviewed: Mapping[str, Any]) -> None:
    sheets = {sheet["sheet"]: sheet for sheet in reviewed["sheets"]}
    budgets = {budget["metric"]: budget for budget in reviewed["budget"]}
    chains = {chain["chain"]: chain for chain in reviewed["chains"]}
    held = 0
    for number in page.numbers:
        head, *path = number.of.split("/")
        if head == "review":
            assert number.value == _of_review(sheets[path[0]], path[1:]), number
        elif head == "budget":
            assert number.value == budgets[path[0]][path[1]], number
        elif head == "chain":
            assert number.value == _of_chain(chains[path[0]], path[1:]), number
        elif head == "explained":
            known = sheets[path[0]]["metrics"].get(path[1])
            stated = {target["metric"]: target["nominal"] for target in sheets[path[0]]["targets"]}
            expected = stated[path[1]] if known is None else known["value"]
            assert number.value == pytest.approx(expected, rel=1e-9), number
        else:
            continue
        held += 1
    assert held > 500


def _of_review(sheet: Mapping[str, Any], path: list[str]) -> Any:
    if path[0] == "targets":
        target = next(one for one in sheet["targets"] if one["metric"] == path[1])
        return target["evidence"][int(path[3])]["value"] if path[2] == "evidence" else target[path[2]]
    found: Any = sheet
    for part in path:
        found = found[part]
    return found["value"] if isinstance(found, dict) else found


def _of_chain(chain: Mapping[str, Any], path: list[str]) -> Any:
    if path[0] == "targets":
        return next(one for one in chain["targets"] if one["metric"] == path[1])[path[2]]
    if path[0] == "takes":
        return chain["takes"][int(path[1])][path[2]]
    return chain["metrics"][path[1]][path[2]]


def test_weak_assumptions_break_where_the_ranking_says(page: Page, reviewed: Mapping[str, Any]) -> None:
    held = 0
    for number in page.numbers:
        head, *path = number.of.split("/")
        if head != "weak":
            continue
        name, key, part = path
        sheet = next(one for one in reviewed["sheets"] if one["sheet"] == name)
        rows = [row for row in (*sheet["fragile"], *sheet["fragile_worst"]) if row["name"] == key]
        if part == "value":
            assert any(number.value == row["value"] for row in rows) or not rows, number
        else:
            least = min((row for row in rows if row["room"] is not None), key=lambda row: row["room"])
            assert number.value == least[part], number
        held += 1
    assert held > 30


def _solved(page: Page, sample: Path, name: str) -> int:
    """Hold a block's windows against the solve document; how many numbers that were."""
    document = json.loads(run("solve", str(sample / "sheets" / f"{name}.toml"), "--json").out)
    held = 0
    for number in page.numbers:
        if number.of.startswith(f"solve/{name}/"):
            assert _in_solve(document, number), number
            held += 1
    return held


def _in_solve(document: Mapping[str, Any], number: Shown) -> bool:
    _, _, what, *path = number.of.split("/")
    if what in ("recommended", "compact"):
        return bool(number.value == document[what][path[0]])
    window = document["needed"][path[0]]
    if path[1] != "hand":
        return bool(number.value == window[path[1]])
    side = path[2]
    setting = [b for b in window["bounds"] if b["value"] == window[side] and b["side"] == side]
    return any(b["hand"] is not None and number.value == b["hand"]["value"] for b in setting)


def test_windows_of_a_block_are_those_of_its_solve_document(page: Page, sample: Path) -> None:
    assert _solved(page, sample, "electrode_buffer") > 15


@pytest.mark.full  # half a minute of algebra
@pytest.mark.parametrize(
    "name",
    ["battery_watch", "converter_driver", "level_amplifier", "mux_driver", "pressure_input", "wake_comparator"],
)
def test_windows_of_every_block_are_those_of_its_solve_document(page: Page, sample: Path, name: str) -> None:
    assert _solved(page, sample, name) > 2


def test_sizes_as_lines_are_the_numbers_of_the_review(folder: Path, reviewed: Mapping[str, Any]) -> None:
    lines = dict(line.split(" = ") for line in (folder / "handoff-sizes.txt").read_text("utf-8").splitlines())
    for sheet in reviewed["sheets"]:
        name = sheet["sheet"]
        assert float(lines[f"{name}_main_width"]) == sheet["choose"]["width"]["value"]
        assert float(lines[f"{name}_main_length"]) == sheet["choose"]["length"]["value"]
        assert int(lines[f"{name}_count"]) == sheet["count"]
        assert int(lines[f"{name}_main_fingers"]) >= 1
