"""Steps of the value under the cursor."""

from __future__ import annotations

from typing import TYPE_CHECKING

from worksheet.session import fields, steps
from worksheet.session.edits import ChangeSheet

if TYPE_CHECKING:
    from worksheet.tui.screens.sheet import SheetScreen


def step(screen: SheetScreen, *, up: bool) -> None:
    """One step up or down, on disk at once."""
    field = screen.ledger.field
    place = None if field is None else fields.place(screen.snapshot, screen.name_of_sheet, field.path)
    if field is None or place is None:
        return
    found = steps.step(screen.snapshot, place, screen.step_kind, up=up, present=_present(screen, field.text))
    if isinstance(found, str):
        screen.say(found, wrong=True)
        return
    title = f"{'.'.join(map(str, field.path))} {found.text}"
    screen.ask_for(ChangeSheet(screen.name_of_sheet, found.pieces, title))


def _present(screen: SheetScreen, stated: str) -> float | None:
    """The number of a choice that the sheet leaves open. [SI]"""
    row, results = screen.ledger.row, screen.book.results
    result = None if results is None else results.sheet(screen.name_of_sheet)
    if row is None or result is None or (stated and stated != "propose"):
        return None
    choice = result.choices.get(row.key.removeprefix("choose."))
    return None if choice is None else choice.value


def choose(screen: SheetScreen) -> None:
    """What one step is."""
    from worksheet.tui.dialogs.pick import Item, PickDialog

    notes = {
        steps.GRID: "Widths and lengths go from one point of the process's grid to the next; the rest by 5 %.",
        steps.FINGER: "Widths grow by whole fingers, each as wide as before; the rest by 5 %.",
    }
    share = "A share of the value, which leads back the same way."
    items = [Item(kind, kind, notes.get(kind, share)) for kind in steps.KINDS]

    def done(kind: str | None) -> None:
        if kind:
            screen.step_kind = kind
            screen.show_book()

    screen.app.push_screen(PickDialog("One step is", items, screen.book.signs, screen.step_kind), done)
