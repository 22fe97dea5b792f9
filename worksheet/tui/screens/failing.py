"""What would have to be true for this block to fail: every input that can break a target, weakest trust first."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Sequence
from typing import Any

from worksheet.report import wording
from worksheet.review.failing import Failing, missed_at
from worksheet.session.alternatives import failing_of, in_book
from worksheet.tui import commands
from worksheet.tui.rows import LABEL, MISSED, PLAIN, QUIET, VALUE, Row, Span, line
from worksheet.tui.screens.place import bindings
from worksheet.tui.screens.view import View

_TRUST, _INPUT, _NUMBER, _ROOM, _TARGET, _THEN = 8, 19, 8, 6, 15, 6
_NARROW = 86
"""Columns from which on names have more room, and the condition stands there too."""

_CLOSE = 0.1
"""Room below this is set off."""


class FailingScreen(View):
    """The inputs, and where each breaks what."""

    PLACE = commands.FAILING
    BINDINGS = bindings(commands.FAILING)
    ABOUT = "where a target would break, or hold where it is missed"

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

    def _misses(self, one: Failing) -> bool:
        """Whether the target is missed where the row looks at it, so that it would hold beyond."""
        result = None if self.book.results is None else self.book.results.sheet(self.name_of_sheet)
        targets = () if result is None else (t for t in result.targets if t.target.name == one.row.target)
        return any(missed_at(target, one.where) for target in targets)

    @property
    def _input(self) -> int:
        """Columns of the input's name: more where there is room."""
        return min(max(self.columns - _NARROW + _INPUT, _INPUT), 36)

    @property
    def _wide(self) -> bool:
        """Whether there is room for the condition."""
        return self.columns >= _NARROW

    def picture(self) -> Sequence[str]:
        """The heading of the rows."""
        head = (
            f" {'trust':{_TRUST}} {'input':{self._input}} {'is':>{_NUMBER}} {'turns at':>{_NUMBER}} "
            f"{'room':>{_ROOM}} {'target':{_TARGET}} {'then':{_THEN}}" + (" where" if self._wide else "")
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
            _room(row.room),
            row.target,
            "holds" if self._misses(one) else "breaks",
            one.where,
        )
        close = row.room is not None and row.room < _CLOSE
        spans = (
            Span(signs.text(cells[0]), LABEL if row.trust else QUIET, _TRUST),
            Span(signs.text(cells[1]), VALUE, self._input),
            Span(signs.text(cells[2]), PLAIN, _NUMBER, right=True),
            Span(signs.text(cells[3]), PLAIN, _NUMBER, right=True),
            Span(signs.text(cells[4]), MISSED if close else PLAIN, _ROOM, right=True),
            Span(signs.text(cells[5]), PLAIN, _TARGET),
            Span(cells[6], PLAIN, _THEN),
            *([Span(cells[7], QUIET)] if self._wide else []),
        )
        return Row(f"{row.name}.{row.target}.{one.where}", (line(*spans),), subject=("input", row.name), copied=cells)

    def action_look(self) -> None:
        """The sheet, at that value."""
        row = self.ledger.row
        if row is not None and row.subject[0] == "input":
            self.app.pop_screen()
            self.book.open_sheet(self.name_of_sheet, row.subject[1])


def _room(room: float | None) -> str:
    if room is None:
        return "-"
    return f"{room:.1%}" if room < 0.1 else f"{room:.0%}" if room < 9.995 else f"{room:.0f}x"
