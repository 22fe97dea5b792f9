"""What is shown until the screens proper are loaded: the first picture; keys pressed meanwhile are kept."""

from __future__ import annotations

from collections.abc import Callable

from textual import events
from textual.app import ComposeResult
from textual.message import Message
from textual.screen import Screen

from worksheet.tui.first_picture import Picture
from worksheet.tui.rows import QUIET, Line, Span
from worksheet.tui.widgets.lines import Lines

_PARTS = {"title": "title", "heading": "heading", "blocks": "body", "detail": "detail", "budgets": "budgets"}
"""Part of the picture and the widget of the project's screen that will stand there."""


class FirstScreen(Screen[None]):
    """The book at a glance, before anything can be done with it."""

    class Shown(Message):
        """The picture has been drawn."""

    def __init__(self, made: Callable[[], Picture | None]) -> None:
        """Take what gives the picture, where it is made already."""
        super().__init__()
        self._made = made
        self.pressed: list[str] = []

    def compose(self) -> ComposeResult:
        """The parts of the project's screen, in its order."""
        yield Lines([(Span("reading...", QUIET),)], id="title")
        for part in ("heading", "body", "detail", "budgets", "said", "foot"):
            yield Lines([()], id=part)

    def on_mount(self) -> None:
        """Show what is there."""
        picture = self._made()
        if picture is not None:
            self.show_picture(picture)

    def show_picture(self, picture: Picture) -> None:
        """Show what has been made."""
        for part, widget in _PARTS.items():
            lines: list[Line] = [tuple(Span(text, role) for text, role in line) for line in picture[part]]
            self.query_one(f"#{widget}", Lines).show(lines)
        self.call_after_refresh(self.post_message, self.Shown())

    def on_key(self, event: events.Key) -> None:
        """Keep it for the screen that comes."""
        event.stop()
        self.pressed.append(event.key)
