"""Texts that an earlier run was typing when its end came: offered once, taken over by the user or given up."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING

from worksheet.session.recovery import Left

if TYPE_CHECKING:
    from worksheet.tui.app import BookApp


def offer(app: BookApp, left: Sequence[Left]) -> None:
    """Ask what to do with the first of them; the others follow."""
    from worksheet.tui.dialogs.ask import AskDialog

    one, rest = left[0], left[1:]
    typing = one.typing
    said = f'When the program ended, this was being typed at {typing.title} of {typing.sheet}: "{typing.text}"'
    answers = {"o": "open it there again", "f": "forget it"}

    def done(letter: str | None) -> None:
        if letter == "o":
            one.forget()
            app.open_sheet(typing.sheet)
            app.call_after_refresh(_resume, app, typing.path, typing.text)
        elif letter == "f":
            one.forget()
        if letter != "o" and rest:
            offer(app, rest)

    app.push_screen(AskDialog("Left from last time", said, answers, app.signs), done)


def _resume(app: BookApp, path: str, text: str) -> None:
    from worksheet.tui.screens.sheet import SheetScreen

    if isinstance(app.screen, SheetScreen):
        app.screen.resume_typing(path, text)
