"""A sheet's screen: values changed where they stand, stepped, taken over, added and taken out, each on disk at once."""

from __future__ import annotations

import tomllib
from dataclasses import replace
from pathlib import Path
from typing import Any

import pytest
from textual.widgets import Input

from tests.tui.driving import Drive, drive, shown
from worksheet.tui.dialogs.ask import AskDialog
from worksheet.tui.recompute import Stamped
from worksheet.tui.recomputed import Bounded
from worksheet.tui.widgets.in_place import InPlace
from worksheet.tui.widgets.lines import Lines

NAME = "bucket_buffer"


def _data(root: Path, name: str = NAME) -> dict[str, Any]:
    return tomllib.loads((root / "sheets" / f"{name}.toml").read_text("utf-8"))


def _judged(d: Drive) -> list[str]:
    """The stage and the targets with what is achieved: what the review alone says."""
    rows = d.rows()
    return rows[: next(k for k, row in enumerate(rows) if row.startswith("Choices"))]


def _said(d: Drive) -> str:
    """What stands below the line that is typed in."""
    return " ".join(shown(line) for line in d.app.screen.query_one(InPlace).query_one(Lines).lines)


def test_a_value_is_changed_where_it_stands_and_everything_moves(root: Path) -> None:
    async def steps(d: Drive) -> None:
        await d.sheet(NAME, "choose.bias_current")
        before = _judged(d)
        assert any("IC        0.167" in row for row in before)
        await d.press("enter")
        await d.type("8 uA")
        await d.press("enter")
        assert _data(root)["choose"]["bias_current"] == "8 uA"
        await d.settled()
        assert any("IC        0.333" in row for row in d.rows())  # twice the current, twice the inversion
        await d.press("z")
        await d.settled()
        assert _judged(d) == before

    drive(root, steps)


def test_what_is_wrong_is_said_while_typing_and_never_reaches_the_sheet(root: Path) -> None:
    before = (root / "sheets" / f"{NAME}.toml").read_bytes()

    async def steps(d: Drive) -> None:
        await d.sheet(NAME, "choose.bias_current")
        await d.press("enter")
        await d.type("8 mV")
        assert 'Found "8 mV"' in _said(d)
        await d.press("enter")
        assert d.app.screen.query_one(InPlace).query_one(Input).value == "8 mV"
        assert (root / "sheets" / f"{NAME}.toml").read_bytes() == before
        await d.press("escape")
        assert not d.app.screen.query_one(InPlace).open

    drive(root, steps)
    assert (root / "sheets" / f"{NAME}.toml").read_bytes() == before
    assert list((root.parent / "state" / "typing").iterdir()) == []


@pytest.mark.full
def test_units_choices_and_names_are_completed(root: Path) -> None:
    async def steps(d: Drive) -> None:
        await d.sheet(NAME, "choose.bias_current")
        for typed, whole in (("8 u", "8 uA"), ("2*drip_amplifier.input_c", "2*drip_amplifier.input_capacitance")):
            await d.press("enter")
            await d.type(typed)
            await d.press("tab")
            assert d.app.screen.query_one(InPlace).query_one(Input).value == whole
            await d.press("escape")
        await d.sheet(NAME, "assume.load_capacitance", 1)
        await d.press("enter")
        await d.type("me")
        await d.press("tab", "enter")
        assert _data(root)["assume"]["load_capacitance"]["trust"] == "measured"

    drive(root, steps)


@pytest.mark.full
def test_steps_go_by_grid_finger_and_share_and_come_back(root: Path) -> None:
    async def steps(d: Drive) -> None:
        screen = await d.sheet(NAME, "choose.width")
        for kind, widths, fingers in (
            ("grid", "20.005 um", 4),
            ("finger", "25 um", 5),
            ("20 %", "24 um", 4),
        ):
            screen.step_kind = kind
            await d.press("plus")
            assert (_data(root)["choose"]["width"], _data(root)["choose"]["fingers"]) == (widths, fingers)
            await d.press("minus")
            assert (_data(root)["choose"]["width"], _data(root)["choose"]["fingers"]) == ("20 um", 4)

    drive(root, steps)


def test_the_proposal_is_taken_over_on_the_grid(root: Path) -> None:
    async def steps(d: Drive) -> None:
        await d.sheet("clock_driver", "choose.bias_current")
        app = d.app
        await d.until(lambda: app.needed is not None and app.needed.name == "clock_driver")
        await d.press("p")
        chosen = _data(root, "clock_driver")["choose"]
        assert set(chosen) == {"bias_current", "width", "length"}
        width = float(chosen["width"].split()[0])
        assert abs(width / 0.005 - round(width / 0.005)) < 1e-6
        await d.settled()
        assert "2 met" in d.text("#title")

    drive(root, steps)


