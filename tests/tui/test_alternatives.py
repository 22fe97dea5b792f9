"""Variants, sweeps, the front, paths and what breaks a block, in the app: what stands there, and what it changes."""

from __future__ import annotations

import re
import tomllib
from pathlib import Path
from typing import Any

import pytest

from tests.support import run
from tests.tui.driving import Drive, drive
from worksheet.tui.screens.chains import ChainScreen
from worksheet.tui.screens.failing import FailingScreen
from worksheet.tui.screens.front import FrontScreen
from worksheet.tui.screens.sheet import SheetScreen
from worksheet.tui.screens.sweeping import SweepScreen
from worksheet.tui.screens.variants import VariantsScreen
from worksheet.tui.screens.view import View

VARIANT = """
[variant.loud]
note = "[bold]half[/] the \\u001b[31mcurrent"
bias_current = { value = "2 uA", source = "battery", trust = "guess" }
fingers = 2
"""
CHAIN = """
[chain.rain]
title = "Bucket to drip"
sheets = ["bucket_buffer", "drip_amplifier"]
settling_time = { max = "1 ns" }
"""


def _sheet(root: Path, name: str = "bucket_buffer") -> dict[str, Any]:
    return tomllib.loads((root / "sheets" / f"{name}.toml").read_text("utf-8"))


def _with(root: Path, text: str, file: str = "sheets/bucket_buffer.toml") -> None:
    path = root / file
    path.write_text(path.read_text("utf-8") + text, "utf-8")


async def _found(d: Drive, kind: type[View]) -> View:
    screen = d.app.screen
    assert isinstance(screen, kind)
    await d.until(lambda: screen.found is not None)
    return screen


@pytest.mark.full
def test_a_variant_is_taken_over_and_comes_back_with_undo(root: Path) -> None:
    _with(root, VARIANT)
    before = (root / "sheets" / "bucket_buffer.toml").read_bytes()

    async def steps(d: Drive) -> None:
        await d.sheet("bucket_buffer")
        await d.press("d")
        screen = await _found(d, VariantsScreen)
        rows = d.rows()
        assert rows[0].startswith("as it stands")
        assert "[bold]half[/]" in rows[1], "shown as typed, never as markup"
        assert not any("\x1b" in row for row in rows)
        assert any(re.match(r" +bias_current +4 uA +2 uA$", row) for row in rows)
        assert any(re.match(r" +fingers +4 +2$", row) for row in rows)
        await d.press("enter")
        assert _sheet(root)["choose"]["bias_current"] == "4 uA", "the sheet as it stands is no variant to take"
        await d.press("down", "enter")
        taken = _sheet(root)["choose"]
        assert taken["bias_current"] == {"value": "2 uA", "source": "battery", "trust": "guess"}
        assert taken["fingers"] == 2
        assert "taken over" in d.text("#said")
        await d.press("z")
        assert (root / "sheets" / "bucket_buffer.toml").read_bytes() == before
        await d.until(lambda: screen.found is not None)
        await d.press("x")
        assert "variant" not in _sheet(root)
        await d.press("z")
        assert (root / "sheets" / "bucket_buffer.toml").read_bytes() == before

    drive(root, steps)


@pytest.mark.full
def test_the_present_choice_is_kept_as_a_variant(root: Path) -> None:
    async def steps(d: Drive) -> None:
        await d.sheet("bucket_buffer")
        await d.press("d")
        screen = await _found(d, VariantsScreen)
        assert "No variants yet" in "\n".join(d.rows())
        await d.press("k")
        await d.type("a b")
        await d.press("enter", "enter")
        assert not isinstance(d.app.screen, VariantsScreen), "a bad name is said, and the text stays"
        assert "variant" not in _sheet(root)
        await d.press("up", "backspace", "backspace")
        await d.type("now")
        await d.press("enter", "enter")
        assert _sheet(root)["variant"]["anow"] == {
            "bias_current": "4 uA",
            "width": "20 um",
            "length": "0.5 um",
            "fingers": 4,
        }
        await d.until(lambda: screen.found is not None and len(screen.found.columns) == 2)
        assert any(row.startswith("anow") for row in d.rows())

    drive(root, steps)
    assert run("review", str(root)).status != 2


@pytest.mark.full
def test_a_second_variant_stands_beside_the_first(root: Path) -> None:
    _with(root, VARIANT)

    async def steps(d: Drive) -> None:
        await d.sheet("bucket_buffer")
        await d.press("d")
        await _found(d, VariantsScreen)
        await d.press("k")
        await d.type("present")
        await d.press("enter")
        await d.type("as of today")
        await d.press("enter")
        kept = _sheet(root)["variant"]
        assert list(kept) == ["loud", "present"]
        assert kept["present"]["note"] == "as of today"
        await d.press("z")
        assert list(_sheet(root)["variant"]) == ["loud"]

    drive(root, steps)


