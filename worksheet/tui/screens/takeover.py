"""The screen on which a block changes hands: what is asked, new, stale and weak, each checked or asked about."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Mapping
from dataclasses import dataclass
from typing import Any, ClassVar

from textual.binding import BindingType
from textual.widget import Widget

from worksheet.model.keys import TRUST
from worksheet.project.links import values_of
from worksheet.session import deciding, taking_over
from worksheet.session.edits import ChangeSheet, Put
from worksheet.session.taking_over import Step
from worksheet.tui import commands
from worksheet.tui.dialogs.form import FormLine
from worksheet.tui.pages import takeover_page
from worksheet.tui.recomputed import today
from worksheet.tui.rows import Row
from worksheet.tui.screens.deciding import DecidingPlace
from worksheet.tui.screens.place import bindings
from worksheet.tui.screens.view import View
from worksheet.tui.widgets.lines import Lines

_DETAIL = 5


@dataclass(frozen=True, eq=False, slots=True)
class Led:
    """What a block's taker is led through, since which revision something is new, and the book's own revision."""

    steps: tuple[Step, ...]
    since: str
    revision: int


class TakeoverScreen(View, DecidingPlace):
    """What to look at before a block is one's own."""

    PLACE = commands.TAKEOVER
    BINDINGS: ClassVar[list[BindingType]] = [*bindings(commands.TAKEOVER)]

    def __init__(self, name: str) -> None:
        """Take the block's name."""
        super().__init__(name)
        self._since: str | None = None

    def compose_page(self) -> Iterable[Widget]:
        """The steps, and what is known of the one under the cursor."""
        yield from super().compose_page()
        yield Lines(id="detail")

    @property
    def led(self) -> Led | None:
        """What was found, None while it is being worked out."""
        return self.found if isinstance(self.found, Led) else None

    def asked(self) -> tuple[object, ...]:
        """Results bring the stale and the weak."""
        return (None if self.book.results is None else self.book.results.revision,)

    def job(self) -> Callable[[], Any]:
        """The steps; what is shown stays until there are results of the book as it stands."""
        results, snapshot, session = self.book.results, self.snapshot, self.book.session
        result = None if results is None else results.sheet(self.name_of_sheet)
        if results is None or result is None or results.revision != snapshot.revision:
            kept = self.found
            return lambda: kept
        root, person = snapshot.project.root, self.person

        def work() -> Led:
            if self._since is None:
                self._since = taking_over.last_seen(root, person)
            found = taking_over.steps(root, session.evaluator(snapshot), result, today(), self._since)
            return Led(found, self._since, snapshot.revision)

        return work

    def rows_found(self) -> Iterable[Row]:
        """The steps, section by section."""
        return () if self.led is None else takeover_page.page(self.led.steps, self.columns, self.book.signs).rows

    def draw(self) -> None:
        """Title, steps, and what is known of the one under the cursor."""
        super().draw()
        sheet = self.snapshot.project.sheets.get(self.name_of_sheet)
        owner, since = "" if sheet is None else sheet.owner, "" if self.led is None else self.led.since
        head = takeover_page.title_line(self.name_of_sheet, owner, since, self.book.signs)
        self.query_one("#title", Lines).show([head])
        self._show_detail()

    @property
    def present(self) -> Step | None:
        """The step under the cursor."""
        row, led = self.ledger.row, self.led
        if row is None or led is None:
            return None
        return next((step for step in led.steps if takeover_page.key_of(step) == row.key), None)

    def _show_detail(self) -> None:
        lines = takeover_page.detail_lines(self.present, self.app.size.width - 2, self.book.signs)[:_DETAIL]
        self.query_one("#detail", Lines).show([*lines, *[()] * (_DETAIL - len(lines))])

    def holds(self) -> set[str]:
        """What the step under the cursor may be answered with."""
        held, step = super().holds() - {"row"}, self.present
        if step is None:
            return held
        held.add("row")
        if step.number is not None:
            held.add("remark")
        if self._checked(step) is not None:
            held.add("value")
        return held

    def _checked(self, step: Step) -> tuple[str, str] | None:
        """Where the value stands that a step is about, if the sheet states it."""
        sheet = self.snapshot.project.sheets.get(self.name_of_sheet)
        table, _, rest = step.key.partition(".")
        name = rest.partition(".")[0]
        return (table, name) if sheet is not None and f"{table}.{name}" in values_of(sheet) else None

    def on_ledger_moved(self) -> None:
        """Another step."""
        self._show_detail()
        self.show_foot()

    # Commands

    def action_look(self) -> None:
        """Open the sheet where the step is about."""
        step = self.present
        if step is not None:
            parts = step.key.split(".")
            self.book.open_sheet(self.name_of_sheet, ".".join(parts[:2]) if len(parts) > 1 else "")

    def action_checked(self) -> None:
        """Stand by a value that was looked up again."""
        step = self.present
        place = None if step is None else self._checked(step)
        sheet = self.snapshot.project.sheets.get(self.name_of_sheet)
        if step is None or place is None or sheet is None:
            return
        stated = values_of(sheet)[".".join(place)]

        def wrong(text: str) -> str:
            return "" if text in TRUST else f"Found {text}, expected one of {', '.join(TRUST)}."

        lines = [
            FormLine("trust", "Trust", f"How far it is to be trusted now: {', '.join(TRUST)}.", stated.trust, wrong,
                     lambda text: [one for one in TRUST if one.startswith(text)]),
        ]  # fmt: skip

        def made(texts: Mapping[str, str]) -> ChangeSheet | str:
            trust = "" if texts["trust"] == stated.trust else texts["trust"]
            return deciding.check(self.name_of_sheet, place, texts["by"], today(), trust)

        self.decide(f"Checked: {'.'.join(place)}", lines, made)

    def action_ask(self) -> None:
        """Ask somebody about the step."""
        step, sheet = self.present, self.snapshot.project.sheets.get(self.name_of_sheet)
        if step is None or sheet is None:
            return
        lines = [
            FormLine("to", "To", "Who is asked.", sheet.owner),
            FormLine("text", "Question (needed)", "What you want to know or have done."),
        ]

        def made(texts: Mapping[str, str]) -> ChangeSheet | str:
            if not texts["text"]:
                return "Say what you want to know."
            return deciding.remark(self.name_of_sheet, texts["by"], texts["text"], today(), texts["to"], step.key)

        self.decide(f"Ask about {step.key or self.name_of_sheet}", lines, made)

    def action_settle(self) -> None:
        """Settle the remark with an answer."""
        step = self.present
        if step is not None and step.number is not None:
            self.settle_remark(self.name_of_sheet, step.number)

    def action_keep(self) -> None:
        """Become the one who answers for the block."""

        def made(texts: Mapping[str, str]) -> ChangeSheet | str:
            return ChangeSheet(self.name_of_sheet, (Put(("owner",), texts["by"]),), "taken over")

        self.decide(f"Take {self.name_of_sheet} over", [], made)
