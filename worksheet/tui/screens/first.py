"""What is shown until the screens proper are loaded: the first picture; keys pressed meanwhile are kept."""

from __future__ import annotations

from textual import events
from textual.app import ComposeResult
from textual.screen import Screen

from worksheet.tui.first_picture import Picture
from worksheet.tui.rows import QUIET, Line, Span
from worksheet.tui.widgets.lines import Lines

_PARTS = {"title": "title", "heading": "heading", "blocks": "body", "detail": "detail", "budgets": "budgets"}
"""Part of the picture and the widget of the project's screen that will stand there."""


class FirstScreen(Screen[None]):
    """The book at a glance, before anything can be done with it."""

    def __init__(self, picture: Picture | None = None) -> None:
        """Take the picture, where it is there already."""
        super().__init__()
        self._picture = picture
        self.pressed: list[str] = []

    def compose(self) -> ComposeResult:
        """The parts of the project's screen, in its order."""
        yield Lines([(Span("reading...", QUIET),)], id="title")
        for part in ("heading", "body", "detail", "budgets", "said", "foot"):
            yield Lines([()], id=part)

    def on_mount(self) -> None:
        """Show what is there."""
        if self._picture is not None:
            self.show_picture(self._picture)

    def show_picture(self, picture: Picture) -> None:
        """Show what has been made."""
        for part, widget in _PARTS.items():
            lines: list[Line] = [tuple(Span(text, role) for text, role in line) for line in picture[part]]
            self.query_one(f"#{widget}", Lines).show(lines)

    def on_key(self, event: events.Key) -> None:
        """Keep it for the screen that comes."""
        event.stop()
        self.pressed.append(event.key)
