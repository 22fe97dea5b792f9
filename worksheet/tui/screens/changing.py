"""Changing a value where it stands: from the field under the cursor to a request, with every text kept on the way."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

from worksheet.session import fields
from worksheet.session.edits import ChangeSheet, KeyPath, Piece, TakeOut, value_at
from worksheet.session.fields import Place as FieldPlace
from worksheet.session.recovery import Typing
from worksheet.session.session import Collision, Outcome
from worksheet.tui.pages import words
from worksheet.tui.rows import Field, Row
from worksheet.tui.widgets.in_place import Asked, InPlace

if TYPE_CHECKING:
    from worksheet.tui.screens.sheet import SheetScreen


class Change:
    """The one value of a sheet's screen that is being changed, if one is."""

    def __init__(self, screen: SheetScreen) -> None:
        self._screen = screen
        self._place: FieldPlace | None = None
        self._title = ""
        self._expected: Any = None

    @property
    def open(self) -> bool:
        """Whether something is being typed."""
        return self._place is not None

    @property
    def _line(self) -> InPlace:
        return self._screen.query_one(InPlace)

    def begin(self, field: Field | None, text: str | None = None) -> None:
        """Open the line over a field."""
        screen = self._screen
        place = None if field is None else fields.place(screen.snapshot, screen.name_of_sheet, field.path)
        if field is None or place is None:
            screen.say("There is nothing to change here.")
            return
        self._place, self._title = place, field.title
        self._expected = value_at(screen.snapshot.data(place.sheet), place.path)
        self._line.ask(self._asked(place, field, text), screen.ledger.field_region(), screen.ledger.region)

    @staticmethod
    def _asked(place: FieldPlace, field: Field, text: str | None) -> Asked:
        def wrong(text: str) -> str:
            found = fields.read(place, text)
            return found if isinstance(found, str) else ""

        def completed(text: str) -> tuple[str, ...]:
            return fields.complete(place, text)

        stands = field.text if text is None else text
        return Asked(field.title, stands, wrong, completed, place.key.help, all_marked=text is None)

    def place_again(self) -> None:
        """The page stands differently: the line follows its field, with what is typed in it.

        Where the field is gone, since somebody else took it out or spoilt the file, the line stays and says so.
        """
        if self._place is None:
            return
        ledger, path = self._screen.ledger, self._place.path
        for row in ledger.page.rows:
            for k, field in enumerate(row.fields):
                if field.path == path and ledger.go(row.key, k):
                    self._line.move(ledger.field_region(), ledger.region)
                    return
        self._line.tell(f"{self._title} is gone from the file just now. Your text is kept.")

    def resume(self, dotted: str, text: str) -> None:
        """Go on with a text that was left behind at a key."""
        ledger = self._screen.ledger
        for row in ledger.page.rows:
            for k, field in enumerate(row.fields):
                if ".".join(map(str, field.path)) == dotted and ledger.go(row.key, k):
                    self._screen.call_after_refresh(self.begin, field, text)
                    return
        self._screen.say(f"{dotted} is not there any more; the text was: {text}", wrong=True)

    def typed(self, text: str) -> None:
        """Keep the text outside the project."""
        if self._place is not None:
            dotted = ".".join(map(str, self._place.path))
            self._screen.book.journal.keep(Typing(self._place.sheet, dotted, self._title, text))

    def give_up(self) -> None:
        """As if nothing had been typed."""
        self._place = None
        self._screen.book.journal.done()
        self._screen.ledger.focus()

    def accept(self, text: str) -> None:
        """Into the sheet with it, or say why not and keep the text."""
        place = self._place
        if place is None:
            return
        if text == words.typed(self._expected):
            self._close("")
            return
        pieces = fields.read(place, text)
        if isinstance(pieces, str):
            self._line.tell(pieces)
            return
        self._ask(place, pieces, text, {place.path: self._expected})

    def _ask(self, place: FieldPlace, pieces: tuple[Piece, ...], text: str, expected: dict[KeyPath, Any]) -> None:
        title = f"{'.'.join(map(str, place.path))} {text or 'taken out'}"
        outcome = self._screen.book.change(ChangeSheet(place.sheet, pieces, title, expected))
        if outcome.accepted:
            self._close(outcome.done)
        elif outcome.collision is not None:
            self._collided(outcome.collision, place, pieces, text)
        elif outcome.unused:
            self._without(outcome, place, pieces, text)
        else:
            self._line.tell("; ".join(problem.message for problem in outcome.problems))

    def _close(self, said: str) -> None:
        self._line.close()
        self.give_up()
        if said:
            self._screen.say(said)

    def _collided(self, collision: Collision, place: FieldPlace, pieces: tuple[Piece, ...], text: str) -> None:
        """Somebody else changed the same value: ask."""
        from worksheet.tui.dialogs.ask import AskDialog

        found = words.typed(collision.found) or "nothing"

        def done(letter: str | None) -> None:
            if letter == "m":
                self._ask(place, pieces, text, {})
            elif letter == "t":
                self._close(f"kept: {found}")

        said = f"While you were typing, somebody else changed {self._title} to {found}."
        answers = {"m": f"put {text or 'nothing'} there all the same", "t": f"keep {found}"}
        self._screen.app.push_screen(AskDialog("Changed by two", said, answers, self._screen.book.signs), done)

    def _without(self, outcome: Outcome, place: FieldPlace, pieces: tuple[Piece, ...], text: str) -> None:
        """The change leaves own names without a formula: ask whether they go too."""

        def done(letter: str | None) -> None:
            if letter == "y":
                gone = tuple(TakeOut(("own", name)) for name in outcome.unused)
                self._ask(place, (*pieces, *gone), text, {})

        ask_about_unused(self._screen, outcome.unused, done)


def ask_about_unused(screen: SheetScreen, unused: tuple[str, ...], done: Any) -> None:
    """Whether own names that nothing uses any more are to go with the change."""
    from worksheet.tui.dialogs.ask import AskDialog

    names = ", ".join(unused)
    said = f"No formula would use {names} any more, and a sheet has no unused names of its own."
    answers = {"y": f"take {names} out with it"}
    screen.app.push_screen(AskDialog("Unused names", said, answers, screen.book.signs), done)


def remove(screen: SheetScreen) -> None:
    """Take out what the cursor is on."""
    row = screen.ledger.row
    path = None if row is None else path_of(row)
    if path is None:
        return
    field = screen.ledger.field
    first = row.fields[0] if row is not None and row.fields else None
    inner = field is not None and first is not None and field.path != first.path and len(field.path) > len(path)
    if inner and field is not None and field.text:
        path = field.path
    _remove(screen, (TakeOut(path),), ".".join(map(str, path)))


def _remove(screen: SheetScreen, pieces: tuple[Piece, ...], what: str) -> None:
    outcome = screen.ask_for(ChangeSheet(screen.name_of_sheet, pieces, f"{what} taken out"))
    if outcome.unused:

        def done(letter: str | None) -> None:
            if letter == "y":
                _remove(screen, (*pieces, *(TakeOut(("own", name)) for name in outcome.unused)), what)

        ask_about_unused(screen, outcome.unused, done)


def path_of(row: Row) -> KeyPath | None:
    """Where a row's whole entry stands in the file."""
    table, _, name = row.key.partition(".")
    if table in ("target", "assume", "own", "choose"):
        return (table, name)
    if table in ("evidence", "waiver", "remark", "acceptance"):
        return (table, int(name))
    return None
