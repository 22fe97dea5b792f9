"""Text to read: help, problems, what a message has no room for."""

from __future__ import annotations

from collections.abc import Sequence
from typing import ClassVar

from textual.app import ComposeResult
from textual.binding import Binding, BindingType
from textual.containers import Vertical

from worksheet.report.table import wrapped
from worksheet.tui.dialogs.dialog import Dialog
from worksheet.tui.rows import HEAD, PLAIN, QUIET, Page, Row, Span, line
from worksheet.tui.signs import Signs
from worksheet.tui.widgets.ledger import Ledger
from worksheet.tui.widgets.lines import Lines


class ReadingDialog(Dialog[None]):
    """Shows paragraphs; one that starts with "# " is a heading."""

    BINDINGS: ClassVar[list[BindingType]] = [Binding("enter,q,question_mark", "leave", show=False)]

    def __init__(self, title: str, paragraphs: Sequence[str], signs: Signs) -> None:
        """Take paragraphs of text that need not be harmless yet."""
        super().__init__(title, signs)
        self._paragraphs = tuple(paragraphs)

    def compose(self) -> ComposeResult:
        """A title, the text, the way out."""
        with Vertical(classes="dialog"):
            yield Lines([(Span(self.heading, HEAD),)])
            yield Ledger(self.signs.pointer)
            yield Lines([(Span("esc goes back", QUIET),)])

    def on_mount(self) -> None:
        """The text, broken to the width there is."""
        room = min(self.app.size.width, 76) - 9
        rows = [
            Row(f"{k}.{n}", (line(Span(text, HEAD if paragraph.startswith("# ") else PLAIN)),))
            for k, paragraph in enumerate(self._paragraphs)
            for n, text in enumerate(wrapped(self.signs.text(paragraph.removeprefix("# ")), room))
        ]
        ledger = self.query_one(Ledger)
        ledger.show(Page(tuple(rows)))
        ledger.styles.height = min(len(rows), max(self.app.size.height - 5, 3))
        ledger.focus()
