"""The project's screen: every block at a glance, found by typing, started, copied, renamed, taken out and back."""

from __future__ import annotations

from pathlib import Path
from shutil import move

import pytest
from textual.color import Color
from textual.widgets import Input

from tests.tui.book import SHEETS
from tests.tui.driving import Drive, drive, terminal
from worksheet.session.project_edit import entries
from worksheet.tui.dialogs.ask import AskDialog
from worksheet.tui.screens.sheet import SheetScreen


def test_every_block_stands_there_with_its_verdicts_and_margin(root: Path) -> None:
    async def steps(d: Drive) -> None:
        await d.settled()
        rows = d.rows()
        assert [row.split()[0] for row in rows] == sorted(SHEETS)
        assert next(r for r in rows if r.startswith("sun_gate")).split()[1:] == [
            "common-gate",
            "draft",
            "1",
            "1",
            "-",
            "-",
            "-61.6%",
        ]
        assert "for-review" in next(r for r in rows if r.startswith("drip_amplifier"))
        assert "1 missed, 0 unknown, 1 waived" in d.text("#title")
        assert "supply_current" in d.text("#budgets")
        assert "met" in d.text("#budgets")

    drive(root, steps)


def test_the_first_picture_is_complete_with_results_at_60_columns_and_15_lines_too(root: Path) -> None:
    async def steps(d: Drive) -> None:
        await d.settled()
        assert len(d.rows()) == len(SHEETS)
        assert "Commands" in d.text("#foot")

    drive(root, steps, size=(60, 15))


@pytest.mark.full
def test_typing_finds_blocks_by_name_stage_state_and_verdict(root: Path) -> None:
    async def steps(d: Drive) -> None:
        await d.settled()
        for wanted, found in {
            "casc acc": ["wind_cascode"],
            "common": ["drip_amplifier", "sun_gate"],
            "missed": ["sun_gate"],
            "waived": ["supply_sense"],
        }.items():
            await d.press("f")
            await d.type(wanted)
            assert [row.split()[0] for row in d.rows()] == found, wanted
            await d.press("enter", "escape")
        assert len(d.rows()) == len(SHEETS)

    drive(root, steps)


def test_enter_opens_the_block_and_escape_comes_back(root: Path) -> None:
    async def steps(d: Drive) -> None:
        await d.settled()
        await d.press("down", "enter")
        assert isinstance(d.app.screen, SheetScreen)
        assert d.app.screen.name_of_sheet == "clock_driver"
        await d.press("escape")
        assert "block" in d.text("#heading")

    drive(root, steps)


@pytest.mark.full
def test_a_new_sheet_is_asked_for_until_it_can_be_made(root: Path) -> None:
    async def steps(d: Drive) -> None:
        await d.settled()
        await d.press("n")
        await d.type("two words")
        assert "identifier" in d.text("#note") or "name" in d.text("#note").lower()
        await d.press("home", *["delete"] * 9)
        await d.type("gust_buffer")
        await d.press("enter")
        await d.type("sou")
        await d.press("tab", "enter", "enter", "enter")
        assert "gust_buffer" in d.app.snapshot.names
        assert (root / "sheets" / "gust_buffer.toml").exists()
        await d.press("z")
        assert not (root / "sheets" / "gust_buffer.toml").exists()
        assert "taken back" in d.text("#said")

    drive(root, steps)


@pytest.mark.full
def test_copy_rename_and_delete_have_a_way_back(root: Path) -> None:
    async def steps(d: Drive) -> None:
        await d.settled()
        before = sorted(p.name for p in (root / "sheets").iterdir())
        assert d.place.ledger.go("sheet.drip_amplifier")
        await d.press("d", "enter")
        assert "drip_amplifier_copy" in d.app.snapshot.names
        assert d.place.ledger.go("sheet.drip_amplifier_copy")
        await d.press("x")
        assert "drip_amplifier_copy" not in d.app.snapshot.names
        assert d.place.ledger.go("sheet.drip_amplifier")
        await d.press("r", *["backspace"] * 9)
        await d.type("stage_one")
        await d.press("enter")
        assert "2*drip_stage_one.input_capacitance" in (root / "sheets" / "supply_sense.toml").read_text("utf-8")
        await d.press("z", "z", "z")
        assert sorted(p.name for p in (root / "sheets").iterdir()) == before
        assert d.app.snapshot.undo == ""

    drive(root, steps)


