"""What stands behind one number of a sheet: followed from number to input and back, worked out off the event loop."""

from __future__ import annotations

from collections.abc import Sequence

from textual.message import Message

from worksheet.review.fragility import Fragile
from worksheet.session.session import Session
from worksheet.session.snapshot import Snapshot
from worksheet.solver.results import Window
from worksheet.stages import catalogue
from worksheet.tui import commands
from worksheet.tui.explained import Explained, explained, name_of
from worksheet.tui.pages import algebra_page, behind_page
from worksheet.tui.pages.parts import Facts
from worksheet.tui.recompute import Recompute, Stamped
from worksheet.tui.rows import HEAD, QUIET, line
from worksheet.tui.screens.place import Place, bindings
from worksheet.tui.widgets.lines import Lines

Subject = tuple[str, str]


class AlgebraScreen(Place):
    """One number at a time, with a way back through those before."""

    PLACE = commands.ALGEBRA
    BINDINGS = bindings(commands.ALGEBRA)

    class Made(Message):
        """The algebra of a number has been found."""

        def __init__(self, stamped: Stamped[Explained]) -> None:
            super().__init__()
            self.stamped = stamped

    class Ranked(Message):
        """The ranking of the sheet's inputs has been worked out."""

        def __init__(self, stamped: Stamped[Sequence[Fragile]]) -> None:
            super().__init__()
            self.stamped = stamped

    class Solved(Message):
        """The window of an unknown has been worked out."""

        def __init__(self, stamped: Stamped[Window | None]) -> None:
            super().__init__()
            self.stamped = stamped

    def __init__(self, name: str, kind: str, subject: str) -> None:
        """Take the sheet's name and what the number is, as its row says."""
        super().__init__()
        self.name_of_sheet = name
        self.trail: list[Subject] = [(kind, subject)]
        self._fragile: Sequence[Fragile] = ()
        self._explained: Explained | None = None
        self._explaining: tuple[int, str, int] | None = None
        self._asked: Window | None = None
        self._wanted: int | None = None
        self._ranks: Recompute[Sequence[Fragile]] = Recompute(self._ranked)
        self._solves: Recompute[Window | None] = Recompute(self._solved)
        self._explains: Recompute[Explained] = Recompute(self._made)

    def _made(self, stamped: Stamped[Explained]) -> None:
        self.post_message(self.Made(stamped))

    def _ranked(self, stamped: Stamped[Sequence[Fragile]]) -> None:
        self.post_message(self.Ranked(stamped))

    def _solved(self, stamped: Stamped[Window | None]) -> None:
        self.post_message(self.Solved(stamped))

    # What it shows

    def show_book(self) -> None:
        """The number, from the book as it stands."""
        if not self.stands:
            return
        book, snapshot, name = self.book, self.snapshot, self.name_of_sheet
        result = None if book.results is None else book.results.sheet(name)
        solved = book.needed.solved if book.needed is not None and book.needed.name == name else None
        facts = Facts(snapshot, name, result, solved, self.columns, book.signs, {}, book.hands_for(name))
        kind, subject = self.trail[-1]
        self._explain(facts.columns)
        page = behind_page.page(facts, kind, subject, self._fragile, self._asked, self._explained)
        self.ledger.show(page)
        trail = " < ".join(_shown(one) for _, one in reversed(self.trail))
        self.query_one("#title", Lines).show([line(facts.text(name, HEAD), facts.text(trail, QUIET), gap=2)])
        if self._wanted != snapshot.revision:
            self._wanted = snapshot.revision
            session = book.session
            self._ranks.want(snapshot.revision, lambda: ranking(session, snapshot, name))
        self.show_foot()

    def _explain(self, columns: int) -> None:
        """Have the algebra found, where it is not that of this number, this book and this width."""
        asked = (self.snapshot.revision, number_of(*self.trail[-1], self.snapshot, self.name_of_sheet), columns - 2)
        if asked == self._explaining:
            return
        if self._explaining is None or asked[1] != self._explaining[1]:
            self._explained = None
        self._explaining = asked
        session, snapshot, name, plain = self.book.session, self.snapshot, self.name_of_sheet, self.book.signs.plain
        self._explains.want(asked[0], lambda: explained(session, snapshot, name, asked, plain=plain))

    def on_algebra_screen_made(self, message: AlgebraScreen.Made) -> None:
        """Show it, unless another one is asked for by now."""
        stamped = message.stamped
        if stamped.error:
            self.say(f"The algebra cannot be found: {stamped.error}", wrong=True)
        if stamped.value is not None and stamped.value.asked == self._explaining:
            self._explained = stamped.value
            self.show_book()

    def on_ledger_moved(self) -> None:
        """Other commands may hold here."""
        self.show_foot()

    def on_ledger_resized(self) -> None:
        """Another width."""
        self.show_book()

    def on_algebra_screen_ranked(self, message: AlgebraScreen.Ranked) -> None:
        """Show it, unless it belongs to another revision by now."""
        if message.stamped.revision == self.snapshot.revision:
            self._fragile = message.stamped.value or ()
            if message.stamped.error:
                self.say(f"The ranking cannot be worked out: {message.stamped.error}", wrong=True)
            self.show_book()

    def on_algebra_screen_solved(self, message: AlgebraScreen.Solved) -> None:
        """Show it, unless it belongs to another revision by now."""
        if message.stamped.revision == self.snapshot.revision:
            self._asked = message.stamped.value
            self.say("" if self._asked else f"No target bounds that. {message.stamped.error or ''}")
            self.show_book()

    def on_unmount(self) -> None:
        """Begin nothing more."""
        self._ranks.stop()
        self._solves.stop()
        self._explains.stop()

    # Commands

    def holds(self) -> set[str]:
        """There is an input to follow, or a target to solve."""
        held = super().holds()
        row = self.ledger.row
        if row is not None and row.subject[0] in ("variable", "metric", algebra_page.EXPLAIN):
            held.add("row")
        if self.trail[-1][0] in ("metric", "bound"):
            held.add("target")
        return held

    def action_follow(self) -> None:
        """Go to what the cursor is on."""
        row = self.ledger.row
        if row is not None and row.subject[0] and row.subject != self.trail[-1]:
            self.trail.append(row.subject)
            self._asked = None
            self.show_book()
            self.ledger.action_edge(-1)

    def action_back(self) -> None:
        """The number before, or the sheet."""
        if len(self.trail) > 1:
            self.trail.pop()
            self.show_book()
        else:
            super().action_back()

    def action_unknown(self) -> None:
        """Choose another unknown and solve for it."""
        from worksheet.tui.dialogs.pick import Item, PickDialog

        names = dict.fromkeys(one.name.rpartition(".")[2] for one in self._fragile)
        items = [Item(name, name) for name in ("inversion_coefficient", *names)]
        self.app.push_screen(PickDialog("Solve for", items, self.book.signs), self._solve_for)

    def _solve_for(self, unknown: str | None) -> None:
        if unknown is not None:
            session, snapshot, name = self.book.session, self.snapshot, self.name_of_sheet
            self.say(f"solving for {unknown}...")
            self._solves.want(snapshot.revision, lambda: window_for(session, snapshot, name, unknown))


