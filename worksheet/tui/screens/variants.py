"""The variants of a sheet side by side: one taken over, one kept, one taken out."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Mapping
from typing import Any

from worksheet.report import variants_text
from worksheet.report.table import lines
from worksheet.review.variants import Column, SideBySide
from worksheet.session.alternatives import dropping, in_book, keeping, taking, variants_of
from worksheet.tui import commands
from worksheet.tui.recomputed import today
from worksheet.tui.rows import HEAD, MISSED, PLAIN, QUIET, VALUE, Row, Span, line
from worksheet.tui.screens.place import bindings
from worksheet.tui.screens.view import View

_NAME = 18


class VariantsScreen(View):
    """What a sheet could be, beside what it is."""

    PLACE = commands.VARIANTS
    BINDINGS = bindings(commands.VARIANTS)
    ABOUT = "what it states, and its variants"

    def job(self) -> Callable[[], Any]:
        """Every variant reviewed."""
        session, snapshot, name, day = self.book.session, self.snapshot, self.name_of_sheet, today()
        return lambda: in_book(session, snapshot, name, lambda evaluator, one: variants_of(evaluator, one, day))

    def rows_found(self) -> Iterable[Row]:
        """A row a variant, then the table."""
        found: SideBySide = self.found
        signs = self.book.signs
        for column in found.columns:
            yield self._row(column)
        if len(found.columns) == 1:
            said = "No variants yet: keep the present choice as one, then change the sheet."
            yield Row("none", ((Span(signs.text(said), QUIET),),), stops=False)
        for n, table in enumerate(variants_text.tables(found, self.columns)):
            yield Row(f"gap.{n}", ((),), stops=False)
            for k, text in enumerate(lines(table, self.columns, "  ")):
                role = HEAD if not k else MISSED if " MISSED" in text or " UNKNOWN" in text else PLAIN
                spans = (Span(signs.text(text), role),)
                yield Row(f"table.{n}.{k}", (spans,), stops=bool(k), copied=(text.strip(),))

    def _row(self, column: Column) -> Row:
        signs = self.book.signs
        title = variants_text.title(column)
        missed = [] if column.review is None else [t for t in column.review.targets if t.verdict == "missed"]
        said = (
            "cannot be reviewed" if column.review is None else f"{len(missed)} missed" if missed else "nothing missed"
        )
        spans = (
            Span(signs.text(title), VALUE, _NAME),
            Span(said, MISSED if missed or column.review is None else PLAIN, 14),
            Span(signs.text(column.note or ""), QUIET),
        )
        subject = ("variant", column.name) if column.name else ("", "")
        return Row(f"variant.{column.name}", (line(*spans),), subject=subject, copied=(title, said, column.note))

    def _variant(self) -> str:
        row = self.ledger.row
        return row.subject[1] if row is not None and row.subject[0] == "variant" else ""

    def action_take_variant(self) -> None:
        """Make the sheet what the variant says."""
        sheet, name = self.snapshot.project.sheets.get(self.name_of_sheet), self._variant()
        if sheet is not None and name in sheet.variants:
            self.ask_for(taking(sheet, sheet.variants[name]))

    def action_drop_variant(self) -> None:
        """Take the variant out."""
        sheet, name = self.snapshot.project.sheets.get(self.name_of_sheet), self._variant()
        if sheet is not None and name in sheet.variants:
            self.ask_for(dropping(sheet, name))

    def action_keep_variant(self) -> None:
        """Keep what the sheet chooses now under a name."""
        from worksheet.tui.dialogs.form import FormDialog, FormLine

        def taken(texts: Mapping[str, str]) -> str:
            sheet = self.snapshot.project.sheets.get(self.name_of_sheet)
            if sheet is None:
                return "The sheet has problems; settle them first."
            if texts["name"] in sheet.variants:
                return "There is a variant of that name; give another one."
            outcome = self.book.change(keeping(sheet, texts["name"], texts["note"]))
            if outcome.accepted:
                self.say(outcome.done)
            return (
                "" if outcome.accepted else outcome.problems[0].message if outcome.problems else "nothing was changed"
            )

        asked = [
            FormLine("name", "Name", "A name of letters, digits and underscores."),
            FormLine("note", "Note", "What it is for, or what came of it; may be left out."),
        ]
        self.app.push_screen(FormDialog("Keep the present choice", asked, taken, self.book.signs))
