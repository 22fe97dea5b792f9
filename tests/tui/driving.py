"""Drives the real app without a terminal: keys in, state and rows out."""

from __future__ import annotations

import asyncio
from collections.abc import Awaitable, Callable
from pathlib import Path

from textual.pilot import Pilot

from worksheet.session.session import Session
from worksheet.tui.app import BookApp
from worksheet.tui.rows import Line
from worksheet.tui.screens.place import Place
from worksheet.tui.screens.sheet import SheetScreen
from worksheet.tui.terminal import Terminal
from worksheet.tui.widgets.ledger import Ledger
from worksheet.tui.widgets.lines import Lines

Steps = Callable[["Drive"], Awaitable[None]]
_PATIENCE = 30.0


class Drive:
    """One run of the app in a test."""

    def __init__(self, app: BookApp, pilot: Pilot[int]) -> None:
        self.app, self.pilot = app, pilot

    async def press(self, *keys: str) -> None:
        """Press keys and let the screen follow."""
        await self.pilot.press(*keys)
        await self.pilot.pause()

    async def type(self, text: str) -> None:
        """Type a text."""
        await self.press(*("space" if c == " " else c for c in text))

    async def until(self, holds: Callable[[], bool]) -> None:
        """Wait for something that a worker brings."""
        end = asyncio.get_running_loop().time() + _PATIENCE
        while not holds():
            assert asyncio.get_running_loop().time() < end, "it never came"
            await self.pilot.pause(0.02)
        await self.pilot.pause()

    async def settled(self) -> None:
        """Wait until the results on the screen are those of the book as it stands."""
        app = self.app
        await self.until(lambda: app.results is not None and app.results.revision == app.snapshot.revision)

    async def sheet(self, name: str, row: str = "", field: int = 0) -> SheetScreen:
        """Open a sheet and put the cursor on a row of it."""
        self.app.open_sheet(name)
        await self.pilot.pause()
        await self.settled()
        screen = self.app.screen
        assert isinstance(screen, SheetScreen)
        if row:
            assert screen.ledger.go(row, field), [one.key for one in screen.ledger.page.rows]
            await self.pilot.pause()
        return screen

    @property
    def place(self) -> Place:
        """The screen in front."""
        assert isinstance(self.app.screen, Place), self.app.screen
        return self.app.screen

    def text(self, selector: str) -> str:
        """What lines of the screen say."""
        return "\n".join(map(shown, self.app.screen.query_one(selector, Lines).lines))

    def rows(self) -> list[str]:
        """What the page says, line by line."""
        ledger = self.app.screen.query(Ledger).first()
        return [shown(line) for row in ledger.page.rows for line in row.lines]


def shown(line: Line) -> str:
    """A line as the terminal shows it."""
    return "".join(span.shown for span in line).rstrip()


def terminal(folder: Path, *, plain_signs: bool = False, few_colours: bool = False) -> Terminal:
    """A terminal of a test, with folders of its own."""
    return Terminal(plain_signs, few_colours, False, folder / "configuration", folder / "state")


def drive(
    root: Path,
    steps: Steps,
    *,
    size: tuple[int, int] = (80, 24),
    read_only: bool = False,
    plain_signs: bool = False,
) -> BookApp:
    """Run the app over a project and take the steps in it."""
    app = BookApp(Session(root, read_only=read_only), terminal(root.parent, plain_signs=plain_signs))

    async def run() -> None:
        async with app.run_test(size=size) as pilot:
            await steps(Drive(app, pilot))

    asyncio.run(run())
    return app
