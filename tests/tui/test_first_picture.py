"""The first picture: what the project's screen then shows, made beside it, kept for the same bytes only."""

from __future__ import annotations

import asyncio
import datetime
import json
import os
import subprocess
import sys
import threading
from dataclasses import replace
from pathlib import Path

import pytest
from textual.geometry import Size

from tests.paths import TOP
from tests.tui.driving import Drive, drive, terminal
from worksheet.session.session import Session
from worksheet.tui import first_picture
from worksheet.tui.app import BookApp
from worksheet.tui.first_picture import Picture, Wanted
from worksheet.tui.screens.book import BookScreen
from worksheet.tui.screens.first import FirstScreen
from worksheet.tui.screens.sheet import SheetScreen


def wanted(root: Path) -> Wanted:
    return Wanted(root, (80, 24), False, terminal(root.parent))


def texts(picture: Picture, part: str) -> list[str]:
    return ["".join(text for text, _ in line).rstrip() for line in picture[part]]


def test_it_is_what_the_screen_then_shows(root: Path) -> None:
    picture = first_picture.make(wanted(root))

    async def steps(d: Drive) -> None:
        await d.settled()
        for part in ("title", "heading", "detail", "budgets"):
            assert texts(picture, part) == d.text(f"#{part}").split("\n")
        assert [one[2:] for one in texts(picture, "blocks")] == d.rows()

    drive(root, steps)


def taken(asked: Wanted) -> Picture | None:
    """The picture as `begin` hands it over."""
    found: list[Picture] = []
    done = threading.Event()

    def tell(picture: Picture) -> None:
        found.append(picture)
        done.set()

    first_picture.begin(asked, tell)
    done.wait(30)
    return found[0] if found else None


def test_a_copy_makes_it_and_keeps_it_for_the_same_bytes(root: Path) -> None:
    asked = wanted(root)
    made = taken(asked)
    assert made is not None
    assert any("sun_gate" in one for one in texts(made, "blocks"))
    for _ in range(200):
        if asked.kept.exists():
            break
        threading.Event().wait(0.05)
    assert asked.key() == asked.key()
    kept = first_picture._kept(asked, asked.key())
    assert kept == made


def test_leaving_keeps_what_the_book_looks_like_after_its_edits(root: Path) -> None:
    asked = wanted(root)

    async def steps(d: Drive) -> None:
        await d.sheet("sun_gate", "choose.bias_current")
        await d.press("plus")
        await d.settled()
        shown = d.app.shown()
        assert shown is not None
        first_picture.keep(asked, *shown)

    drive(root, steps)
    kept = first_picture._kept(asked, asked.key())
    assert kept == first_picture.make(asked)
    sheet = root / "sheets" / "sun_gate.toml"
    before = asked.kept.read_bytes()
    sheet.write_bytes(sheet.read_bytes() + b"\n")
    first_picture.keep(asked, {}, {})
    assert asked.kept.read_bytes() == before, "other files than those on the disk are no picture of it"


def test_the_terminal_and_the_toolkit_mean_the_same_size(root: Path) -> None:
    one = wanted(root)
    sizes = (os.terminal_size((80, 24)), Size(80, 24))
    assert {replace(one, size=size).key() for size in sizes} == {one.key()}


def test_the_day_matters_only_where_a_waiver_ends(root: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    asked = wanted(root)
    for path in (root / "sheets").iterdir():
        path.write_text(path.read_text("utf-8").replace("until", "# til"), "utf-8")
    plain = asked.key()
    monkeypatch.setattr(first_picture, "_today", lambda: datetime.date(2031, 1, 1))
    assert asked.key() == plain
    (root / "sheets" / "sun_gate.toml").write_text("# until\n", "utf-8")
    on_that_day = asked.key()
    monkeypatch.setattr(first_picture, "_today", lambda: datetime.date(2031, 1, 2))
    assert asked.key() != on_that_day


def test_other_bytes_other_sizes_and_other_signs_are_other_pictures(root: Path) -> None:
    one = wanted(root)
    keys = {
        one.key(),
        replace(one, size=(120, 40)).key(),
        replace(one, read_only=True).key(),
        replace(one, terminal=terminal(root.parent, plain_signs=True)).key(),
    }
    assert len(keys) == 4
    sheet = root / "sheets" / "sun_gate.toml"
    sheet.write_bytes(sheet.read_bytes() + b"\n")
    assert one.key() not in keys


def test_what_is_kept_is_not_believed_blindly(root: Path) -> None:
    asked = wanted(root)
    asked.kept.parent.mkdir(parents=True)
    half = json.dumps({"key": asked.key(), "picture": {"title": 3}})
    for content in ("", "{", "[]", half, '{"key": "other"}'):
        asked.kept.write_text(content, "utf-8")
        assert first_picture._kept(asked, asked.key()) is None


def test_a_project_that_cannot_be_read_has_a_picture_too(root: Path) -> None:
    (root / "biasbook.toml").write_text("schema = 1\n[", "utf-8")
    picture = first_picture.make(wanted(root))
    assert any("cannot be read" in one for one in texts(picture, "title"))


def test_keys_pressed_before_the_screens_are_loaded_reach_them(root: Path) -> None:
    picture = first_picture.make(wanted(root))
    held = threading.Event()

    def opener() -> Session:
        held.wait(30)
        return Session(root)

    app = BookApp(opener, terminal(root.parent))
    app.first_picture = lambda: picture

    async def run() -> None:
        async with app.run_test(size=(80, 24)) as pilot:
            await pilot.pause()
            assert isinstance(app.screen, FirstScreen)
            assert "bucket_buffer" in "".join(texts(picture, "blocks"))
            await pilot.press("down", "enter")
            held.set()
            for _ in range(600):
                await pilot.pause(0.02)
                if isinstance(app.screen, SheetScreen):
                    break
            assert isinstance(app.screen, SheetScreen)
            assert app.screen.name_of_sheet == "clock_driver"
            assert any(isinstance(one, BookScreen) for one in app.screen_stack)

    asyncio.run(run())


def test_a_book_that_cannot_be_opened_ends_the_app_with_its_fault(root: Path) -> None:
    def opener() -> Session:
        raise RuntimeError("no such luck")

    app = BookApp(opener, terminal(root.parent))

    async def run() -> None:
        async with app.run_test(size=(80, 24)) as pilot:
            await pilot.pause(2.0)

    with pytest.raises(RuntimeError, match="no such luck"):
        asyncio.run(run())
    assert isinstance(app.fault, RuntimeError)


def test_nothing_that_computes_is_loaded_before_it() -> None:
    code = (
        "import sys, worksheet.tui.start, worksheet.tui.app, worksheet.tui.screens.first;"
        "print(sorted({'numpy', 'sympy', 'scipy', 'tomlkit', 'matplotlib'} & set(sys.modules)))"
    )
    done = subprocess.run(
        [sys.executable, "-c", code], cwd=TOP, capture_output=True, text=True, check=True, env=os.environ
    )
    assert done.stdout.strip() == "[]"
