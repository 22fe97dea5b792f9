"""Texts that an earlier run was typing when its end came: offered once, taken over by the user or given up."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING

from worksheet.session.recovery import Left
from worksheet.tui.dialogs.form import FORM

if TYPE_CHECKING:
    from worksheet.tui.app import BookApp


def offer(app: BookApp, left: Sequence[Left]) -> None:
    """Ask what to do with the first of them; the others follow."""
    from worksheet.tui.dialogs.ask import AskDialog

    one, rest = left[0], left[1:]
    typing = one.typing
    if typing.path.startswith(FORM):
        _offer_form(app, left)
        return
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


def _offer_form(app: BookApp, left: Sequence[Left]) -> None:
    """Ask about all lines of the form that the first text stood in; the others follow."""
    from worksheet.tui.dialogs.ask import AskDialog

    form = _form_of(left[0])
    mine = [one for one in left if _form_of(one) == form]
    rest = [one for one in left if _form_of(one) != form]
    texts = "; ".join(f"{one.typing.title}: {one.typing.text}" for one in mine)
    said = f'When the program ended, this was being typed into "{form}": {texts}'
    answers = {"k": "keep it: it stands there when that form is opened again", "f": "forget it"}

    def done(letter: str | None) -> None:
        if letter is not None:
            for one in mine:
                one.forget()
        if letter == "k":
            app.left_in_forms[form] = {one.typing.path.rpartition(":")[2]: one.typing.text for one in mine}
        if rest:
            offer(app, rest)

    app.push_screen(AskDialog("Left from last time", said, answers, app.signs), done)


def _form_of(one: Left) -> str:
    """The title of the form that a text stood in, "" where it stood in none."""
    path = one.typing.path
    return path.removeprefix(FORM).rpartition(":")[0] if path.startswith(FORM) else ""


def _resume(app: BookApp, path: str, text: str) -> None:
    from worksheet.tui.screens.sheet import SheetScreen

    if isinstance(app.screen, SheetScreen):
        app.screen.resume_typing(path, text)
