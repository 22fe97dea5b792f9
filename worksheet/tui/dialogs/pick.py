"""A list to choose from: type to narrow it down, Enter takes what the cursor is on."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import ClassVar

from textual.app import ComposeResult
from textual.binding import Binding, BindingType
from textual.containers import Vertical
from textual.widgets import Input

from worksheet.tui.dialogs.dialog import Dialog
from worksheet.tui.rows import HEAD, LABEL, PLAIN, QUIET, Line, Page, Row, Span, line
from worksheet.tui.signs import Signs
from worksheet.tui.widgets.ledger import Ledger
from worksheet.tui.widgets.lines import Lines


@dataclass(frozen=True, slots=True)
class Item:
    """One thing to choose: its key, its title, what to know of it, and a mark in front (a key of the keyboard)."""

    key: str
    title: str
    note: str = ""
    mark: str = ""


class PickDialog(Dialog[str]):
    """Answers with the key of what was chosen."""

    BINDINGS: ClassVar[list[BindingType]] = [
        Binding("up", "move(-1)", show=False, priority=True),
        Binding("down", "move(1)", show=False, priority=True),
        Binding("pageup", "move(-8)", show=False, priority=True),
        Binding("pagedown", "move(8)", show=False, priority=True),
        Binding("enter", "take", show=False, priority=True),
    ]

    def __init__(self, title: str, items: Sequence[Item], signs: Signs, present: str = "") -> None:
        """Take what there is, and the key that the cursor stands on first."""
        super().__init__(title, signs)
        self._items = tuple(items)
        self._present = present

    def compose(self) -> ComposeResult:
        """A title, a line to type in, the list, what to know of the one under the cursor."""
        with Vertical(classes="dialog"):
            yield Lines([(Span(self.heading, HEAD), Span("  type to search", QUIET))])
            yield Input(id="wanted", compact=True)
            ledger = Ledger(self.signs.pointer, id="list")
            ledger.can_focus = False
            yield ledger
            yield Lines([(), ()], id="note")

    def on_mount(self) -> None:
        """Everything, with the cursor on what holds now."""
        self._narrow("")
        self._ledger.go(self._present)

    @property
    def _ledger(self) -> Ledger:
        return self.query_one(Ledger)

    def _narrow(self, wanted: str) -> None:
        words = wanted.casefold().split()
        rows = [
            _row(item, self.signs)
            for item in self._items
            if all(word in f"{item.key} {item.title} {item.note} {item.mark}".casefold() for word in words)
        ]
        shown = rows or [Row("", (line(Span("Nothing holds that.", QUIET)),), stops=False)]
        self._ledger.show(Page(tuple(shown)))
        self._ledger.styles.height = min(len(shown), max(self.app.size.height - 8, 3))

    def on_input_changed(self, event: Input.Changed) -> None:
        """Fewer or more of them."""
        self._narrow(event.value)

    def on_ledger_moved(self, event: Ledger.Moved) -> None:
        """Say more of the one under the cursor."""
        from worksheet.report.table import wrapped

        note = next((item.note for item in self._items if event.row is not None and item.key == event.row.key), "")
        lines: list[Line] = [(Span(text, QUIET),) for text in wrapped(self.signs.text(note), 70)[:2]]
        self.query_one("#note", Lines).show([*lines, *[()] * (2 - len(lines))])

    def on_click(self) -> None:
        """The list moves its cursor by itself; typing goes on."""
        self.query_one(Input).focus()

    def action_move(self, step: int) -> None:
        """Up or down the list."""
        for _ in range(abs(step)):
            self._ledger.action_move(1 if step > 0 else -1)

    def action_take(self) -> None:
        """Answer."""
        row = self._ledger.row
        if row is not None:
            self.dismiss(row.key)


def _row(item: Item, signs: Signs) -> Row:
    mark = [Span(signs.text(item.mark), LABEL, 10)] if item.mark else []
    return Row(item.key, (line(*mark, Span(signs.text(item.title), PLAIN)),))
