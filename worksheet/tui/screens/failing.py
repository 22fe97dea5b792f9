"""What would have to be true for this block to fail: every input that can break a target, weakest trust first."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Sequence
from typing import Any

from worksheet.report import wording
from worksheet.review.failing import WORST, Failing
from worksheet.session.alternatives import failing_of, in_book
from worksheet.tui import commands
from worksheet.tui.rows import LABEL, MISSED, PLAIN, QUIET, VALUE, Row, Span, line
from worksheet.tui.screens.place import bindings
from worksheet.tui.screens.view import View

_TRUST, _INPUT, _NUMBER, _ROOM, _TARGET = 9, 27, 9, 7, 14
_CLOSE = 0.1
"""Room below this is set off."""


class FailingScreen(View):
    """The inputs, and where each breaks what."""

    PLACE = commands.FAILING
    BINDINGS = bindings(commands.FAILING)
    ABOUT = "what would have to be true for this block to fail, weakest trust first"

    def job(self) -> Callable[[], Any]:
        """The ranking, at the nominal condition and at each target's worst one."""
        session, snapshot, name = self.book.session, self.snapshot, self.name_of_sheet
        result = None if self.book.results is None else self.book.results.sheet(name)
        targets = () if result is None else result.targets
        worst = {t.target.name: t.worst_at for t in targets if t.worst_at is not None}
        return lambda: in_book(session, snapshot, name, lambda evaluator, one: failing_of(evaluator, one, worst))

    def asked(self) -> tuple[object, ...]:
        """Results bring the worst conditions."""
        return (None if self.book.results is None else self.book.results.revision,)

    def item(self) -> type:
        """Rows of the ranking."""
        return Failing

    def picture(self) -> Sequence[str]:
        """The heading of the rows."""
        wide = max(self.columns - _TRUST - _INPUT - 2 * _NUMBER - _ROOM - _TARGET - 6, 0)
        head = (
            f" {'trust':{_TRUST}} {'input':{_INPUT}} {'is':>{_NUMBER}} {'breaks at':>{_NUMBER}} "
            f"{'room':>{_ROOM}} {'target':{_TARGET}}" + (" where" if wide > 6 else "")
        )
        return [head]

    def rows_found(self) -> Iterable[Row]:
        """A row a pair of input and target."""
        found: list[Failing] = self.found
        if not found:
            yield Row("none", ((Span("No input within ten times its value breaks a target.", QUIET),),), stops=False)
        for one in found:
            yield self._row(one)

    def _row(self, one: Failing) -> Row:
        row, signs = one.row, self.book.signs
        cells = (
            row.trust or "none",
            row.name,
            wording.number(row.value, row.unit, digits=3),
            wording.number(row.break_value, row.unit, digits=3),
            "" if row.room is None else f"{row.room:.1%}",
            row.target,
            one.where,
        )
        close = row.room is not None and row.room < _CLOSE
        spans = (
            Span(signs.text(cells[0]), LABEL if row.trust else QUIET, _TRUST),
            Span(signs.text(cells[1]), VALUE, _INPUT),
            Span(signs.text(cells[2]), PLAIN, _NUMBER, right=True),
            Span(signs.text(cells[3]), PLAIN, _NUMBER, right=True),
            Span(signs.text(cells[4]), MISSED if close else PLAIN, _ROOM, right=True),
            Span(signs.text(cells[5]), PLAIN, _TARGET),
            Span("worst" if one.where == WORST else "nominal", QUIET),
        )
        return Row(f"{row.name}.{row.target}.{one.where}", (line(*spans),), subject=("input", row.name), copied=cells)

    def action_look(self) -> None:
        """The sheet, at that value."""
        row = self.ledger.row
        if row is not None and row.subject[0] == "input":
            self.app.pop_screen()
            self.book.open_sheet(self.name_of_sheet, row.subject[1])
