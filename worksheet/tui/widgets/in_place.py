"""A value being changed where it stands: one line to type in, below it what is wrong or what may come next.

It knows nothing of sheets: it is handed what checks and completes a text, and posts what was typed.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import ClassVar

from textual.app import ComposeResult
from textual.binding import Binding, BindingType
from textual.containers import Vertical
from textual.geometry import Region
from textual.message import Message
from textual.widgets import Input

from worksheet.report.table import cut, width_of
from worksheet.tui import rows
from worksheet.tui.rows import PLAIN, QUIET, Line, Span
from worksheet.tui.signs import Signs
from worksheet.tui.widgets.lines import Lines

_LEAST, _LINES, _SAID = 44, 4, 2


@dataclass(frozen=True)
class Asked:
    """What is asked for: its title, the text so far, what says what is wrong with a text, what completes it, help;
    whether the next character takes the place of all of it.
    """

    title: str
    text: str
    check: Callable[[str], str]
    complete: Callable[[str], Sequence[str]]
    help: str
    all_marked: bool = True


class InPlace(Vertical):
    """The line over the page; hidden while nothing is asked."""

    BINDINGS: ClassVar[list[BindingType]] = [
        Binding("escape", "give_up", show=False, priority=True),
        Binding("tab", "complete(1)", show=False, priority=True),
        Binding("down", "complete(1)", show=False, priority=True),
        Binding("up", "complete(-1)", show=False, priority=True),
    ]

    @dataclass
    class Typed(Message):
        """The text is another one."""

        text: str

    @dataclass
    class Accepted(Message):
        """The user wants this text."""

        text: str

    class GivenUp(Message):
        """The user wants nothing changed."""

    def __init__(self, signs: Signs, *, id: str | None = None) -> None:  # noqa: A002
        super().__init__(id=id)
        self._signs = signs
        self._asked: Asked | None = None
        self._offered: tuple[str, ...] = ()
        self._turn = -1
        self._own_change = False

    def compose(self) -> ComposeResult:
        """The line and what is said of it."""
        yield Input(compact=True, select_on_focus=False)
        yield Lines([(), ()])

    @property
    def open(self) -> bool:
        """Whether something is being typed."""
        return self._asked is not None

    def ask(self, asked: Asked, at: Region, within: Region) -> None:
        """Open over a place of the screen."""
        self._asked, self._turn = asked, -1
        self.move(at, within)
        field = self.query_one(Input)
        field.value = asked.text
        field.cursor_position = len(asked.text)
        self.add_class("shown")
        field.focus()
        if asked.all_marked:
            field.select_all()
        self._tell(asked.text)

    def move(self, at: Region, within: Region) -> None:
        """Stand over another place; what is typed stays."""
        text = "" if self._asked is None else self._asked.text
        width = min(max(_LEAST, at.width + 4, width_of(text) + 4), within.width)
        x = min(at.x, within.right - width)
        y = min(at.y, within.bottom - _LINES + 1)
        self.styles.width = width
        self.styles.offset = (max(x, within.x), max(y, within.y))

    def close(self) -> None:
        """Nothing is asked any more."""
        self._asked = None
        self.remove_class("shown")

    def tell(self, wrong: str) -> None:
        """Say what is wrong; the text stays."""
        self._show(wrong, rows.MISSED)

    def on_input_changed(self, event: Input.Changed) -> None:
        """Say at once what is wrong or may come next."""
        event.stop()
        if self._asked is None:
            return
        if not self._own_change:
            self._turn = -1
        self._own_change = False
        self._tell(event.value)
        self.post_message(self.Typed(event.value))

    def on_input_submitted(self, event: Input.Submitted) -> None:
        """The text is wanted."""
        event.stop()
        if self._asked is not None:
            self.post_message(self.Accepted(event.value))

    def _tell(self, text: str) -> None:
        asked = self._asked
        if asked is None:
            return
        if self._turn < 0:
            self._offered = tuple(asked.complete(text))
        wrong = asked.check(text)
        self._show(wrong or asked.help, rows.MISSED if wrong else PLAIN)

    def _show(self, text: str, role: str) -> None:
        from worksheet.report.table import wrapped

        room = max(int(self.styles.width.value) if self.styles.width is not None else _LEAST, _LEAST) - 1
        lines = wrapped(self._signs.text(text), room)
        if len(lines) > _SAID:  # what has no room is marked as cut
            lines = [*lines[: _SAID - 1], cut(" ".join(lines[_SAID - 1 :]), room)]
        said: list[Line] = [(Span(one, role),) for one in lines]
        if self._offered:
            said.append((Span(cut("tab: " + "  ".join(map(self._signs.text, self._offered)), room), QUIET),))
        self.query_one(Lines).show(said)

    def action_complete(self, step: int) -> None:
        """The next of the texts that this one may become."""
        if not self._offered:
            return
        self._turn = (self._turn + step) % len(self._offered)
        field = self.query_one(Input)
        self._own_change = True
        field.value = self._offered[self._turn]
        field.cursor_position = len(field.value)

    def action_give_up(self) -> None:
        """Close without a change."""
        self.close()
        self.post_message(self.GivenUp())
