"""What a merge left in a sheet, settled: one value for one side, or the whole file for one side."""

from __future__ import annotations

from collections.abc import Mapping
from typing import TYPE_CHECKING, cast

from worksheet.model.sheet_keys import COLLISION
from worksheet.session.edits import SettleCollision, TakeSide
from worksheet.tui.dialogs.ask import AskDialog
from worksheet.tui.dialogs.pick import Item, PickDialog
from worksheet.tui.pages import words

if TYPE_CHECKING:
    from worksheet.compare.settle import Side
    from worksheet.tui.screens.sheet import SheetScreen

_SIDES = {
    "standing": "what the sheet says now",
    "ours": "ours",
    "theirs": "theirs",
    "base": "before",
}


def settle(screen: SheetScreen) -> None:
    """Settle what the cursor is on; anywhere else the first thing that is left."""
    if screen.snapshot.sides(screen.name_of_sheet) is not None:
        _take_side(screen)
        return
    stated = screen.snapshot.data(screen.name_of_sheet).get(COLLISION.name)
    if not isinstance(stated, list) or not stated:
        return
    row = screen.ledger.row
    on_one = row is not None and row.subject[0] == COLLISION.name
    number = int(row.subject[1]) if row is not None and on_one else 0
    entry = stated[number] if number < len(stated) and isinstance(stated[number], Mapping) else {}

    def done(side: str | None) -> None:
        if side is not None:
            screen.ask_for(SettleCollision(screen.name_of_sheet, number, cast("Side", side)))

    items = [
        Item(side, title if side == "standing" else f"{title}: {words.typed(entry.get(side)) or 'not stated'}")
        for side, title in _SIDES.items()
    ]
    screen.app.push_screen(PickDialog(f"Settle {words.typed(entry.get('key'))}", items, screen.book.signs), done)


def _take_side(screen: SheetScreen) -> None:
    found = screen.snapshot.sides(screen.name_of_sheet)
    assert found is not None  # asked for where there are two sides
    answers = {"o": f"ours, {found.our_label or 'this side'}", "t": f"theirs, {found.their_label or 'the other side'}"}

    def done(letter: str | None) -> None:
        if letter is not None:
            screen.ask_for(TakeSide(screen.name_of_sheet, "ours" if letter == "o" else "theirs"))

    question = "A merge left both sides in the file. Which one is the sheet to be? Undo brings both back."
    screen.app.push_screen(AskDialog("Two sides", question, answers, screen.book.signs), done)
