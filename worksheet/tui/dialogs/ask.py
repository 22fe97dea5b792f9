"""A question with a few answers, each behind a letter."""

from __future__ import annotations

from collections.abc import Mapping

from textual import events
from textual.app import ComposeResult
from textual.containers import Vertical

from worksheet.report.table import wrapped
from worksheet.tui.dialogs.dialog import Dialog
from worksheet.tui.rows import HEAD, LABEL, PLAIN, Span, line
from worksheet.tui.signs import Signs
from worksheet.tui.widgets.lines import Lines


class AskDialog(Dialog[str]):
    """Answers with the letter that was pressed."""

    def __init__(self, title: str, question: str, answers: Mapping[str, str], signs: Signs) -> None:
        """Take the question, and what each letter means."""
        super().__init__(title, signs)
        self._question, self._answers = question, dict(answers)

    def compose(self) -> ComposeResult:
        """Title, question, answers."""
        said = [(Span(text, PLAIN),) for text in wrapped(self.signs.text(self._question), 70)]
        letters = [
            line(Span(letter, LABEL, 4), Span(self.signs.text(text), PLAIN)) for letter, text in self._answers.items()
        ]
        with Vertical(classes="dialog"):
            way_out = line(Span("esc", LABEL, 4), Span("leave it as it is"))
            yield Lines([(Span(self.heading, HEAD),), *said, (), *letters, way_out])

    def on_key(self, event: events.Key) -> None:
        """One of the letters, or nothing."""
        if event.character in self._answers:
            event.stop()
            self.dismiss(event.character)