def number_of(kind: str, name: str, snapshot: Snapshot, sheet: str) -> str:
    """The number that a row is about, as the algebra knows it: explained.name_of."""
    if kind == algebra_page.EXPLAIN:
        return name
    if kind == "bound":
        name = name.partition(":")[2]
    if kind == "operating":
        stage = catalogue.find(snapshot.project.sheets[sheet].stage) if sheet in snapshot.project.sheets else None
        name = f"{stage.transistors[0].name if stage is not None else 'main'}.{name}"
    return name_of(name)


def _shown(subject: str) -> str:
    """A number of the trail as it is called."""
    return (subject.partition(":")[2] or subject).removesuffix("@0")


def ranking(session: Session, snapshot: Snapshot, name: str) -> Sequence[Fragile]:
    """How far every input of a sheet can move, at the nominal condition."""
    from worksheet.review.fragility import fragility

    evaluator = session.evaluator(snapshot)
    return (
        ()
        if evaluator is None or name not in snapshot.project.sheets
        else fragility(evaluator, {name: {}})[name].nominal
    )


def window_for(session: Session, snapshot: Snapshot, name: str, unknown: str) -> Window | None:
    """The window of one unknown; None where no target bounds it."""
    from worksheet.session.needs import Needs

    evaluator = session.evaluator(snapshot)
    if evaluator is None:
        return None
    found = Needs.at(session.root, evaluator, name, unknown=unknown)
    if isinstance(found, Needs):
        return found.solved.needed.get(unknown)
    raise ValueError(found[0].message)
