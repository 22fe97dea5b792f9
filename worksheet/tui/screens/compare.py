"""The screen of a comparison: a revision beside the files as they stand, and what it stated taken back as an edit."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from typing import ClassVar

from textual.binding import BindingType
from textual.message import Message
from textual.widget import Widget

from worksheet.compare.compared import Comparison
from worksheet.model.problem import Problem
from worksheet.session import revisions, taking_back
from worksheet.session.edits import Request
from worksheet.tui import commands
from worksheet.tui.dialogs.ask import AskDialog
from worksheet.tui.pages import compare_page
from worksheet.tui.recompute import Recompute, Stamped
from worksheet.tui.recomputed import today
from worksheet.tui.rows import HEAD, PLAIN, QUIET, Page, Row, Span, line
from worksheet.tui.screens.place import Place, bindings
from worksheet.tui.widgets.ledger import Ledger
from worksheet.tui.widgets.lines import Lines


@dataclass(frozen=True, eq=False, slots=True)
class Laid:
    """A revision laid beside the files: what differs, and the revision's own files."""

    found: Comparison
    files: Mapping[str, bytes]


class CompareScreen(Place):
    """What differs between a revision and the files as they stand."""

    PLACE = commands.COMPARE
    BINDINGS: ClassVar[list[BindingType]] = [*bindings(commands.COMPARE)]

    class Ready(Message):
        """The comparison has been worked out."""

        def __init__(self, stamped: Stamped[Laid | Problem]) -> None:
            super().__init__()
            self.stamped = stamped

    def __init__(self, revision: str, title: str) -> None:
        """Take the revision's id, and what to call it."""
        super().__init__()
        self.revision, self.heading = revision, title
        self.laid: Laid | None = None
        self.stamp = -1
        self._asked = -1
        self._wrong = ""
        self._work: Recompute[Laid | Problem] = Recompute(self._deliver)

    def compose_page(self) -> Iterable[Widget]:
        """The rows of the comparison."""
        yield Ledger(self.book.signs.pointer, id="body")

    def on_unmount(self) -> None:
        """Begin nothing more."""
        self._work.stop()

    def _deliver(self, stamped: Stamped[Laid | Problem]) -> None:
        self.post_message(self.Ready(stamped))

    # What it shows

    def show_book(self) -> None:
        """The comparison with the book as it stands."""
        if not self.is_mounted:
            return
        self._want()
        signs, laid = self.book.signs, self.laid
        said = "" if laid is None else compare_page.counted(laid.found)
        title = f"{self.revision[:10]} {self.heading} -> as it stands"
        head = line(Span(signs.text(title), HEAD), Span(signs.text(said), PLAIN), gap=2)
        self.query_one("#title", Lines).show([head])
        text = signs.text(self._wrong or "working...")
        waiting = Page((Row("none", (line(Span(text, QUIET)),), stops=False),))
        self.ledger.show(waiting if laid is None else compare_page.page(laid.found, self.columns, signs))
        self.show_foot()

    def _want(self) -> None:
        snapshot = self.snapshot
        if self._asked == snapshot.revision:
            return
        self._asked = snapshot.revision
        root, revision = snapshot.project.root, self.revision

        def work() -> Laid | Problem:
            found = revisions.compared(root, revision, revisions.WORKING, today())
            files = revisions.files(root, revision)
            if isinstance(found, Problem):
                return found
            return files if isinstance(files, Problem) else Laid(found.comparison, files)

        self._work.want(snapshot.revision, work)

    def on_compare_screen_ready(self, message: CompareScreen.Ready) -> None:
        """Show it, unless it belongs to another state by now."""
        stamped = message.stamped
        if stamped.revision != self.snapshot.revision:
            return
        value = stamped.value
        self.stamp = stamped.revision
        if isinstance(value, Laid):
            self.laid = value
        else:
            self._wrong = str(value) if value is not None else f"cannot be compared: {stamped.error}"
        self.show_book()

    @property
    def present(self) -> tuple[str, str]:
        """The sheet and the key under the cursor; ("", "") where there is none."""
        row = self.ledger.row
        return ("", "") if row is None else compare_page.lead(row.subject)

    def holds(self) -> set[str]:
        """What can be done with the row under the cursor."""
        held = super().holds()
        if self.laid is not None:
            held.add("laid")
        return held | {"row", "sheet"} if self.present[0] else held

    def on_ledger_moved(self) -> None:
        """Another row."""
        self.show_foot()

    def on_ledger_resized(self) -> None:
        """Another width."""
        self.show_book()

    # Commands

    def action_look(self) -> None:
        """Open the sheet at what the row is about."""
        name, key = self.present
        parts = key.split(".")
        if name in self.snapshot.names:
            self.book.open_sheet(name, ".".join(parts[:2]) if len(parts) > 1 else f"target.{key}")

    def action_restore(self) -> None:
        """Take a value, a sheet or the project back."""
        laid, (name, key) = self.laid, self.present
        if laid is None:
            return
        row = self.ledger.row
        on_value = row is not None and row.subject[0] == "input"
        answers = {"v": f"{key} of {name}"} if on_value else {}
        answers |= {"s": f"the sheet {name}"} if name else {}
        answers["p"] = "every sheet, the process file and the project's own file"

        def done(letter: str | None) -> None:
            if letter is not None:
                self._restored(letter, laid, name, key)

        question = f"What is to be as in {self.revision[:10]} {self.heading}? Undo brings back what stands now."
        self.app.push_screen(AskDialog("Take back", question, answers, self.book.signs), done)

    def _restored(self, letter: str, laid: Laid, name: str, key: str) -> None:
        request: Request | None
        if letter == "v":
            request = taking_back.value(self.snapshot, laid.files, name, key, self.revision)
        elif letter == "s":
            request = taking_back.sheet(laid.files, name, self.revision)
        else:
            request = taking_back.project(self.snapshot, laid.files, self.revision)
        if request is None:
            self.say("This cannot be taken back by itself; take the sheet back.", wrong=True)
        else:
            self.ask_for(request)

    def action_trace(self) -> None:
        """This value or metric over all revisions."""
        from worksheet.tui.screens.tracing import trace

        name, key = self.present
        row = self.ledger.row
        if name and row is not None:
            trace(self, name, key, metric=row.subject[0] == "result")
