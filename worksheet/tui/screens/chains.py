"""The signal paths of the project: what each achieves, and what every sheet takes of it."""

from __future__ import annotations

from collections.abc import Iterable

from worksheet.report import chains_text
from worksheet.report.table import lines
from worksheet.review.chained import ChainReview
from worksheet.tui import commands
from worksheet.tui.rows import HEAD, LABEL, MISSED, PLAIN, QUIET, Page, Row, Span, line
from worksheet.tui.screens.place import Place, bindings
from worksheet.tui.widgets.lines import Lines


class ChainScreen(Place):
    """All chains of the project file."""

    PLACE = commands.CHAIN
    BINDINGS = bindings(commands.CHAIN)

    def show_book(self) -> None:
        """The chains of the book as it stands."""
        if not self.stands:
            return
        results = self.book.results
        chains = () if results is None else results.review.chains
        stale = results is None or results.revision != self.snapshot.revision
        title = [Span("Signal paths", HEAD), Span("what each achieves, and what every sheet takes of it", PLAIN)]
        self.query_one("#title", Lines).show([line(*title, Span("working..." if stale else "", LABEL), gap=2)])
        rows = [row for chain in chains for row in self._rows(chain)]
        if not rows:
            said = "No chains yet. A table [chain.NAME] in biasbook.toml names the sheets of one, in signal order."
            rows = [Row("none", ((Span(said, QUIET),),), stops=False)]
        self.ledger.show(Page(tuple(rows)))
        self.show_foot()

    def _rows(self, chain: ChainReview) -> Iterable[Row]:
        """The lines of the text, the line of every sheet a row of its own."""
        signs, name = self.book.signs, chain.chain.name
        table = lines(chains_text.shares_table(chain), self.columns, "  ")[1:] if chain.stages else []
        sheets = dict(zip(table, chain.chain.sheets, strict=False))
        for k, text in enumerate(chains_text.chain(chain, self.columns)):
            sheet = sheets.get(text)
            role = HEAD if k == 0 else MISSED if text.endswith(("MISSED", "UNKNOWN")) else PLAIN
            subject = ("sheet", sheet) if sheet is not None else ("", "")
            spans = (Span(signs.text(text), role),)
            yield Row(f"{name}.{k}", (spans,), stops=sheet is not None, subject=subject, copied=tuple(text.split("  ")))
        yield Row(f"{name}.end", ((),), stops=False)

    def on_ledger_moved(self) -> None:
        """Other commands may hold here."""
        self.show_foot()

    def on_ledger_resized(self) -> None:
        """Another width."""
        self.show_book()

    def holds(self) -> set[str]:
        """There is a sheet under the cursor."""
        held = super().holds()
        row = self.ledger.row if self.is_mounted else None
        return held | {"row"} if row is not None and row.subject[0] == "sheet" else held

    def action_look(self) -> None:
        """The sheet under the cursor."""
        row = self.ledger.row
        if row is not None and row.subject[0] == "sheet":
            self.book.open_sheet(row.subject[1])
