"""What every screen of the book has: title, page, what was said, the foot; commands from the one table; values down.

A screen asks the app for the run (session, results, signs) and shows what it is given; it owns no state of the book.
"""

from __future__ import annotations

from collections.abc import Iterable
from typing import TYPE_CHECKING, ClassVar, cast

from textual.app import ComposeResult
from textual.binding import Binding, BindingType
from textual.screen import Screen
from textual.widget import Widget

from worksheet.report.table import width_of
from worksheet.session.edits import Request
from worksheet.session.session import Outcome
from worksheet.session.snapshot import Snapshot
from worksheet.tui import commands, rows
from worksheet.tui.commands import Command
from worksheet.tui.rows import LABEL, PLAIN, QUIET, Line, Span
from worksheet.tui.widgets.ledger import Ledger
from worksheet.tui.widgets.lines import Lines

if TYPE_CHECKING:
    from worksheet.tui.app import BookApp


def bindings(place: str) -> list[BindingType]:
    """Bindings of a screen, from the table of commands; their ids let the user's key file take their place."""
    return [
        Binding(f"{one.key},{one.second}", one.name, one.title, show=False, id=one.name)
        for one in commands.of_place(place)
    ]


class Place(Screen[None]):
    """A screen of the book."""

    PLACE: ClassVar[str] = commands.BOOK

    _said_of: int | None = None
    """The state of the book in which something was said last."""

    @property
    def book(self) -> BookApp:
        """The app."""
        return cast("BookApp", self.app)

    @property
    def snapshot(self) -> Snapshot:
        """The book as it stands."""
        return self.book.snapshot

    @property
    def stands(self) -> bool:
        """Whether all parts are there to be drawn on: not before they are composed, nor while the program ends."""
        return self.is_mounted and self.app.is_running and bool(self.query("#foot"))

    def compose(self) -> ComposeResult:
        """Title, page, what was said, the foot."""
        yield Lines(id="title")
        yield from self.compose_page()
        yield Lines([()], id="said")
        yield Lines([()], id="foot")

    def compose_page(self) -> Iterable[Widget]:
        """What lies between title and foot."""
        yield Ledger(self.book.signs.pointer, id="body")

    def on_mount(self) -> None:
        """Show what there is."""
        self.show_book()

    def on_screen_resume(self) -> None:
        """What changed while another screen was in front; at the end of the program parts of this one are gone."""
        if self.stands:
            if self._said_of != self.snapshot.revision:  # what was said is of another state of the book
                self.say("")
            self.show_book()

    def show_book(self) -> None:
        """Show the book as it stands with what is known of it."""
        raise NotImplementedError

    @property
    def ledger(self) -> Ledger:
        """The page."""
        return self.query_one("#body", Ledger)

    @property
    def columns(self) -> int:
        """Room for a row of the page, before the first layout too."""
        return max((self.ledger.size.width or self.app.size.width) - 3, 20)

    # What was said

    def say(self, text: str, *, wrong: bool = False) -> None:
        """One line, until the next one."""
        role = rows.MISSED if wrong else PLAIN
        self._said_of = self.snapshot.revision
        self.query_one("#said", Lines).show([(Span(self.book.signs.text(text), role),)])

    def ask_for(self, request: Request, *, quiet: bool = False) -> Outcome:
        """Have something changed, and say what came of it."""
        outcome = self.book.change(request)
        if outcome.accepted and not quiet:
            self.say(outcome.done)
        elif outcome.problems:
            self.say(f"not done: {outcome.problems[0]}", wrong=True)
        return outcome

    # Commands

    def holds(self) -> set[str]:
        """Names of conditions (Command.when) that hold now."""
        held = set()
        if self.snapshot.undo:
            held.add("undo")
        if self.snapshot.redo:
            held.add("redo")
        if self.snapshot.away:
            held.add("away")
        if self.snapshot.project.problems or self.book.own_problems:
            held.add("problems")
        return held

    def offers(self, command: Command, held: set[str] | None = None) -> bool:
        """Whether a command can be given now."""
        if command.writes and self.snapshot.read_only:
            return False
        return not command.when or command.when in (self.holds() if held is None else held)

    def check_action(self, action: str, parameters: tuple[object, ...]) -> bool | None:
        """Commands are there where the table says so."""
        command = commands.find(action)
        if command is None or self.PLACE not in command.places:
            return super().check_action(action, parameters)
        return self.offers(command)

    def show_foot(self) -> None:
        """The commands that matter most here, as many as have room."""
        held = self.holds()
        offered = [one for one in commands.of_place(self.PLACE) if one.foot and self.offers(one, held)]
        self.query_one("#foot", Lines).show([self._foot(sorted(offered, key=lambda one: one.foot))])

    def _foot(self, offered: list[Command]) -> Line:
        keys = self.book.keys
        pieces = [(commands.shown_key(keys.of(one)[0]), one.title) for one in offered]
        must = [piece for one, piece in zip(offered, pieces, strict=True) if one.foot >= 8]
        may = [piece for one, piece in zip(offered, pieces, strict=True) if one.foot < 8]
        room = self.app.size.width - 2 - sum(_took(piece) for piece in must)
        kept: list[tuple[str, str]] = []
        for piece in may:
            if room >= _took(piece):
                kept.append(piece)
                room -= _took(piece)
        spans: list[Span] = []
        for key, title in (*kept, *must):
            spans += [Span(key, LABEL), Span(f" {title}  ", QUIET)]
        return tuple(spans)

    # Commands that every screen has

    def action_undo(self) -> None:
        """Take back the last change."""
        self._told(self.book.undo())

    def action_redo(self) -> None:
        """Make it again."""
        self._told(self.book.redo())

    def _told(self, outcome: Outcome) -> None:
        if outcome.accepted:
            self.say(outcome.done)
        elif outcome.problems:
            self.say(outcome.problems[0].message, wrong=True)

    def action_help(self) -> None:
        """Help for what has the focus, and the keys."""
        from worksheet.tui.dialogs.reading import ReadingDialog
        from worksheet.tui.helping import paragraphs

        ledger = self.query(Ledger).first()
        found = paragraphs(self.PLACE, ledger.row, ledger.field, self.book.keys)
        self.app.push_screen(ReadingDialog("Help", found, self.book.signs))

    def action_commands(self) -> None:
        """The list of commands."""
        from worksheet.tui.dialogs.pick import Item, PickDialog

        held, keys = self.holds(), self.book.keys
        items = [
            Item(one.name, one.title, one.help, "  ".join(map(commands.shown_key, keys.of(one)[:1])))
            for one in commands.of_place(self.PLACE)
            if self.offers(one, held) and one.name != "commands"
        ]
        self.app.push_screen(PickDialog("Commands", items, self.book.signs), self._run)

    async def _run(self, name: str | None) -> None:
        if name:
            await self.run_action(f"screen.{name}")

    def action_problems(self) -> None:
        """Everything that is wrong with the files."""
        from worksheet.tui.dialogs.reading import ReadingDialog

        found = [str(problem) for problem in (*self.snapshot.project.problems, *self.book.own_problems)]
        self.app.push_screen(ReadingDialog("Problems", found or ["Nothing is wrong."], self.book.signs))

    def action_theme(self) -> None:
        """Choose the colours."""
        from worksheet.tui.dialogs.pick import Item, PickDialog

        items = [Item(one.name, one.title, mark=one.name) for one in self.book.themes.values()]
        self.app.push_screen(PickDialog("Theme", items, self.book.signs, self.app.theme), self.book.choose_theme)

    def action_reload(self) -> None:
        """Read the files again."""
        self.book.reload()
        self.refresh(repaint=True, layout=True)
        self.say("read again")

    def action_suspend(self) -> None:
        """Back to the shell for a while."""
        self.app.action_suspend_process()

    def action_leave(self) -> None:
        """The end."""
        self.app.exit(0)

    def action_back(self) -> None:
        """Where the user came from."""
        self.app.pop_screen()

    def action_copy(self) -> None:
        """Copy the number, the row or the table out."""
        from worksheet.tui.copying import ask

        ask(self)


def _took(piece: tuple[str, str]) -> int:
    return width_of(piece[0]) + width_of(piece[1]) + 3