def test_deleting_what_another_sheet_uses_says_so(root: Path) -> None:
    async def steps(d: Drive) -> None:
        await d.settled()
        assert d.place.ledger.go("sheet.drip_amplifier")
        await d.press("x")
        assert "supply_sense" in d.text("#said")
        assert "drip_amplifier" in d.app.snapshot.names

    drive(root, steps)


def test_a_sheet_that_cannot_be_read_hides_no_other(root: Path) -> None:
    (root / "sheets" / "sun_gate.toml").write_text('title = "[/x]\\u001b[31m"\nstage = 4\n', "utf-8")

    async def steps(d: Drive) -> None:
        await d.settled()
        assert len(d.rows()) == len(SHEETS)
        assert "has problems" in next(row for row in d.rows() if row.startswith("sun_gate"))
        assert "\x1b" not in "".join(d.rows())
        await d.press("exclamation_mark")
        assert any("sun_gate.toml" in row for row in d.rows())

    drive(root, steps)


def test_somebody_else_s_change_is_taken_in_at_once(root: Path) -> None:
    async def steps(d: Drive) -> None:
        await d.settled()
        path = root / "sheets" / "sun_gate.toml"
        path.write_text(path.read_text("utf-8").replace('"500 kHz"', '"1 kHz"'), "utf-8")
        await d.until(lambda: "0 missed" in d.text("#title"))

    drive(root, steps)


def _sent(d: Drive) -> str:
    """The whole screen as it goes to the terminal: after the filters of the app."""
    strips = d.app.screen._compositor.render_strips()  # nothing public gives the picture
    for one in d.app.get_line_filters():
        strips = [strip.apply_filter(one, Color(0, 0, 0)) for strip in strips]
    return "".join(strip.text for strip in strips)


def test_ascii_is_all_that_a_plain_terminal_gets(root: Path) -> None:
    async def steps(d: Drive) -> None:
        await d.settled()
        assert _sent(d).isascii()
        await d.sheet("bucket_buffer")
        assert "IC" in _sent(d)
        assert _sent(d).isascii()

    drive(root, steps, plain_signs=True)


def test_conditions_and_budgets_are_changed_through_a_form_and_undone(root: Path) -> None:
    path = root / "biasbook.toml"
    before = path.read_text("utf-8")

    async def steps(d: Drive) -> None:
        await d.settled()
        await d.press("b")
        dialog = d.app.screen
        lines = {one.key: k for k, one in enumerate(entries(d.app.snapshot))}
        for key, text in {"budget.supply_current": "1 nA", "conditions.temperature": "0 °C, 27 °C"}.items():
            dialog.query_one(f"#line-{lines[key]}", Input).value = text
        dialog.query_one(f"#line-{len(lines) - 1}", Input).focus()
        await d.pilot.pause()
        await d.press("enter")
        await d.settled()
        assert "MISSED" in d.text("#budgets")
        assert "18 conditions" in d.text("#title")
        assert 'supply_current = { max = "1 nA" }' in path.read_text("utf-8")
        await d.press("z")
        await d.settled()

    drive(root, steps)
    assert path.read_text("utf-8") == before


@pytest.mark.full
def test_a_condition_that_does_not_exist_never_enters_the_file(root: Path) -> None:
    path = root / "biasbook.toml"
    before = path.read_text("utf-8")

    async def steps(d: Drive) -> None:
        await d.settled()
        await d.press("b")
        dialog = d.app.screen
        lines = [one.key for one in entries(d.app.snapshot)]
        dialog.query_one(f"#line-{lines.index('conditions.process')}", Input).value = "typical, slwo"
        dialog.query_one(f"#line-{len(lines) - 1}", Input).focus()
        await d.pilot.pause()
        await d.press("enter")
        assert "slwo" in d.text("#note")
        assert dialog is d.app.screen

    drive(root, steps)
    assert path.read_text("utf-8") == before


