"""The screen of a review meeting: walk through what wants a decision, decide, and leave with minutes and a revision."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from decimal import ROUND_CEILING, ROUND_FLOOR, Decimal
from typing import Any, ClassVar

from textual.binding import BindingType
from textual.message import Message
from textual.widget import Widget

from worksheet.model.problem import Problem
from worksheet.model.quantity import format_input
from worksheet.model.sheet_keys import WAIVER
from worksheet.review.agenda import Item, Why, agenda
from worksheet.review.state import left_behind
from worksheet.session import deciding, fields, meeting
from worksheet.session.edits import ChangeSheet, Put
from worksheet.tui import commands
from worksheet.tui.dialogs.form import FormDialog, FormLine
from worksheet.tui.dialogs.pick import Item as Choice
from worksheet.tui.dialogs.pick import PickDialog
from worksheet.tui.pages import meeting_page
from worksheet.tui.recompute import Recompute, Stamped
from worksheet.tui.recomputed import today
from worksheet.tui.screens.deciding import DecidingPlace
from worksheet.tui.screens.place import bindings
from worksheet.tui.screens.tracing import moved
from worksheet.tui.widgets.ledger import Ledger
from worksheet.tui.widgets.lines import Lines

_DETAIL = 6
_EVERYTHING = "everything"


class MeetingScreen(DecidingPlace):
    """What wants a decision, block by block."""

    PLACE = commands.MEETING
    BINDINGS: ClassVar[list[BindingType]] = [*bindings(commands.MEETING)]

    def __init__(self) -> None:
        super().__init__()
        self._only: Why | None = None
        self._start = meeting.Start({})
        self._closes = 0
        self._work: Recompute[meeting.Closed | Problem] = Recompute(self._deliver)

    def compose_page(self) -> Iterable[Widget]:
        """Heading, items, what is known of the one under the cursor."""
        yield Lines([()], id="heading")
        yield Ledger(self.book.signs.pointer, id="body")
        yield Lines(id="detail")

    def on_mount(self) -> None:
        """Remember what the meeting begins with."""
        self._start = meeting.Start(self.snapshot.project.sheets)
        self.query_one("#heading", Lines).show([meeting_page.heading()])
        super().on_mount()

    # What it shows

    @property
    def items(self) -> tuple[Item, ...]:
        """Everything that wants a decision."""
        results = self.book.results
        return () if results is None else agenda(results.review, today())

    def show_book(self) -> None:
        """Everything anew; only what changed is drawn."""
        if not self.stands:
            return
        every, signs = self.items, self.book.signs
        shown = [item for item in every if self._only in (None, item.why)]
        title = self.book.results.review.title if self.book.results is not None else ""
        only = "" if self._only is None else self._only.value
        head = meeting_page.title_line(every, len(shown), title, only, signs)
        self.query_one("#title", Lines).show([head])
        self.ledger.show(meeting_page.page(shown, signs))
        self._show_detail()
        self.show_foot()

    def _show_detail(self) -> None:
        room = min(_DETAIL, max(self.app.size.height - 10, 0))
        lines = meeting_page.detail_lines(self.present, self.app.size.width - 2, self.book.signs)[:room]
        self.query_one("#detail", Lines).show([*lines, *[()] * (room - len(lines))])

    @property
    def present(self) -> Item | None:
        """The item under the cursor."""
        row = self.ledger.row
        return next((item for item in self.items if row is not None and meeting_page.key_of(item) == row.key), None)

    def holds(self) -> set[str]:
        """What the item under the cursor may be decided by."""
        held, item = super().holds(), self.present
        if item is None or not item.sheet or item.sheet not in self.snapshot.project.sheets:
            return held
        held |= {"row", "sheet"}
        if item.why is Why.REMARK:
            held.add("remark")
        if item.target is not None and item.why in (Why.MISSED, Why.UNKNOWN, Why.PAST, Why.WORSE):
            held.add("waivable")
        result = self.book.results and self.book.results.sheet(item.sheet)
        return held | {"moved"} if result and left_behind(result) else held

    def on_ledger_moved(self) -> None:
        """Another item: what is known of it below."""
        self._show_detail()
        self.show_foot()

    def on_ledger_resized(self) -> None:
        """Another width."""
        self.show_book()

    # Commands

    def action_look(self) -> None:
        """Open the sheet, at the target."""
        item = self.present
        if item is not None and item.sheet:
            self.book.open_sheet(item.sheet, f"target.{item.about}" if item.target is not None else "")

    def action_moved(self) -> None:
        """What moved since the block was accepted and its evidence found."""
        item = self.present
        result = self.book.results and item and self.book.results.sheet(item.sheet)
        if result:
            moved(self, result)

    def action_kinds(self) -> None:
        """Show one kind of thing only."""
        every = self.items
        counts = {why: sum(item.why is why for item in every) for why in Why}
        choices = [Choice(_EVERYTHING, f"everything ({len(every)})")]
        choices += [Choice(why.name, f"{why.value} ({count})") for why, count in counts.items() if count]

        def done(name: str | None) -> None:
            if name is not None:
                self._only = None if name == _EVERYTHING else Why[name]
                self.show_book()

        present = _EVERYTHING if self._only is None else self._only.name
        self.app.push_screen(PickDialog("Show", choices, self.book.signs, present), done)

    def action_accept(self) -> None:
        """Accept the block for the inputs that it has now."""
        item = self.present
        result = None if item is None or self.book.results is None else self.book.results.sheet(item.sheet)
        if item is None or result is None:
            return
        if self.book.results is None or self.book.results.revision != self.snapshot.revision:
            self.say("The results are still being worked out; a moment.", wrong=True)
            return
        sheet, basis = item.sheet, result.basis
        lines = [FormLine("note", "On what grounds", "What the acceptance rests on; may stay empty.")]

        def made(texts: Mapping[str, str]) -> ChangeSheet | str:
            return deciding.accept(sheet, basis, texts["by"], today(), texts["note"])

        self.decide(f"Accept {sheet}", lines, made)

    def action_waive(self) -> None:
        """Accept the miss, for a value and until a day."""
        item = self.present
        if item is None or item.target is None:
            return
        sheet, about = item.sheet, item.about
        places = {
            name: place
            for name in ("value", "until")
            if (place := fields.coming(self.snapshot, sheet, (WAIVER.name, 0, name), about)) is not None
        }
        lines = [FormLine("reason", "Why (needed)", "Why the miss is acceptable.")]
        lines += [
            _line(name, place, self._worst(item, place) if name == "value" else "") for name, place in places.items()
        ]

        def made(texts: Mapping[str, str]) -> ChangeSheet | str:
            if not texts["reason"]:
                return "Say why the miss is acceptable."
            stated: dict[str, Any] = {}
            for name, place in places.items():
                found = fields.read(place, texts[name]) if texts[name] else ()
                if isinstance(found, str):
                    return found
                for piece in found:
                    if isinstance(piece, Put):
                        stated[name] = piece.value
            return deciding.waive(sheet, about, texts["by"], texts["reason"], today(), **stated)

        self.decide(f"Waive {about} of {sheet}", lines, made)

    def _worst(self, item: Item, place: fields.Place) -> str:
        """The worst value as one would type it, rounded so that the waiver covers it."""
        found = item.target
        if found is None or found.worst is None:
            return ""
        below = found.target.minimum is not None and found.worst < found.target.minimum
        worst = rounded(found.worst, ROUND_FLOOR if below else ROUND_CEILING)
        dimension = place.key.dimension
        return f"{worst:g}" if dimension is None else format_input(worst, dimension)

    def action_send_back(self) -> None:
        """Back to whoever keeps the block, with what is wanted."""
        item = self.present
        if item is None or not item.sheet:
            return
        sheet, about = item.sheet, self._key_of(item)
        owner = self.snapshot.project.sheets[sheet].owner
        lines = [
            FormLine("to", "To", "Who is asked.", owner),
            FormLine("text", "What is wanted (needed)", "What has to be done or answered before it comes back."),
        ]

        def made(texts: Mapping[str, str]) -> ChangeSheet | str:
            if not texts["text"]:
                return "Say what is wanted."
            return deciding.send_back(sheet, texts["by"], texts["text"], today(), texts["to"], about)

        self.decide(f"Send {sheet} back", lines, made)

    @staticmethod
    def _key_of(item: Item) -> str:
        return f"target.{item.about}" if item.target is not None else item.about

    def action_settle(self) -> None:
        """Settle the remark with an answer."""
        item = self.present
        if item is None or item.number is None:
            return
        self.settle_remark(item.sheet, item.number)

    class Closed(Message):
        """The minutes are written, or it is known why not."""

        def __init__(self, stamped: Stamped[meeting.Closed | Problem]) -> None:
            super().__init__()
            self.stamped = stamped

    def _deliver(self, stamped: Stamped[meeting.Closed | Problem]) -> None:
        self.post_message(self.Closed(stamped))

    def action_minutes(self) -> None:
        """End the meeting: the page of minutes, and a revision."""
        lines = [
            FormLine("present", "Present", "Who was there; may stay empty."),
            FormLine("note", "Note", "Of the revision; left empty, it counts the decisions."),
        ]

        def close(texts: Mapping[str, str]) -> str:
            self.say("writing the minutes...")
            self._closes += 1
            self._work.want(self._closes, lambda: self._close(texts["present"], texts["note"]))
            return ""

        self.app.push_screen(FormDialog("Minutes", lines, close, self.book.signs))

    def _close(self, present: str, note: str) -> meeting.Closed | Problem:
        """In a thread: decisions are counted from the newest revision, or without one from the meeting's beginning."""
        root = self.snapshot.project.root
        since = meeting.since(root, "HEAD", today())
        start = since if isinstance(since, meeting.Start) else self._start
        with self.book.writing:
            return meeting.close(root, start, today(), present=present, note=note)

    def on_meeting_screen_closed(self, message: MeetingScreen.Closed) -> None:
        """Say what came of it."""
        found = message.stamped.value
        if not isinstance(found, meeting.Closed):
            self.say(message.stamped.error or str(found), wrong=True)
            return
        made = f"recorded {found.revision[:10]}" if found.revision else " ".join(found.remarks)
        self.say(f"{found.file}: {len(found.decided)} decisions; {made}")

    def on_unmount(self) -> None:
        """Begin nothing more."""
        self._work.stop()


def rounded(value: float, way: str) -> float:
    """A number to four digits, towards one side. `way` is a rounding of the decimal module."""
    exact = Decimal(value)
    return value if exact.is_zero() else float(exact.quantize(Decimal(1).scaleb(exact.adjusted() - 3), rounding=way))


def _line(name: str, place: fields.Place, text: str) -> FormLine:
    def wrong(typed: str) -> str:
        found = fields.read(place, typed)
        return found if isinstance(found, str) else ""

    return FormLine(name, place.key.title, place.key.help, text, wrong, lambda typed: fields.complete(place, typed))
