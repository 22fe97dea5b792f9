"""The project's screen: every block at a glance, its targets below, the budgets at the foot."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Mapping, Sequence
from typing import ClassVar

from textual.binding import Binding, BindingType
from textual.containers import Horizontal
from textual.widget import Widget
from textual.widgets import Input, Label

from worksheet.session.edits import DeleteSheet, DuplicateSheet, NewSheet, RenameSheet, Request
from worksheet.stages import catalogue
from worksheet.tui import commands
from worksheet.tui.dialogs.form import FormDialog, FormLine
from worksheet.tui.pages import book_page
from worksheet.tui.screens.place import Place, bindings
from worksheet.tui.widgets.ledger import Ledger
from worksheet.tui.widgets.lines import Lines

Made = Callable[[Mapping[str, str]], Request]


class BookScreen(Place):
    """All blocks of a project."""

    PLACE = commands.BOOK
    BINDINGS: ClassVar[list[BindingType]] = [*bindings(commands.BOOK), Binding("escape", "end_find", show=False)]

    def compose_page(self) -> Iterable[Widget]:
        """Heading, list, the block under the cursor, budgets."""
        yield Lines([()], id="heading")
        yield Ledger(self.book.signs.pointer, id="body")
        with Horizontal(id="find"):
            yield Label("find: ")
            yield Input(id="wanted", compact=True)
        yield Lines(id="detail")
        yield Lines(id="budgets")

    # What it shows

    def show_book(self) -> None:
        """Everything anew; only what changed is drawn."""
        if not self.stands:
            return
        signs, snapshot, results = self.book.signs, self.snapshot, self.book.results
        review = None if results is None else results.review
        self.query_one("#title", Lines).show(book_page.title_lines(snapshot, review, signs))
        self.query_one("#heading", Lines).show([book_page.heading(self.columns)])
        wanted = self.query_one("#wanted", Input).value
        self.ledger.show(book_page.page(snapshot, review, self.columns, signs, wanted))
        budgets = () if review is None else review.budgets
        self.query_one("#budgets", Lines).show(book_page.budget_lines(budgets, signs))
        self._show_detail()
        self.show_foot()

    def _show_detail(self) -> None:
        name = self.present
        results = self.book.results
        result = None if results is None or name is None else results.sheet(name)
        problems = () if name is None else self.snapshot.problems_of(name)
        room = book_page.detail_room(self.app.size.height)
        lines = book_page.detail_lines(result, problems, room, self.book.signs)[:room]
        self.query_one("#detail", Lines).show([*lines, *[()] * (room - len(lines))])

    @property
    def present(self) -> str | None:
        """The sheet under the cursor."""
        row = self.ledger.row
        return row.subject[1] if row is not None and row.subject[0] == "sheet" else None

    def holds(self) -> set[str]:
        """There is a sheet under the cursor."""
        held = super().holds()
        return held if self.present is None else held | {"row", "sheet"}

    def on_ledger_moved(self) -> None:
        """Another block: its targets below."""
        self._show_detail()
        self.show_foot()

    def on_ledger_resized(self) -> None:
        """Another width."""
        self.show_book()

    # Finding

    def action_find(self) -> None:
        """Open the line to type in."""
        self.query_one("#find").add_class("shown")
        self.query_one("#wanted", Input).focus()

    def action_end_find(self) -> None:
        """Show every block again."""
        self.query_one("#wanted", Input).value = ""
        self.query_one("#find").remove_class("shown")
        self.ledger.focus()

    def on_input_changed(self) -> None:
        """Fewer or more blocks."""
        self.show_book()

    def on_input_submitted(self) -> None:
        """Back to the list, which stays narrowed."""
        self.ledger.focus()

    # Commands

    def action_open(self) -> None:
        """Open the sheet."""
        if self.present is not None:
            self.book.open_sheet(self.present)

    def action_meeting(self) -> None:
        """Walk through what wants a decision."""
        from worksheet.tui.screens.meeting import MeetingScreen

        self.app.push_screen(MeetingScreen())

    def action_compare(self) -> None:
        """Lay a revision beside the files."""
        from worksheet.tui.screens.tracing import choose

        choose(self)

    def action_chains(self) -> None:
        """The signal paths."""
        from worksheet.tui.screens.chains import ChainScreen

        self.app.push_screen(ChainScreen())

    def action_record(self) -> None:
        """Record a revision."""
        from worksheet.tui.screens.tracing import record

        record(self)

    def action_rescue(self) -> None:
        """Write the files as they were last seen into another folder."""
        from pathlib import Path

        def taken(texts: Mapping[str, str]) -> str:
            if not texts["folder"]:
                return "Name a folder."
            stuck = self.book.session.copy_to(Path(texts["folder"]).expanduser())
            return str(stuck[0]) if stuck else ""

        def done(accepted: bool | None) -> None:
            if accepted:
                self.say("The files are written; open that folder to go on.")

        lines = [FormLine("folder", "Folder (needed)", "A new or empty folder; what stands there already stays.")]
        self.app.push_screen(FormDialog("Write the project elsewhere", lines, taken, self.book.signs), done)

    def action_project(self) -> None:
        """Change title, conditions and budgets."""
        from worksheet.session import project_edit
        from worksheet.session.edits import RefusedError
        from worksheet.tui.screens.forming import submit

        lines = [FormLine(one.key, one.title, one.help, one.text) for one in project_edit.entries(self.snapshot)]

        def taken(texts: Mapping[str, str]) -> str:
            try:
                request = project_edit.change(self.snapshot, texts)
            except (RefusedError, ValueError) as error:
                return str(error)
            return "" if request is None else submit(self.book, request)

        def done(accepted: bool | None) -> None:
            if accepted:
                self.say(self.snapshot.undo)

        self.app.push_screen(FormDialog("The project", lines, taken, self.book.signs), done)

    def action_curves(self) -> None:
        """Fit a device to curves."""
        from worksheet.tui.screens.curves import begin

        begin(self)

    def action_take_over(self) -> None:
        """Be led through a block before it is one's own."""
        from worksheet.tui.screens.takeover import TakeoverScreen

        if self.present is not None:
            self.app.push_screen(TakeoverScreen(self.present))

    def action_new(self) -> None:
        """Start a sheet."""
        process = self.snapshot.project.process
        devices = list(process.devices) if process is not None else []
        lines = [
            name_line(""),
            FormLine("stage", "Stage", f"One of {', '.join(catalogue.keys())}", complete=_of(catalogue.keys())),
            FormLine("device", "Device", f"One of {', '.join(devices)}", "".join(devices[:1]), complete=_of(devices)),
            FormLine("title", "Title", "What the block is, for people."),
        ]
        self._form("New sheet", lines, lambda t: NewSheet(t["name"], t["stage"], t["device"], t["title"]))

    def action_duplicate(self) -> None:
        """Copy the sheet."""
        name = self.present or ""
        self._form(f"Copy of {name}", [name_line(f"{name}_copy")], lambda t: DuplicateSheet(name, t["name"]))

    def action_rename(self) -> None:
        """Give the sheet another name."""
        name = self.present or ""
        self._form(f"Rename {name}", [name_line(name)], lambda t: RenameSheet(name, t["name"]))

    def action_delete(self) -> None:
        """Take the sheet out; undo brings it back."""
        name = self.present
        if name is None:
            return
        outcome = self.book.change(DeleteSheet(name))
        if outcome.accepted:
            self.say(outcome.done)
        elif outcome.problems:
            first = outcome.problems[0]
            used = f"{first.file} uses it: {first.key}" if first.key else str(first)
            self.say(f"{name} stays. {used}", wrong=True)

    def _form(self, title: str, lines: list[FormLine], made: Made) -> None:
        from worksheet.tui.screens.forming import submit

        def done(accepted: bool | None) -> None:
            if accepted:
                self.say(self.snapshot.undo)

        def follow(texts: Mapping[str, str]) -> str:
            wrong = submit(self.book, made(texts))
            if not wrong:
                self.call_after_refresh(self.ledger.go, f"sheet.{texts['name']}")
            return wrong

        self.app.push_screen(FormDialog(title, lines, follow, self.book.signs), done)


def name_line(name: str) -> FormLine:
    """The line for a sheet's name."""
    from worksheet.sheetfile.names import sheet_name_problem

    def wrong(text: str) -> str:
        return sheet_name_problem(text) or ""

    return FormLine("name", "Name", "Of its file and in formulas: letters, digits and _.", name, wrong)


def _of(known: Sequence[str]) -> Callable[[str], Sequence[str]]:
    return lambda text: [one for one in known if one.startswith(text) and one != text]