def test_a_proposal_for_another_state_is_not_taken_over(root: Path) -> None:
    async def steps(d: Drive) -> None:
        await d.sheet("clock_driver", "choose.bias_current")
        app = d.app
        await d.until(lambda: app.needed is not None and app.needed.name == "clock_driver")
        assert app.needed is not None
        app.needed = replace(app.needed, revision=app.needed.revision - 1)  # as after a step, until it is found anew
        await d.press("p")
        assert "still being worked out" in d.text("#said")

    before = _data(root, "clock_driver")
    drive(root, steps)
    assert _data(root, "clock_driver") == before


@pytest.mark.full
def test_a_target_is_added_through_a_form_that_knows_the_keys(root: Path) -> None:
    async def steps(d: Drive) -> None:
        await d.sheet(NAME, "target.bandwidth")
        await d.press("a", "enter")
        await d.type("slew_rate")
        await d.press("enter")
        await d.type("1 V")
        assert "V/s" in d.text("#note") or "slew" in d.text("#note")
        await d.type("/us")
        for _ in range(7):
            await d.press("enter")
        assert _data(root)["target"]["slew_rate"] == {"min": "1 V/us"}
        await d.settled()
        assert any(row.startswith("slew_rate") and "met" in row for row in d.rows())

    drive(root, steps)


@pytest.mark.full
def test_an_own_name_comes_with_the_formula_that_uses_it(root: Path) -> None:
    async def steps(d: Drive) -> None:
        await d.sheet(NAME, "target.bandwidth")
        await d.press("a")
        await d.type("own")
        await d.press("enter")
        await d.type("wires")
        await d.press("enter")
        await d.type("0.1 pF")
        for _ in range(6):
            await d.press("enter")
        await d.press(*["backspace"] * 40)
        await d.type("assume.load_capacitance")
        await d.press("enter")
        await d.type("12*wires")
        await d.press("enter")
        data = _data(root)
        assert data["own"]["wires"] == "0.1 pF"
        assert data["assume"]["load_capacitance"]["formula"] == "12*wires"
        assert data["assume"]["load_capacitance"]["source"] == "floor plan, rev 3"

    drive(root, steps)


@pytest.mark.full
def test_evidence_carries_the_basis_and_a_waiver_its_target(root: Path) -> None:
    async def steps(d: Drive) -> None:
        await d.sheet("sun_gate", "target.bandwidth")
        await d.press("a")
        await d.type("waiver")
        await d.press("enter", "enter")
        await d.type("A. Lindqvist")
        await d.press("enter")
        await d.type("the cell is slow")
        for _ in range(4):
            await d.press("enter")
        (waiver,) = _data(root, "sun_gate")["waiver"]
        assert waiver == {"target": "bandwidth", "by": "A. Lindqvist", "reason": "the cell is slow"}
        await d.settled()
        assert "1 waived" in d.text("#title")

    drive(root, steps)


@pytest.mark.full
def test_the_condition_of_evidence_is_typed_and_changed_where_it_stands(root: Path) -> None:
    async def steps(d: Drive) -> None:
        screen = await d.sheet(NAME, "target.bandwidth")
        await d.press("a")
        await d.type("evidence")
        await d.press("enter")
        for text in ("", "5 MHz", "", "", "", "", "simulation", "", "", "slow, 350 K, 1.71 V", "", "", ""):
            await d.type(text)
            await d.press("enter")
        evidence = _data(root)["evidence"][1]
        assert evidence["at"] == {"process": "slow", "temperature": "350 K", "supply": "1.71 V"}
        row = next(one for one in screen.ledger.page.rows if one.key == "evidence.1")
        assert any("slow, 350 K, 1.71 V" in shown(one) for one in row.lines)
        place = next(k for k, field in enumerate(row.fields) if field.path[-1] == "at")
        assert screen.ledger.go("evidence.1", place)
        await d.press("enter")
        await d.type("slowly, 350 K, 1.71 V")
        assert "did you mean slow" in _said(d)
        await d.press("home", *["delete"] * 6)
        await d.type("fast")
        await d.press("enter")
        assert _data(root)["evidence"][1]["at"]["process"] == "fast"

    drive(root, steps)


@pytest.mark.full
def test_removing_asks_about_names_that_nothing_would_use(root: Path) -> None:
    async def steps(d: Drive) -> None:
        await d.sheet("wind_cascode", "target.rate_margin")
        await d.press("x")
        assert isinstance(d.app.screen, AskDialog)
        await d.press("y")
        data = _data(root, "wind_cascode")
        assert "rate_margin" not in data["target"]
        assert not data.get("own")
        await d.press("z")
        assert "rate_margin" in _data(root, "wind_cascode")["target"]

    drive(root, steps)


@pytest.mark.full
def test_two_people_at_one_value_are_asked(root: Path) -> None:
    async def steps(d: Drive) -> None:
        await d.sheet(NAME, "choose.bias_current")
        await d.press("enter")
        await d.type("8 uA")
        path = root / "sheets" / f"{NAME}.toml"
        path.write_text(path.read_text("utf-8").replace('"4 uA"', '"6 uA"'), "utf-8")
        await d.press("enter")
        assert isinstance(d.app.screen, AskDialog)
        await d.press("t")
        assert _data(root)["choose"]["bias_current"] == "6 uA"

    drive(root, steps)


