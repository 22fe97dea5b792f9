"""The screen of a comparison: two states of the project, and what the first of them stated taken back as an edit."""

from __future__ import annotations

import re
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
from worksheet.tui.pages import compare_list, compare_page
from worksheet.tui.recomputed import today
from worksheet.tui.rows import Row
from worksheet.tui.screens.place import bindings
from worksheet.tui.screens.tracing import choose_state, trace
from worksheet.tui.screens.view import View

_ID = re.compile("[0-9a-f]{40,}")
"""What a title has no room for in full."""


@dataclass(frozen=True, slots=True)
class State:
    """A state of the project: a revision's id or another name for it, and what to say of it; else the files."""

    revision: str = revisions.WORKING
    note: str = ""

    @property
    def short(self) -> str:
        """As a title has room for."""
        if self.revision == revisions.WORKING:
            return "files"
        return self.revision[:10] if _ID.fullmatch(self.revision) else self.revision

    @property
    def title(self) -> str:
        """In words."""
        return "as it stands" if self.revision == revisions.WORKING else f"{self.short} {self.note}".rstrip()


@dataclass(frozen=True, eq=False, slots=True)
class Laid:
    """Two states laid side by side: what differs, and the files of the first."""

    found: Comparison
    files: Mapping[str, bytes]


class CompareScreen(View):
    """What differs between two states of the project."""

    PLACE = commands.COMPARE
    BINDINGS: ClassVar[list[BindingType]] = [*bindings(commands.COMPARE)]

    def __init__(self, old: State, new: State) -> None:
        """Take the two states."""
        super().__init__("")
        self.old, self.new = old, new
        self.as_list = False
        self.closed: set[str] | None = None

    def asked(self) -> tuple[object, ...]:
        """Which two states."""
        return self.old.revision, self.new.revision

    def job(self) -> Callable[[], Any]:
        """Both states reviewed and laid side by side, or problems."""
        root, old, new = self.snapshot.project.root, self.old.revision, self.new.revision

        def work() -> Laid | list[Problem]:
            found = revisions.compared(root, old, new, today())
            if isinstance(found, Problem):
                return [found]
            files = revisions.files(root, old)
            return [files] if isinstance(files, Problem) else Laid(found.comparison, files)

        return work

    @property
    def about(self) -> str:
        """Which two states, and how much differs."""
        said = "" if self.laid is None else f"  {compare_page.counted(self.laid.found)}"
        return f"{self.old.title} -> {self.new.title}{said}"

    @property
    def laid(self) -> Laid | None:
        """What was found, None while it is being worked out."""
        return self.found if isinstance(self.found, Laid) else None

    def rows_found(self) -> Iterable[Row]:
        """Project, process file, sheets."""
        if self.laid is None:
            return ()
        found, look = self.laid.found, compare_page.Look(self.columns, self.book.signs)
        if self.as_list:
            return compare_list.page(found, look).rows
        if self.closed is None:  # many sheets are first seen as a list of their heads
            self.closed = set() if len(found.sheets) <= compare_page.MOST_OPEN else set(compare_page.parts(found))
        return compare_page.page(found, self.closed, look).rows

    @property
    def present(self) -> tuple[str, str]:
        """The sheet and the key under the cursor; ("", "") where there is none."""
        row = self.ledger.row
        return ("", "") if row is None else compare_page.lead(row.subject)

    def holds(self) -> set[str]:
        """What can be done with the row under the cursor."""
        held = super().holds() - {"row", "sheet"}
        row = self.ledger.row if self.is_mounted else None
        if self.laid is None or row is None:
            return held
        held |= {"laid"} if self.as_list else {"laid", "parts"}
        if row.subject[0] in (compare_page.INPUT, compare_page.RESULT):
            held.add("traced")
        return held | {"row"} if row.subject[1] else held

    # Commands

    def action_look(self) -> None:
        """Open the sheet at what the row is about; a part's head opens and closes the part."""
        row = self.ledger.row
        if row is not None and row.subject[0] == compare_page.PART and not self.as_list and self.closed is not None:
            self.closed ^= {row.subject[1]}
            self.draw()
            return
        name, _ = self.present
        if row is not None and name in self.snapshot.names:
            self.book.open_sheet(name, compare_page.place(row.subject))

    def action_parts(self) -> None:
        """Close all parts, or open all."""
        if self.laid is not None and self.closed is not None:
            every = set(compare_page.parts(self.laid.found))
            self.closed = set() if self.closed == every else every
            self.draw()

    def action_form(self) -> None:
        """One list, or side by side."""
        self.as_list = not self.as_list
        self.draw()

    def action_before(self) -> None:
        """Choose the first of the two states."""
        choose_state(self, "Compare from", self.old.revision, self._from, files_too=False)

    def _from(self, state: State) -> None:
        self.old, self.found = state, None
        self.show_book()

    def action_after(self) -> None:
        """Choose the second of the two states."""
        choose_state(self, "Compare to", self.new.revision, self._to)

    def _to(self, state: State) -> None:
        self.new, self.found = state, None
        self.show_book()

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

        question = f"What is to be as in {self.old.title}? Undo brings back what stands now."
        self.app.push_screen(AskDialog("Take back", question, answers, self.book.signs), done)

    def _restored(self, letter: str, laid: Laid, name: str, key: str) -> None:
        request: Request | None
        if letter == "v":
            request = taking_back.value(self.snapshot, laid.files, name, key, self.old.short)
        elif letter == "s":
            request = taking_back.sheet(laid.files, name, self.old.short)
        else:
            request = taking_back.project(self.snapshot, laid.files, self.old.short)
        if request is None:
            self.say("This cannot be taken back by itself; take the sheet back.", wrong=True)
        else:
            self.ask_for(request)

    def action_trace(self) -> None:
        """This value or metric over all revisions."""
        name, key = self.present
        row = self.ledger.row
        if name and row is not None:
            trace(self, name, key, metric=row.subject[0] == "result")
