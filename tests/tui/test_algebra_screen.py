"""The algebra of a number on the screen: the expression, its numbers followed down to the file, and back."""

from __future__ import annotations

from pathlib import Path

import pytest

from tests.tui.driving import Drive, drive
from worksheet.tui.screens.algebra import AlgebraScreen
from worksheet.tui.screens.sheet import SheetScreen


async def behind(d: Drive, sheet: str, row: str) -> AlgebraScreen:
    """The algebra screen of a row of a sheet."""
    await d.settled()
    await d.sheet(sheet, row)
    await d.press("w")
    screen = d.app.screen
    assert isinstance(screen, AlgebraScreen)
    await found(d, screen)
    return screen


async def found(d: Drive, screen: AlgebraScreen) -> None:
    """Wait for the algebra of what is shown."""
    await d.until(lambda: screen._explained is not None)


async def follow(d: Drive, screen: AlgebraScreen, row: str) -> None:
    assert screen.ledger.go(row), [one.key for one in screen.ledger.page.rows]
    await d.press("enter")
    await found(d, screen)


def test_a_metric_is_followed_down_to_the_file_and_back(root: Path) -> None:
    async def steps(d: Drive) -> None:
        screen = await behind(d, "bucket_buffer", "metric.bandwidth")
        text = "\n".join(d.rows())
        assert "f_3dB" in text
        assert "───" in text  # a drawn fraction
        await follow(d, screen, "given.output_capacitance@0")
        assert any({"C_L", "c_gs", "c_sb"} == set(one.partition(" = ")[2].split(" + ")) for one in d.rows())
        await follow(d, screen, "given.load_capacitance@0")
        said = " ".join(" ".join(d.rows()).split())
        assert "sheets/bucket_buffer.toml:10 assume.load_capacitance, floor plan, rev 3 (estimate)" in said
        assert d.text("#title").endswith("load_capacitance < output_capacitance < bandwidth")
        await d.press("escape")
        await found(d, screen)
        assert d.text("#title").endswith("output_capacitance < bandwidth")
        await d.press("escape")
        await d.press("escape")
        assert isinstance(d.app.screen, SheetScreen)

    drive(root, steps)


def test_the_worst_condition_has_an_algebra_of_its_own(root: Path) -> None:
    async def steps(d: Drive) -> None:
        screen = await behind(d, "drip_amplifier", "metric.dc_gain")
        await follow(d, screen, "worst")
        shown = screen._explained
        assert shown is not None
        assert shown.found is not None
        assert shown.found.condition_index > 0
        assert d.app.results is not None
        result = d.app.results.sheet("drip_amplifier")
        assert result is not None
        worst = next(one for one in result.targets if one.target.name == "dc_gain")
        assert shown.found.at == worst.worst_at
        assert shown.found.value == pytest.approx(worst.worst, rel=1e-9)

    drive(root, steps)


@pytest.mark.parametrize(
    ("sheet", "row", "wanted"),
    [
        ("wind_cascode", "operating.transconductance", "main.transconductance@0"),
        ("wind_cascode", "target.rate_margin", "rate_margin@0"),
        ("supply_sense", "assume.load_capacitance", "load_capacitance@0"),
        ("sun_gate", "choose.bias_current", "bias_current@0"),
    ],
)
def test_every_kind_of_number_has_one(root: Path, sheet: str, row: str, wanted: str) -> None:
    async def steps(d: Drive) -> None:
        screen = await behind(d, sheet, row)
        shown = screen._explained
        assert shown is not None
        assert shown.asked[1] == wanted
        assert shown.found is not None, shown.reason
        assert shown.found.value is not None

    drive(root, steps)


def test_a_plain_terminal_gets_ascii(root: Path) -> None:
    async def steps(d: Drive) -> None:
        await behind(d, "bucket_buffer", "metric.bandwidth")
        assert "".join(d.rows()).replace("…", "").isascii()  # the mark of a cut, which the line filter turns into "~"

    drive(root, steps, plain_signs=True)


@pytest.mark.full
def test_what_moves_while_it_is_shown_is_found_anew(root: Path) -> None:
    async def steps(d: Drive) -> None:
        screen = await behind(d, "bucket_buffer", "choose.bias_current")
        before = screen._explained
        path = root / "sheets" / "bucket_buffer.toml"
        path.write_text(path.read_text("utf-8").replace('"4 uA"', '"5 uA"'), "utf-8")
        await d.until(lambda: screen._explained is not None and screen._explained is not before)
        assert screen._explained is not None
        assert screen._explained.found is not None
        assert screen._explained.found.value == pytest.approx(5e-6)

    drive(root, steps)