@pytest.mark.full
def test_when_the_folder_is_gone_its_files_are_written_elsewhere(root: Path, tmp_path: Path) -> None:
    files = {path.relative_to(root): path.read_bytes() for path in root.rglob("*.toml")}
    gone, other = tmp_path / "gone", tmp_path / "other"

    async def steps(d: Drive) -> None:
        await d.settled()
        move(root, gone)  # a share that goes away
        await d.until(lambda: d.app.snapshot.away)
        assert len(d.rows()) == len(SHEETS)
        await d.press("w")
        await d.type(str(other))
        await d.press("enter")
        assert "written" in d.text("#said")

    drive(root, steps)
    assert {path.relative_to(other): path.read_bytes() for path in other.rglob("*.toml")} == files


@pytest.mark.full
def test_a_form_that_was_being_filled_at_the_end_is_offered_again(root: Path) -> None:
    typing = terminal(root.parent).state / "typing"
    kept: dict[Path, bytes] = {}

    async def first(d: Drive) -> None:
        await d.settled()
        await d.press("n")
        await d.type("roof_amplifier")
        await d.press("enter")
        await d.type("casc")
        for path in typing.iterdir():
            kept[path] = path.read_bytes()

    async def second(d: Drive) -> None:
        await d.settled()
        await d.until(lambda: isinstance(d.app.screen, AskDialog))
        await d.press("k")
        await d.press("n")
        texts = [one.value for one in d.app.screen.query(Input)]
        assert texts[:2] == ["roof_amplifier", "casc"]
        await d.press("escape")

    async def third(d: Drive) -> None:
        await d.settled()
        assert not isinstance(d.app.screen, AskDialog)

    drive(root, first)
    assert len(kept) == 1
    for path, content in kept.items():  # what a kill leaves: the texts on disk, and nobody holding them
        path.unlink()
        path.with_name(path.name.replace("-", "-00", 1)).write_bytes(content)
    for steps in (second, third):
        drive(root, steps)


def test_a_block_that_another_one_needs_stays_and_says_who_needs_it(root: Path) -> None:
    async def steps(d: Drive) -> None:
        await d.settled()
        needed = next(name for name in d.app.snapshot.names if any(f"{name}." in text for text in texts_of(root, name)))
        assert d.place.ledger.go(f"sheet.{needed}")
        await d.press("x")
        assert d.text("#said").startswith(f"{needed} stays. ")
        assert "uses it" in d.text("#said")
        assert (root / "sheets" / f"{needed}.toml").exists()

    drive(root, steps)


def texts_of(root: Path, name: str) -> list[str]:
    """The other sheets of a book."""
    return [path.read_text("utf-8") for path in (root / "sheets").glob("*.toml") if path.stem != name]


def test_an_unreadable_block_is_counted_and_shows_its_trouble_alone(root: Path) -> None:
    (root / "sheets" / "sun_gate.toml").write_text("garbage[[", "utf-8")

    async def steps(d: Drive) -> None:
        await d.settled()
        await d.until(lambda: "with problems" in d.text("#title"))
        count = len(d.app.snapshot.names)
        assert f"{count} blocks, " in d.text("#title")
        assert "problem" in d.text("#title").split("\n")[1]
        await d.sheet("sun_gate")
        assert "cannot be read" in d.text("#title")
        assert all("garbage" in row or "key" in row for row in d.rows())

    drive(root, steps)


@pytest.mark.full
def test_what_is_typed_outlives_a_file_that_is_spoilt_meanwhile(root: Path) -> None:
    path = root / "sheets" / "sun_gate.toml"
    good = path.read_text("utf-8")

    async def steps(d: Drive) -> None:
        await d.sheet("sun_gate", "choose.bias_current")
        await d.press("enter")
        await d.type("7.5 uA")
        path.write_text("garbage[[", "utf-8")
        await d.until(lambda: not d.app.snapshot.data("sun_gate"))
        assert d.app.screen.query_one(Input).value == "7.5 uA"
        path.write_text(good, "utf-8")
        await d.until(lambda: bool(d.app.snapshot.data("sun_gate")))
        await d.press("enter")
        await d.until(lambda: 'bias_current = "7.5 uA"' in path.read_text("utf-8"))

    drive(root, steps)