@pytest.mark.full
def test_typed_text_survives_the_end_and_is_offered_again(root: Path) -> None:
    async def steps(d: Drive) -> None:
        await d.sheet(NAME, "choose.width")
        await d.press("enter")
        await d.type("33 u")

    drive(root, steps)

    async def again(d: Drive) -> None:
        await d.settled()
        await d.until(lambda: isinstance(d.app.screen, AskDialog))
        await d.press("o")
        app = d.app
        await d.until(lambda: bool(app.screen.query(InPlace)) and app.screen.query_one(InPlace).open)
        assert d.app.screen.query_one(InPlace).query_one(Input).value == "33 u"
        await d.type("m")
        await d.press("enter")
        assert _data(root)["choose"]["width"] == "33 um"

    # The first run ended without giving the text up; its lock goes with its process, which here is this one.
    for path in (root.parent / "state" / "typing").iterdir():
        path.with_name(path.name.replace("-", "-0", 1)).write_bytes(path.read_bytes())
    drive(root, again)


def test_a_book_for_reading_has_no_command_that_writes(root: Path) -> None:
    before = (root / "sheets" / f"{NAME}.toml").read_bytes()

    async def steps(d: Drive) -> None:
        await d.sheet(NAME, "choose.bias_current")
        await d.press("enter", "plus", "x", "a", "p")
        assert not d.app.screen.query_one(InPlace).open
        assert "reading only" in d.text("#title")
        assert "Edit" not in d.text("#foot")

    drive(root, steps, read_only=True)
    assert (root / "sheets" / f"{NAME}.toml").read_bytes() == before


@pytest.mark.full
def test_help_of_a_field_comes_from_its_own_description(root: Path) -> None:
    async def steps(d: Drive) -> None:
        seen = []
        for row in ("choose.bias_current", "choose.width", "assume.input_level", "target.bandwidth"):
            await d.sheet(NAME, row)
            await d.press("question_mark")
            seen.append("\n".join(d.rows()).partition("Keys:")[0])
            await d.press("escape")
        assert len(set(seen)) == len(seen)
        assert "current source sets" in " ".join(seen[0].split())

    drive(root, steps)


def test_a_number_is_followed_to_what_moves_it_and_back(root: Path) -> None:
    async def steps(d: Drive) -> None:
        await d.sheet(NAME, "target.bandwidth")
        await d.press("w")
        screen = d.place
        await d.until(lambda: any("choose.bias_current" in row for row in d.rows()))
        assert screen.ledger.go("fragile.bandwidth.choose.bias_current")
        await d.press("enter")
        assert "bias_current < bandwidth" in d.text("#title")
        await d.press("escape")
        assert "bias_current <" not in d.text("#title")
        await d.press("escape")
        assert d.app.screen.query(InPlace)

    drive(root, steps)


@pytest.mark.full
def test_the_algebra_of_a_bound_comes_once_the_sheet_stands_still(root: Path) -> None:
    async def steps(d: Drive) -> None:
        await d.sheet(NAME, "target.power")
        assert not any("I ≤ power/supply" in row for row in d.rows())
        await d.until(lambda: any("I ≤ power/supply" in row for row in d.rows()))
        await d.press("w")
        await d.until(lambda: any("I ≤ power/supply" in row for row in d.rows()))

    drive(root, steps)


@pytest.mark.full
def test_every_size_shows_the_sheet(root: Path) -> None:
    for size in ((60, 15), (80, 24), (120, 40), (250, 80)):

        async def steps(d: Drive) -> None:
            await d.sheet(NAME, "choose.bias_current")
            assert any("bandwidth" in row for row in d.rows())
            await d.press("enter")
            region = d.app.screen.query_one(InPlace).region
            assert region.width >= 40
            assert d.app.screen.region.contains_region(region)

        drive(root, steps, size=size)


def test_windows_follow_a_step_before_the_proposal_does(root: Path) -> None:
    """The windows of another revision, or of another sheet, are never shown."""

    async def steps(d: Drive) -> None:
        app = d.app
        await d.sheet(NAME)
        await d.until(lambda: app.needed is not None and app.needed.revision == app.snapshot.revision)
        before = app.needed
        assert before is not None
        assert before.solved is not None
        for revision, name, taken in (
            (app.snapshot.revision - 1, NAME, False),
            (app.snapshot.revision, "sun_gate", False),
            (app.snapshot.revision, NAME, True),
        ):
            app.post_message(app.Windows(Stamped(revision, Bounded(name, {}))))
            await d.pilot.pause()
            assert app.needed is not None
            assert app.needed.solved is not None
            assert (app.needed.solved.needed == {}) == taken
            assert any("needed ≥" in row for row in d.rows()) != taken
            assert app.needed.proposal == before.proposal

    drive(root, steps)
