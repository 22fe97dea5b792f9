"""A revision beside the files in the app: what differs, taken back and undone; values and metrics over revisions."""

from __future__ import annotations

import datetime
from pathlib import Path

import pytest

from tests.history.repositories import git, signed
from tests.tui.driving import Drive, drive, shown
from worksheet.model.problem import Problem
from worksheet.session import revisions
from worksheet.session.workbook import Workbook
from worksheet.tui.dialogs.reading import ReadingDialog
from worksheet.tui.screens.compare import CompareScreen
from worksheet.tui.screens.sheet import SheetScreen
from worksheet.tui.widgets.ledger import Ledger

TODAY = datetime.datetime.now().astimezone().date()
BLOCK = "sun_gate"


@pytest.fixture(autouse=True)
def recorded(root: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    """The book with one revision, and one value moved since."""
    signed(monkeypatch, tmp_path)
    assert not isinstance(revisions.record(root, "First", TODAY), Problem)
    path = root / "sheets" / f"{BLOCK}.toml"
    path.write_text(path.read_text("utf-8").replace('bias_current = "2 uA"', 'bias_current = "3 uA"'), "utf-8")
    return path


async def comparing(d: Drive) -> CompareScreen:
    await d.settled()
    await d.press("e", "enter")
    screen = d.app.screen
    assert isinstance(screen, CompareScreen)
    await d.until(lambda: screen.laid is not None)
    return screen


async def again(d: Drive, screen: CompareScreen, before: object) -> None:
    """Wait until the comparison is another one than before."""
    await d.until(lambda: screen.laid is not None and screen.laid is not before)


def test_what_differs_stands_sheet_by_sheet_and_opens_there(root: Path) -> None:
    async def steps(d: Drive) -> None:
        screen = await comparing(d)
        assert screen.ledger.go(f"input.{BLOCK}.choose.bias_current")
        assert screen.ledger.row is not None
        assert "2 µA" in shown(screen.ledger.row.lines[0])
        assert any(row.startswith("bandwidth") for row in d.rows())
        await d.press("enter")
        assert isinstance(d.app.screen, SheetScreen)
        assert d.app.screen.ledger.row is not None
        assert d.app.screen.ledger.row.key == "choose.bias_current"

    drive(root, steps)


@pytest.mark.parametrize("letter", ["v", *(pytest.param(one, marks=pytest.mark.full) for one in "sp")])
def test_a_value_a_sheet_or_the_project_is_taken_back_and_undone(root: Path, recorded: Path, letter: str) -> None:
    moved = recorded.read_text("utf-8")
    then = git(root, "show", f"HEAD:sheets/{BLOCK}.toml") + "\n"

    def now() -> str:
        return recorded.read_text("utf-8")

    async def steps(d: Drive) -> None:
        screen = await comparing(d)
        assert screen.ledger.go(f"input.{BLOCK}.choose.bias_current")
        before = screen.laid
        await d.press("r", letter)
        await again(d, screen, before)
        assert now() == then
        assert d.rows() == ["Nothing differs."]
        before = screen.laid
        await d.press("z")
        await again(d, screen, before)
        assert now() == moved

    drive(root, steps)


@pytest.mark.full
def test_a_value_and_a_metric_are_followed_over_the_revisions(root: Path) -> None:
    async def steps(d: Drive) -> None:
        screen = await comparing(d)
        assert screen.ledger.go(f"input.{BLOCK}.choose.bias_current")
        await d.press("h")
        await d.until(lambda: isinstance(d.app.screen, ReadingDialog))
        text = "\n".join(shown(line) for row in d.app.screen.query_one(Ledger).page.rows for line in row.lines)
        assert "2 µA" in text
        assert "First" in text
        await d.press("escape")
        await d.sheet(BLOCK, "target.bandwidth")
        await d.press("h")
        await d.until(lambda: isinstance(d.app.screen, ReadingDialog))

    drive(root, steps)


def test_a_revision_is_recorded_with_a_note(root: Path) -> None:
    async def steps(d: Drive) -> None:
        await d.settled()
        await d.press("s")
        await d.type("Three microamperes")
        await d.press("enter")
        await d.until(lambda: "recorded" in d.text("#said"))

    drive(root, steps)
    assert git(root, "log", "-1", "--format=%s") == "Three microamperes"
    assert "choose.bias_current" in git(root, "log", "-1", "--format=%b")


def other_states(root: Path, recorded: Path) -> None:
    """A second revision, and a branch with a third one."""
    assert not isinstance(revisions.record(root, "Second", TODAY), Problem)
    git(root, "checkout", "-q", "-b", "wider")
    text = recorded.read_text("utf-8").replace('bias_current = "3 uA"', 'bias_current = "5 uA"')
    recorded.write_text(text, "utf-8")
    assert not isinstance(revisions.record(root, "Third", TODAY), Problem)
    git(root, "checkout", "-q", "-")


@pytest.mark.full
def test_any_two_states_are_compared_branches_among_them(root: Path, recorded: Path) -> None:
    other_states(root, recorded)

    async def steps(d: Drive) -> None:
        await d.settled()
        await d.press("e", "down", "enter")
        screen = d.app.screen
        assert isinstance(screen, CompareScreen)
        await d.until(lambda: screen.laid is not None)
        assert "First -> as it stands" in d.text("#title")
        await d.press("n")
        await d.type("wider")
        await d.press("enter")
        await d.until(lambda: screen.laid is not None and screen.new.revision == "wider")
        assert screen.ledger.go(f"input.{BLOCK}.choose.bias_current")
        assert [screen.ledger.row.copied] == [("choose.bias_current", "2 µA", "5 µA")]  # type: ignore[union-attr]
        await d.press("b")
        await d.type("second")
        await d.press("enter")
        await d.until(lambda: screen.laid is not None and screen.old.note == "Second")
        assert screen.ledger.go(f"input.{BLOCK}.choose.bias_current")
        assert [screen.ledger.row.copied] == [("choose.bias_current", "3 µA", "5 µA")]  # type: ignore[union-attr]

    drive(root, steps)


def test_parts_close_and_open_and_all_stands_in_one_list(root: Path) -> None:
    async def steps(d: Drive) -> None:
        screen = await comparing(d)
        whole = d.rows()
        await d.press("tab")
        heads = d.rows()
        assert heads
        assert all(row.startswith("+ ") and "value" in row for row in heads)
        assert screen.ledger.go(f"part.{BLOCK}")
        await d.press("enter")
        assert any(row.startswith("choose.bias_current") for row in d.rows())
        assert len(heads) < len(d.rows())
        await d.press("tab", "tab")
        assert d.rows() == whole
        await d.press("i")
        listed = [row.key for row in screen.ledger.page.rows]
        assert listed.index(f"input.{BLOCK}.choose.bias_current") < listed.index(f"result.{BLOCK}.slew_rate")
        found = screen.laid
        assert found is not None
        assert len(listed) == sum(
            len(one.inputs) + len(one.results) + len(one.needed) for one in found.found.sheets
        ) + len(found.found.project) + len(found.found.process)
        assert screen.ledger.go(f"result.{BLOCK}.bandwidth")
        await d.press("enter")
        assert isinstance(d.app.screen, SheetScreen)
        assert d.app.screen.ledger.row is not None
        assert d.app.screen.ledger.row.key == "target.bandwidth"

    drive(root, steps)


def test_what_moved_since_an_acceptance_is_shown_on_the_sheet(root: Path, recorded: Path) -> None:
    text = recorded.read_text("utf-8")
    (now,) = (one.basis for one in Workbook.read(root).review(TODAY).sheets if one.sheet.name == BLOCK)
    text = (
        text.replace("schema = 1", 'schema = 1\nstate = "accepted"')
        + f'\n[[acceptance]]\nby = "M. Roe"\nbasis = "{now}"\n'
    )
    recorded.write_text(text, "utf-8")
    assert not isinstance(revisions.record(root, "Accepted", TODAY), Problem)
    recorded.write_text(text.replace('bias_current = "3 uA"', 'bias_current = "4 uA"'), "utf-8")

    async def steps(d: Drive) -> None:
        await d.sheet(BLOCK)
        await d.settled()
        await d.press("j")
        await d.until(lambda: isinstance(d.app.screen, ReadingDialog))
        shown_text = " ".join(
            shown(line).strip() for row in d.app.screen.query_one(Ledger).page.rows for line in row.lines
        )
        assert "accepted by M. Roe: since" in shown_text
        assert "choose.bias_current: 3 µA -> 4 µA" in shown_text

    drive(root, steps)
