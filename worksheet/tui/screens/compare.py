"""The screen of a comparison: a revision beside the files as they stand, and what it stated taken back as an edit."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Mapping
from dataclasses import dataclass
from typing import Any, ClassVar

from textual.binding import BindingType

from worksheet.compare.compared import Comparison
from worksheet.model.problem import Problem
from worksheet.session import revisions, taking_back
from worksheet.session.edits import Request
from worksheet.tui import commands
from worksheet.tui.dialogs.ask import AskDialog
from worksheet.tui.pages import compare_page
from worksheet.tui.recomputed import today
from worksheet.tui.rows import Row
from worksheet.tui.screens.place import bindings
from worksheet.tui.screens.view import View


@dataclass(frozen=True, eq=False, slots=True)
class Laid:
    """A revision laid beside the files: what differs, and the revision's own files."""

    found: Comparison
    files: Mapping[str, bytes]


class CompareScreen(View):
    """What differs between a revision and the files as they stand."""

    PLACE = commands.COMPARE
    BINDINGS: ClassVar[list[BindingType]] = [*bindings(commands.COMPARE)]

    def __init__(self, revision: str, title: str) -> None:
        """Take the revision's id, and what to call it."""
        super().__init__("")
        self.revision, self.heading = revision, title

    def job(self) -> Callable[[], Any]:
        """Both states reviewed and laid side by side, or problems."""
        root, revision = self.snapshot.project.root, self.revision

        def work() -> Laid | list[Problem]:
            found = revisions.compared(root, revision, revisions.WORKING, today())
            if isinstance(found, Problem):
                return [found]
            files = revisions.files(root, revision)
            return [files] if isinstance(files, Problem) else Laid(found.comparison, files)

        return work

    @property
    def about(self) -> str:
        """Which revision stands beside the files, and how much differs."""
        said = "" if self.laid is None else f"  {compare_page.counted(self.laid.found)}"
        return f"{self.revision[:10]} {self.heading} -> as it stands{said}"

    @property
    def laid(self) -> Laid | None:
        """What was found, None while it is being worked out."""
        return self.found if isinstance(self.found, Laid) else None

    def rows_found(self) -> Iterable[Row]:
        """Project, process file, sheets."""
        return () if self.laid is None else compare_page.page(self.laid.found, self.columns, self.book.signs).rows

    @property
    def present(self) -> tuple[str, str]:
        """The sheet and the key under the cursor; ("", "") where there is none."""
        row = self.ledger.row
        return ("", "") if row is None else compare_page.lead(row.subject)

    def holds(self) -> set[str]:
        """What can be done with the row under the cursor."""
        held = super().holds() - {"row", "sheet"}
        if self.laid is not None:
            held.add("laid")
        return held | {"row", "sheet"} if self.present[0] else held

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
