"""A review meeting in the app: walk through what wants a decision, decide, leave with minutes and a revision."""

from __future__ import annotations

import datetime
import tomllib
from decimal import ROUND_CEILING, ROUND_FLOOR
from pathlib import Path
from typing import Any

import pytest

from tests.history.repositories import git, signed
from tests.tui.driving import Drive, drive
from worksheet.session import revisions
from worksheet.tui.screens.meeting import MeetingScreen, rounded
from worksheet.tui.screens.sheet import SheetScreen

TODAY = datetime.datetime.now().astimezone().date()


@pytest.fixture(autouse=True)
def identity(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    signed(monkeypatch, tmp_path)


def stated(root: Path, sheet: str) -> dict[str, Any]:
    return tomllib.loads((root / "sheets" / f"{sheet}.toml").read_text("utf-8"))


async def meeting(d: Drive) -> MeetingScreen:
    await d.settled()
    await d.press("g")
    screen = d.app.screen
    assert isinstance(screen, MeetingScreen)
    return screen


async def go(d: Drive, key: str) -> None:
    assert d.place.ledger.go(key), [row.key for row in d.place.ledger.page.rows]
    await d.pilot.pause()


async def fill(d: Drive, *texts: str) -> None:
    """Type texts into the lines of a form; an empty one leaves what stands there."""
    for text in texts:
        await d.type(text)
        await d.press("enter")


@pytest.mark.full
def test_a_meeting_decides_and_ends_with_minutes_and_a_revision(root: Path) -> None:
    revisions.record(root, "Before the meeting", TODAY)

    async def steps(d: Drive) -> None:
        await meeting(d)
        await go(d, "sun_gate.MISSED.bandwidth.")
        assert "wanted" in d.text("#detail")
        await d.press("w")
        await fill(d, "", "clouds", "", "2030-01-31")
        await d.settled()
        await go(d, "bucket_buffer.STALE.bandwidth.")
        await d.press("b")
        await fill(d, "", "", "Run it again.")
        await d.settled()
        await go(d, "drip_amplifier.NOT_REVIEWED..")
        await d.press("a")
        await fill(d, "", "looks right")
        await d.settled()
        await d.press("m")
        await fill(d, "M. Roe", "")
        await d.until(lambda: "recorded" in d.text("#said"))

    drive(root, steps)
    waiver = stated(root, "sun_gate")["waiver"][-1]
    assert (waiver["by"], waiver["reason"], waiver["until"]) == ("M. Roe", "clouds", datetime.date(2030, 1, 31))
    sent = stated(root, "bucket_buffer")
    assert sent["state"] == "draft"
    assert sent["remark"][-1]["about"] == "target.bandwidth"
    assert sent["remark"][-1]["to"] == "M. Okafor"
    page = next((root / "evidence" / "minutes").iterdir()).read_text("utf-8")
    for word in ("clouds", "Run it again.", "accepted", "looks right", "Present: M. Roe"):
        assert word in page
    assert git(root, "show", "--name-only", "--format=%s").splitlines()[0].startswith("Review meeting of")


@pytest.mark.full
def test_a_remark_is_settled_and_leaves_the_agenda(root: Path) -> None:
    path = root / "sheets" / "sun_gate.toml"
    path.write_text(path.read_text("utf-8") + '\n[[remark]]\nby = "A"\ntext = "Which cell?"\n', "utf-8")

    async def steps(d: Drive) -> None:
        await meeting(d)
        await go(d, "sun_gate.REMARK..0")
        assert "Which cell?" in d.text("#detail")
        await d.press("d")
        await fill(d, "M. Roe", "The east one.")
        await d.settled()
        assert not any("REMARK" in row.key for row in d.place.ledger.page.rows)
        await d.press("z")
        await d.settled()
        assert any("REMARK" in row.key for row in d.place.ledger.page.rows)

    drive(root, steps)
    assert "settled" not in stated(root, "sun_gate")["remark"][0]


@pytest.mark.full
def test_one_kind_is_shown_alone_and_a_sheet_opens_at_its_target(root: Path) -> None:
    async def steps(d: Drive) -> None:
        await meeting(d)
        await d.press("k")
        await d.type("missed")
        await d.press("enter")
        assert all(".MISSED." in row.key for row in d.place.ledger.page.rows)
        assert "only missed: 1" in d.text("#title")
        about = d.place.ledger.page.rows[0].key.split(".")[2]
        await d.press("enter")
        assert isinstance(d.app.screen, SheetScreen)
        row = d.app.screen.ledger.row
        assert row is not None
        assert row.key == f"target.{about}"
        await d.press("escape")
        assert isinstance(d.app.screen, MeetingScreen)

    drive(root, steps)


def test_for_the_others_the_meeting_is_for_reading_only(root: Path) -> None:
    before = {path: path.read_bytes() for path in root.rglob("*.toml")}

    async def steps(d: Drive) -> None:
        await meeting(d)
        for key in ("a", "w", "b", "d", "m"):
            await d.press(key)
            assert isinstance(d.app.screen, MeetingScreen)
        assert "Accept" not in d.text("#foot")

    drive(root, steps, read_only=True)
    assert {path: path.read_bytes() for path in root.rglob("*.toml")} == before


@pytest.mark.parametrize(
    ("value", "way", "expected"),
    [(2.0569203e6, ROUND_FLOOR, 2.056e6), (6.7212e-3, ROUND_CEILING, 6.722e-3), (0.0, ROUND_FLOOR, 0.0)],
)
def test_a_waiver_s_value_covers_what_it_is_made_for(value: float, way: str, expected: float) -> None:
    assert rounded(value, way) == pytest.approx(expected, rel=1e-12)
