"""The start: what the terminal can do, the book read while the toolkit loads, the guard, the app, and how it ended.

Before the first picture nothing is imported but the toolkit, numpy and the standard library; reading and reviewing the
book runs beside the import of the toolkit, so that the first picture shows every block with its verdict.
"""

from __future__ import annotations

import os
import sys
import threading
import traceback
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING, Any

from worksheet.tui.terminal import Terminal, refusal, terminal

if TYPE_CHECKING:
    from worksheet.session.session import Session
    from worksheet.tui.app import BookApp
    from worksheet.tui.guard import Guard
    from worksheet.tui.recomputed import Results

REFUSED = 2
FAULT = 70
"""Exit status after a fault of the program's own (EX_SOFTWARE of sysexits)."""

REPORT = "last-fault.txt"
"""In the folder of what is remembered between runs: what happened when the program stopped by itself."""

_WAIT = 0.3
"""Longest that the first picture waits for results. [s]"""


@dataclass
class _Opening:
    """The book, read and reviewed in a thread of its own."""

    root: Path
    read_only: bool
    session: Session | None = None
    results: Results | None = None
    error: Exception | None = None

    def begin(self) -> threading.Thread:
        """Start to read."""
        thread = threading.Thread(target=self._run, name="opening", daemon=True)
        thread.start()
        return thread

    def _run(self) -> None:
        try:
            from worksheet.session.session import Session
            from worksheet.tui.recomputed import review_of, today

            session = Session(self.root, read_only=self.read_only)
            self.session = session
            self.results = review_of(session, session.snapshot(), today())
        except Exception as error:  # noqa: BLE001 - raised again by whoever waits for the book
            self.error = error


def start(root: Path, *, read_only: bool) -> int:
    """Open a project in the terminal; see app.run."""
    refused = refusal()
    if refused is not None:
        return _tell(refused, REFUSED)
    os.environ.setdefault("TEXTUAL_FPS", "120")  # read when the toolkit is imported: halves the wait for the last cell
    os.environ.setdefault("TEXTUAL_ANIMATIONS", "none")
    surroundings = terminal()
    opening = _Opening(root, read_only)
    thread = opening.begin()
    from worksheet.tui.guard import Guard

    guard = Guard()
    app: BookApp | None = None
    guard.start()
    try:
        app = _app(opening, thread, surroundings, guard)
        status = app.run(mouse=False)
        fault = app.fault
    except Exception as error:  # noqa: BLE001 - whatever it is, the user gets one sentence and his terminal back
        status, fault = None, error
    finally:
        guard.stop()
    if fault is not None:
        guard.restore()
        return _faulted(fault, surroundings)
    return status or 0


def _app(opening: _Opening, thread: threading.Thread, surroundings: Terminal, guard: Guard) -> BookApp:
    """The app with the book in it; with its results where they are there in time."""
    from worksheet.tui.app import BookApp

    while opening.session is None and opening.error is None:
        thread.join(0.01)
    thread.join(_WAIT)
    if opening.error is not None:
        raise opening.error
    assert opening.session is not None  # there is one, or there is an error
    return BookApp(opening.session, surroundings, guard, results=opening.results, driver_class=_driver(surroundings))


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