@pytest.mark.full
def test_a_sweep_shows_what_the_command_says(root: Path) -> None:
    async def steps(d: Drive) -> None:
        await d.sheet("bucket_buffer", "choose.width")
        await d.press("g")
        screen = await _found(d, SweepScreen)
        assert screen.found.axis.name == "width"
        assert "bandwidth, wanted" in d.text("#picture")
        assert "---" in d.text("#picture"), "the target is a line"
        await d.press("down")
        assert "dc_gain, wanted" in d.text("#picture")
        last = screen.found.values[-1]
        await d.press("minus")
        await d.until(lambda: screen.found.values[-1] > 5 * last)
        await d.press("g")
        await d.until(lambda: not screen.found.logarithmic)
        await d.press("w", "enter")
        await d.type("process.nfet.kappa")
        await d.press("enter")
        await d.until(lambda: screen.found is not None and screen.found.axis.name == "process.nfet.kappa")
        assert "process.nfet.kappa" in d.text("#title")

    drive(root, steps)


@pytest.mark.full
@pytest.mark.parametrize("size", [(80, 24), (120, 40)])
def test_every_view_fits_the_screen(root: Path, size: tuple[int, int]) -> None:
    _with(root, CHAIN, "biasbook.toml")
    _with(root, VARIANT)

    async def steps(d: Drive) -> None:
        await d.press("p")
        assert isinstance(d.app.screen, ChainScreen)
        await d.settled()
        assert max(map(len, d.rows())) <= size[0] - 3
        await d.press("escape")
        await d.sheet("bucket_buffer")
        for key, kind in (("d", VariantsScreen), ("g", SweepScreen), ("f", FrontScreen), ("i", FailingScreen)):
            await d.press(key)
            screen = await _found(d, kind)
            lines = [*d.text("#title").split("\n"), *d.text("#picture").split("\n"), *d.rows()]
            wide = [line for line in lines if len(line) > size[0] - 1]
            assert not wide or kind is VariantsScreen, wide
            assert screen.query_one("#picture").size.height <= size[1] - 8
            await d.press("escape")

    drive(root, steps, size=size)


@pytest.mark.full
def test_a_point_of_the_front_is_taken_and_meets_every_target(root: Path) -> None:
    async def steps(d: Drive) -> None:
        await d.sheet("bucket_buffer")
        await d.press("f")
        screen = await _found(d, FrontScreen)
        assert "X" in d.text("#picture")
        point = screen.found.points[2]
        await d.press("down", "down", "enter")
        chosen = _sheet(root)["choose"]
        assert float(chosen["bias_current"].split()[0]) > 0
        await d.settled()
        assert d.app.results is not None
        result = d.app.results.sheet("bucket_buffer")
        assert result is not None
        assert {one.verdict for one in result.targets} == {"met"}
        area = result.metrics["gate_area"].value
        assert area is not None
        assert area < point.gate_area * 1.5

    drive(root, steps)


@pytest.mark.full
def test_what_breaks_a_block_stands_weakest_trust_first_and_opens_at_the_value(root: Path) -> None:
    async def steps(d: Drive) -> None:
        await d.sheet("bucket_buffer")
        await d.press("i")
        screen = await _found(d, FailingScreen)
        assert isinstance(screen, FailingScreen)
        trusts = [row.copied[0] for row in screen.ledger.page.rows]
        order = ["none", "guess", "estimate", "simulated", "measured", "agreed"]
        assert trusts == sorted(trusts, key=order.index)
        row = next(row for row in screen.ledger.page.rows if row.subject[1] == "assume.load_capacitance")
        assert screen.ledger.go(row.key)
        await d.press("enter")
        sheet = d.app.screen
        assert isinstance(sheet, SheetScreen)
        assert sheet.ledger.row is not None
        assert sheet.ledger.row.key == "assume.load_capacitance"

    drive(root, steps)


def test_paths_show_what_each_sheet_takes(root: Path) -> None:
    _with(root, CHAIN, "biasbook.toml")

    async def steps(d: Drive) -> None:
        await d.settled()
        await d.press("p")
        rows = "\n".join(d.rows())
        assert "Chain rain: Bucket to drip (bucket_buffer > drip_amplifier)" in rows
        assert "MISSED" in rows
        await d.press("down", "enter")
        assert isinstance(d.app.screen, SheetScreen)
        assert d.app.screen.name_of_sheet == "drip_amplifier"

    drive(root, steps)


def test_a_project_without_paths_says_how_to_name_one(root: Path) -> None:
    async def steps(d: Drive) -> None:
        await d.press("p")
        assert "[chain.NAME]" in "\n".join(d.rows())

    drive(root, steps)


@pytest.mark.full
def test_a_book_for_reading_shows_and_changes_nothing(root: Path) -> None:
    _with(root, VARIANT)
    before = (root / "sheets" / "bucket_buffer.toml").read_bytes()

    async def steps(d: Drive) -> None:
        await d.sheet("bucket_buffer")
        await d.press("d")
        await _found(d, VariantsScreen)
        await d.press("down", "enter", "x", "k")
        assert isinstance(d.app.screen, VariantsScreen)

    drive(root, steps, read_only=True)
    assert (root / "sheets" / "bucket_buffer.toml").read_bytes() == before
