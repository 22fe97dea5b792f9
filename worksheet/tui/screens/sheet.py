"""A sheet's screen: its page with a cursor on one value, the stage beside it, and the value changed where it stands."""

from __future__ import annotations

from collections.abc import Iterable

from textual.containers import Horizontal
from textual.widget import Widget

from worksheet.model.keys import Kind
from worksheet.review.state import left_behind
from worksheet.session.edits import ChangeSheet, Put, RenameSheet
from worksheet.session.needs import shown_input
from worksheet.tui import commands
from worksheet.tui.pages import parts, sheet_page, stage_part, words
from worksheet.tui.pages.parts import Facts
from worksheet.tui.rows import HEAD, LABEL, MISSED, PLAIN, QUIET, Page, Span, line
from worksheet.tui.screens import adding, changing, stepping
from worksheet.tui.screens.place import Place, bindings
from worksheet.tui.widgets.in_place import InPlace
from worksheet.tui.widgets.ledger import Ledger
from worksheet.tui.widgets.lines import Lines

REMOVABLE = ("target", "assume", "own", "choose", "evidence", "waiver", "remark", "acceptance")
"""Parts whose rows can be taken out of the sheet."""

_WIDE = 116
"""Columns from which on the stage has a column of its own."""


class SheetScreen(Place):
    """One sheet."""

    PLACE = commands.SHEET
    BINDINGS = bindings(commands.SHEET)

    def __init__(self, name: str, row: str = "") -> None:
        """Take the sheet's name, and the row that the cursor begins on."""
        super().__init__()
        self.name_of_sheet = name
        self.step_kind = "5 %"
        self.change = changing.Change(self)
        self._first = row
        self._with_stage = True

    def compose_page(self) -> Iterable[Widget]:
        """The page, the stage beside it, the line to type in."""
        with Horizontal():
            yield Ledger(self.book.signs.pointer, id="body")
            yield Lines(id="side")
        yield InPlace(self.book.signs, id="in-place")

    # What it shows

    def facts(self) -> Facts:
        """Everything that the page is made of."""
        book, name = self.book, self.name_of_sheet
        result = None if book.results is None else book.results.sheet(name)
        needed = book.needed if book.needed is not None and book.needed.name == name else None
        proposal = {} if needed is None else needed.proposal
        solved = None if needed is None else needed.solved
        return Facts(self.snapshot, name, result, solved, self.columns, book.signs, proposal, book.hands_for(name))

    @property
    def columns(self) -> int:
        """Room for a row."""
        wide = self.app.size.width - (37 if self._beside else 0)
        return max(wide - 3, 20)

    @property
    def _beside(self) -> bool:
        return self._with_stage and self.app.size.width >= _WIDE

    def show_book(self) -> None:
        """Everything anew; only what changed is drawn."""
        if not self.stands:
            return
        facts = self.facts()
        side = self.query_one("#side", Lines)
        side.display = self._beside
        if self._beside:
            side.show(stage_part.below(facts))
        self._show_title(facts)
        page = sheet_page.page(facts)
        if self._with_stage and not self._beside and self.app.size.height >= 22:
            page = Page((*stage_part.beside(facts), *page.rows), page.sections)
        self.ledger.show(page)
        if self._first and self.ledger.go(self._first):
            self._first = ""
        if self.change.open:
            self.call_after_refresh(self.change.place_again)
        self.show_foot()

    def _show_title(self, facts: Facts) -> None:
        data = facts.data
        result = facts.result
        said = [facts.text(self.name_of_sheet, HEAD), facts.text(str(data.get("title", "")), PLAIN)]
        state = words.typed(data.get("state")) or "draft" if result is None else result.state
        said.append(facts.text(state, LABEL) if data else facts.text("cannot be read", MISSED))
        if self.name_of_sheet not in self.snapshot.names:
            said.append(Span("is not there any more", words.VERDICT_ROLES["missed"]))
        elif result is not None:
            counts = ((result.count(v), v) for v in words.VERDICT_ROLES)
            said += [Span(f"{n} {v}", words.VERDICT_ROLES[v]) for n, v in counts if n]
        kind = ", ".join(words.typed(data[key]) for key in ("stage", "device") if key in data)
        stale = self.book.results is None or self.book.results.revision != self.snapshot.revision
        tail = Span("working..." if stale else f"step {self.step_kind}", LABEL)
        read_only = [Span("for reading only", LABEL)] if self.snapshot.read_only else []
        margins = words.margin_strip(() if result is None else result.targets, self.app.size.width - 16)
        shown = [line(*said, *read_only, facts.text(kind, QUIET), gap=2), line(tail, *margins, gap=2)]
        self.query_one("#title", Lines).show(shown)

    def on_ledger_moved(self) -> None:
        """Other commands may hold here."""
        self.show_foot()

    def on_ledger_resized(self) -> None:
        """Another width."""
        self.show_book()

    def on_resize(self) -> None:
        """Another size."""
        self.show_book()

    def holds(self) -> set[str]:
        """What the cursor is on, and whether there is a proposal."""
        held = super().holds() | {"sheet"}
        field, row = self.ledger.field, self.ledger.row
        if field is not None:
            held.add("field")
            if field.key.kind in (Kind.QUANTITY, Kind.WHOLE):
                held.add("step")
        if row is not None:
            if self._traced() is not None:
                held |= {"row", "traced"}
            if row.subject[0] in ("metric", "variable", "bound", "operating"):
                held.add("number")
            if row.key.partition(".")[0] in REMOVABLE:
                held.add("removable")
        needed = self.book.needed
        if needed is not None and needed.name == self.name_of_sheet and needed.proposal:
            held.add("proposal")
        if self.snapshot.data(self.name_of_sheet).get("collision") or self.snapshot.sides(self.name_of_sheet):
            held.add("merge")
        result = self.book.results and self.book.results.sheet(self.name_of_sheet)
        return held | {"moved"} if result and left_behind(result) else held

    # Changing a value where it stands

    def action_edit(self) -> None:
        """Change the value under the cursor."""
        self.change.begin(self.ledger.field)

    def resume_typing(self, path: str, text: str) -> None:
        """Go on with a text that was left behind."""
        self.change.resume(path, text)

    def on_in_place_typed(self, message: InPlace.Typed) -> None:
        """Keep the text outside the project."""
        self.change.typed(message.text)

    def on_in_place_accepted(self, message: InPlace.Accepted) -> None:
        """Into the sheet with it, or say why not."""
        self.change.accept(message.text)

    def on_in_place_given_up(self) -> None:
        """As if nothing had been typed."""
        self.change.give_up()

    # Commands

    def action_step_up(self) -> None:
        """More of it."""
        stepping.step(self, up=True)

    def action_step_down(self) -> None:
        """Less of it."""
        stepping.step(self, up=False)

    def action_step_size(self) -> None:
        """What one step is."""
        stepping.choose(self)

    def action_take(self) -> None:
        """Write the recommended point into the choices."""
        needed = self.book.needed
        if needed is not None and needed.revision != self.snapshot.revision:
            self.say("The proposal is still being worked out; a moment.", wrong=True)
            return
        keys = {key.name: key for key in parts.design(self.facts())}
        values = {} if needed is None else {n: v for n, v in needed.proposal.items() if n in keys}
        pieces = tuple(Put(("choose", name), shown_input(keys[name], value)) for name, value in values.items())
        if pieces:
            self.ask_for(ChangeSheet(self.name_of_sheet, pieces, "proposal taken over"))

    def action_add(self) -> None:
        """One more assumption, name, target, evidence or waiver."""
        adding.ask(self)

    def action_remove(self) -> None:
        """Take out what the cursor is on."""
        changing.remove(self)

    def _traced(self) -> tuple[str, bool] | None:
        """What the row under the cursor is over revisions: a dotted key or a metric; None for neither."""
        row = self.ledger.row
        if row is None:
            return None
        if row.key.startswith(("target.", "metric.")):
            return row.subject[1] or row.key.partition(".")[2], True
        table = row.key.partition(".")[0]
        return (row.key, False) if table in ("assume", "own", "choose") or row.subject[0] == "key" else None

    def action_trace(self) -> None:
        """This value or metric over all revisions."""
        from worksheet.tui.screens.tracing import trace

        found = self._traced()
        if found is not None:
            trace(self, self.name_of_sheet, found[0], metric=found[1])

    def action_moved(self) -> None:
        """What moved since the block was accepted and its evidence found."""
        from worksheet.tui.screens.tracing import moved

        result = self.book.results and self.book.results.sheet(self.name_of_sheet)
        if result:
            moved(self, result)

    def action_settle_merge(self) -> None:
        """Settle what a merge left."""
        from worksheet.tui.screens.merging import settle

        settle(self)

    def action_rename(self) -> None:
        """Give the sheet another name."""
        from worksheet.tui.dialogs.form import FormDialog
        from worksheet.tui.screens.book import name_line
        from worksheet.tui.screens.forming import submit

        def taken(texts: object) -> str:
            assert isinstance(texts, dict)
            wrong = submit(self.book, RenameSheet(self.name_of_sheet, texts["name"]))
            if not wrong:
                self.name_of_sheet = texts["name"]
                self.book.work()
            return wrong

        form = FormDialog(f"Rename {self.name_of_sheet}", [name_line(self.name_of_sheet)], taken, self.book.signs)
        self.app.push_screen(form)

    def action_next_section(self) -> None:
        """The next part."""
        self.ledger.go_section(1)

    def action_previous_section(self) -> None:
        """The part before."""
        self.ledger.go_section(-1)

    def action_next_sheet(self) -> None:
        """The sheet after this one."""
        self._other(1)

    def action_previous_sheet(self) -> None:
        """The sheet before this one."""
        self._other(-1)

    def _other(self, step: int) -> None:
        names = self.snapshot.names
        if names:
            present = names.index(self.name_of_sheet) if self.name_of_sheet in names else 0
            row = self.ledger.row
            self.book.open_sheet(names[(present + step) % len(names)], row.key if row is not None else "")

    def action_drawing(self) -> None:
        """Show or hide the stage."""
        self._with_stage = not self._with_stage
        self.show_book()

    def action_algebra(self) -> None:
        """What stands behind the number."""
        from worksheet.tui.screens.algebra import AlgebraScreen

        row = self.ledger.row
        if row is not None:
            self.app.push_screen(AlgebraScreen(self.name_of_sheet, *row.subject))

    def action_map(self) -> None:
        """Where all targets hold."""
        from worksheet.tui.screens.window_map import MapScreen

        self.app.push_screen(MapScreen(self.name_of_sheet))

    def action_variants(self) -> None:
        """What else the sheet could be."""
        from worksheet.tui.screens.variants import VariantsScreen

        self.app.push_screen(VariantsScreen(self.name_of_sheet))

    def action_sweep(self) -> None:
        """A metric over the quantity under the cursor, or over the bias current."""
        from worksheet.tui.screens.sweeping import SweepScreen

        row = self.ledger.row
        swept = row is not None and row.subject[0] in ("variable", "own")
        self.app.push_screen(
            SweepScreen(self.name_of_sheet, row.subject[1] if row is not None and swept else "bias_current")
        )

    def action_front(self) -> None:
        """The least current and area."""
        from worksheet.tui.screens.front import FrontScreen

        self.app.push_screen(FrontScreen(self.name_of_sheet))

    def action_failing(self) -> None:
        """What would break it."""
        from worksheet.tui.screens.failing import FailingScreen

        self.app.push_screen(FailingScreen(self.name_of_sheet))
