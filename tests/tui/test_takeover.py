"""Taking a block over in the app: led through what is asked, new, stale and weak; checking shows in the comparison."""

from __future__ import annotations

import datetime
import tomllib
from pathlib import Path

import pytest

from tests.history.repositories import signed
from tests.tui.driving import Drive, drive
from worksheet.model.problem import Problem
from worksheet.session import revisions
from worksheet.session.taking_over import Why
from worksheet.tui.screens.sheet import SheetScreen
from worksheet.tui.screens.takeover import TakeoverScreen

TODAY = datetime.datetime.now().astimezone().date()
BLOCK = "bucket_buffer"


@pytest.fixture(autouse=True)
def identity(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    signed(monkeypatch, tmp_path)


def sheet(root: Path) -> Path:
    return root / "sheets" / f"{BLOCK}.toml"


async def taking_over(d: Drive) -> TakeoverScreen:
    await d.settled()
    assert d.place.ledger.go(f"sheet.{BLOCK}")
    await d.press("h")
    screen = d.app.screen
    assert isinstance(screen, TakeoverScreen)
    await d.until(lambda: screen.led is not None)
    return screen


async def shown(d: Drive, screen: TakeoverScreen) -> None:
    """Wait until the steps are those of the book as it stands."""
    await d.settled()
    revision = d.app.snapshot.revision
    await d.until(lambda: screen.led is not None and screen.led.revision == revision)


def test_one_is_led_through_what_is_asked_new_stale_and_weak(root: Path) -> None:
    assert not isinstance(revisions.record(root, "Mine", TODAY), Problem)
    text = sheet(root).read_text("utf-8").replace('"4 uA"', '"4.5 uA"')
    sheet(root).write_text(text + '\n[[remark]]\nby = "M. Okafor"\nto = "M. Roe"\ntext = "Which rows?"\n', "utf-8")

    async def steps(d: Drive) -> None:
        screen = await taking_over(d)
        assert screen.led is not None
        found = {why: [step.key for step in screen.led.steps if step.why is why] for why in Why}
        assert found[Why.ASKED] == [""]
        assert "choose.bias_current" in found[Why.NEW]
        assert found[Why.STALE] == ["target.bandwidth"]
        assert "assume.load_capacitance" in found[Why.WEAK]
        assert "Which rows?" in "\n".join(d.rows())

    drive(root, steps)


@pytest.mark.full
def test_a_checked_value_shows_in_the_next_comparison(root: Path) -> None:
    assert not isinstance(revisions.record(root, "Mine", TODAY), Problem)

    async def steps(d: Drive) -> None:
        screen = await taking_over(d)
        assert screen.ledger.go("WEAK.assume.load_capacitance..")
        await d.press("v")
        await d.press("enter")
        await d.press("ctrl+u")
        await d.type("agreed")
        await d.press("enter")
        await shown(d, screen)
        assert screen.ledger.go("WEAK.assume.load_capacitance..")
        assert any("assume.load_capacitance " in row and "checked" in row for row in d.rows())
        await d.press("enter")
        assert isinstance(d.app.screen, SheetScreen)
        row = d.app.screen.ledger.row
        assert row is not None
        assert row.key == "assume.load_capacitance"

    drive(root, steps)
    stated = tomllib.loads(sheet(root).read_text("utf-8"))["assume"]["load_capacitance"]
    assert (stated["trust"], stated["checked_by"], stated["checked"]) == ("agreed", "M. Roe", TODAY)
    assert stated["source"] == "floor plan, rev 3"
    found = revisions.compared(root, "HEAD", revisions.WORKING, TODAY)
    assert not isinstance(found, Problem)
    moved = {one.key: (one.old, one.new) for one in found.comparison.sheets[0].inputs}
    assert moved["assume.load_capacitance.trust"] == ("estimate", "agreed")
    assert moved["assume.load_capacitance.checked_by"] == (None, "M. Roe")
    assert moved["assume.load_capacitance.checked"] == (None, TODAY.isoformat())


@pytest.mark.full
def test_a_question_stays_with_the_sheet_and_the_block_becomes_one_s_own(root: Path) -> None:
    assert not isinstance(revisions.record(root, "Mine", TODAY), Problem)

    async def steps(d: Drive) -> None:
        screen = await taking_over(d)
        assert screen.ledger.go("WEAK.assume.input_level..")
        await d.press("a")
        await d.press("enter", "enter")
        await d.type("Which sensor?")
        await d.press("enter")
        await shown(d, screen)
        assert screen.led is not None
        assert [step.key for step in screen.led.steps if step.why is Why.ASKED] == ["assume.input_level"]
        await d.press("m", "enter")

    drive(root, steps)
    data = tomllib.loads(sheet(root).read_text("utf-8"))
    assert data["owner"] == "M. Roe"
    (remark,) = data["remark"]
    assert (remark["to"], remark["about"], remark["text"]) == ("M. Okafor", "assume.input_level", "Which sensor?")
