"""A form: a few labelled lines that say what is wrong while one types, and keep the text whatever comes back."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING, ClassVar, cast

from textual import events
from textual.app import ComposeResult
from textual.binding import Binding, BindingType
from textual.containers import Horizontal, Vertical
from textual.widgets import Input, Label

from worksheet.report.table import wrapped
from worksheet.session.recovery import Typing
from worksheet.tui import rows
from worksheet.tui.dialogs.dialog import Dialog
from worksheet.tui.rows import HEAD, PLAIN, QUIET, Line, Span
from worksheet.tui.signs import Signs
from worksheet.tui.widgets.lines import Lines

if TYPE_CHECKING:
    from worksheet.tui.app import BookApp

FORM = "form:"
"""Opens the place of a text of a form in the journal; the form's title and the line's key follow."""

Check = Callable[[str], str]
Complete = Callable[[str], Sequence[str]]
Submit = Callable[[Mapping[str, str]], str]


def _fine(text: str) -> str:
    del text
    return ""


def _nothing(text: str) -> Sequence[str]:
    del text
    return ()


@dataclass(frozen=True)
class FormLine:
    """One line of a form.

    Attributes:
        key: Its name in the answer.
        title: Its label.
        help: What belongs there.
        text: What stands there at first.
        check: Says what is wrong with a text, "" for nothing.
        complete: Whole texts that a text may become.
    """

    key: str
    title: str
    help: str = ""
    text: str = ""
    check: Check = _fine
    complete: Complete = _nothing


class FormDialog(Dialog[bool]):
    """Answers True once `submit` has taken the texts; what it says otherwise is shown, and the texts stay."""

    BINDINGS: ClassVar[list[BindingType]] = [
        Binding("down", "go(1)", show=False, priority=True),
        Binding("up", "go(-1)", show=False, priority=True),
        Binding("enter", "accept", show=False, priority=True),
        Binding("tab", "complete", show=False, priority=True),
    ]

    def __init__(self, title: str, lines: Sequence[FormLine], submit: Submit, signs: Signs) -> None:
        """Take the lines, and what takes their texts and says what is wrong with them, "" for nothing."""
        super().__init__(title, signs)
        self._lines = tuple(lines)
        self._submit = submit

    @property
    def _book(self) -> BookApp:
        return cast("BookApp", self.app)

    def compose(self) -> ComposeResult:
        """A label and a text a line; below, what is wrong or what belongs there."""
        left = self._book.left_in_forms.pop(self.heading, {})
        with Vertical(classes="dialog"):
            yield Lines([(Span(self.heading, HEAD),)])
            for k, one in enumerate(self._lines):
                with Horizontal(classes="form-line"):
                    yield Label(self.signs.text(one.title), markup=False)
                    text = left.get(one.key, one.text)
                    yield Input(text, id=f"line-{k}", compact=True, select_on_focus=False)
            yield Lines([(), (), ()], id="note")
            yield Lines([(Span("enter: next line, at the last one accept   tab: complete   esc: leave", QUIET),)])

    def on_mount(self) -> None:
        """Begin at the first line."""
        self.query(Input).first().focus()
        self._note()

    @property
    def _place(self) -> int:
        inputs = list(self.query(Input))
        return next((k for k, one in enumerate(inputs) if one.has_focus), 0)

    def _text(self, k: int) -> str:
        return self.query_one(f"#line-{k}", Input).value

    def texts(self) -> dict[str, str]:
        """What stands in the lines."""
        return {one.key: self._text(k).strip() for k, one in enumerate(self._lines)}

    def on_input_changed(self, event: Input.Changed) -> None:
        """Say at once what is wrong, and keep the text outside the project until the form is done."""
        self._note()
        one = self._lines[int(str(event.input.id).rpartition("-")[2])]
        if event.value != one.text:
            self._book.journal.keep(Typing("", f"{FORM}{self.heading}:{one.key}", one.title, event.value))

    def on_unmount(self) -> None:
        """Accepted or given up: nothing is to be offered again."""
        if self._book.is_running:
            self._book.journal.done()

    def on_descendant_focus(self, event: events.DescendantFocus) -> None:
        """Say what belongs there."""
        del event
        self._note()

    def _note(self, wrong: str = "") -> None:
        one = self._lines[self._place]
        text = self._text(self._place).strip()
        wrong = wrong or (one.check(text) if text else "")
        found = wrapped(self.signs.text(wrong or one.help), 70)[:2]
        lines: list[Line] = [(Span(part, rows.MISSED if wrong else PLAIN),) for part in found]
        lines += [()] * (2 - len(lines))
        may = "  ".join(one.complete(text)[:6])
        lines.append((Span(self.signs.text(may)[:70], QUIET),))
        self.query_one("#note", Lines).show(lines)

    def action_go(self, step: int) -> None:
        """Another line."""
        k = min(max(self._place + step, 0), len(self._lines) - 1)
        self.query_one(f"#line-{k}", Input).focus()

    def action_complete(self) -> None:
        """The likeliest completion; where there is none, the next line."""
        k = self._place
        found = self._lines[k].complete(self._text(k).strip())
        if not found:
            self.action_go(1)
            return
        field = self.query_one(f"#line-{k}", Input)
        field.value = found[0]
        field.cursor_position = len(field.value)

    def action_accept(self) -> None:
        """The next line, or all of them."""
        k = self._place
        if k < len(self._lines) - 1:
            self.action_go(1)
            return
        for n, one in enumerate(self._lines):
            text = self._text(n).strip()
            wrong = one.check(text) if text else ""
            if wrong:
                self.query_one(f"#line-{n}", Input).focus()
                self._note(wrong)
                return
        wrong = self._submit(self.texts())
        if wrong:
            self._note(wrong)
        else:
            self.dismiss(True)
