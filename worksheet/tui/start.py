"""The start: what the terminal can do, the first picture, the guard, the app, and how it ended.

Before the first picture this process imports the toolkit and the standard library alone; what computes is loaded
behind it, and in the copy that makes the picture.
"""

from __future__ import annotations

import os
import sys
import traceback
from pathlib import Path
from typing import TYPE_CHECKING, Any

from worksheet.tui import first_picture
from worksheet.tui.first_picture import Picture, Wanted
from worksheet.tui.terminal import Terminal, refusal, terminal

if TYPE_CHECKING:
    from worksheet.session.session import Session
    from worksheet.tui.app import BookApp
    from worksheet.tui.guard import Guard

REFUSED = 2
FAULT = 70
"""Exit status after a fault of the program's own (EX_SOFTWARE of sysexits)."""

REPORT = "last-fault.txt"
"""In the folder of what is remembered between runs: what happened when the program stopped by itself."""


def start(root: Path, *, read_only: bool) -> int:
    """Open a project in the terminal; see app.run."""
    refused = refusal()
    if refused is not None:
        return _tell(refused, REFUSED)
    os.environ.setdefault("TEXTUAL_FPS", "120")  # read when the toolkit is imported: halves the wait for the last cell
    os.environ.setdefault("TEXTUAL_ANIMATIONS", "none")
    surroundings = terminal()
    first = _First()
    first_picture.begin(Wanted(root, os.get_terminal_size(0), read_only, surroundings), first.made)
    from worksheet.tui.guard import Guard

    guard = Guard()
    guard.start()
    try:
        app = _app(root, surroundings, guard, read_only=read_only)
        first.show_on(app)
        status = app.run(mouse=False)
        fault = app.fault
        shown = app.shown()
    except Exception as error:  # noqa: BLE001 - whatever it is, the user gets one sentence and his terminal back
        status, fault, shown = None, error, None
    finally:
        guard.stop()
    if fault is not None:
        guard.restore()
        return _faulted(fault, surroundings)
    if shown is not None:
        first_picture.keep(Wanted(root, app.size, read_only, surroundings), *shown)
    return status or 0


class _First:
    """The first picture on its way from the thread that took it to the app, whichever is there first."""

    def __init__(self) -> None:
        self._picture: Picture | None = None
        self._app: BookApp | None = None

    def made(self, picture: Picture) -> None:
        """It is made; in any thread."""
        self._picture = picture
        if self._app is not None and self._app.is_running:
            self._app.post_message(self._app.Pictured(picture))

    def show_on(self, app: BookApp) -> None:
        """The app is there."""
        self._app = app
        app.first_picture = lambda: self._picture


def _app(root: Path, surroundings: Terminal, guard: Guard, *, read_only: bool) -> BookApp:
    from worksheet.tui.app import BookApp

    def opener() -> Session:
        from worksheet.session.session import Session

        return Session(root, read_only=read_only)

    return BookApp(opener, surroundings, guard, driver_class=_driver(surroundings))


def _driver(surroundings: Terminal) -> Any:
    """The driver that sends changed cells only, where it was asked for; else the toolkit's own."""
    if not surroundings.cell_driver:
        return None
    from worksheet.tui.driver import CellDriver

    return CellDriver


def _faulted(error: BaseException, surroundings: Terminal) -> int:
    """One sentence for the user; the rest goes into a file."""
    path = surroundings.state / REPORT
    kept = f"; what happened is written in {path}"
    try:
        surroundings.state.mkdir(parents=True, exist_ok=True)
        path.write_text("".join(traceback.format_exception(error)), "utf-8", "replace")
    except OSError:
        kept = ""
    said = f"stopped on a fault of its own ({type(error).__name__}); every accepted change is on disk{kept}"
    return _tell(said, FAULT)


def _tell(text: str, status: int) -> int:
    """The app's own voice where it has no screen."""
    sys.stderr.write(f"biasbook: {text}\n")
    return status
