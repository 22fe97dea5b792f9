"""Current against area: what meets every target, and the present choice; one point taken over."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Sequence
from typing import Any

from worksheet.report import front_text
from worksheet.report.table import lines, wrapped
from worksheet.review.front import Front
from worksheet.session.alternatives import at_point, front_of, in_book
from worksheet.tui import commands
from worksheet.tui.rows import HEAD, LABEL, PLAIN, Row, Span
from worksheet.tui.screens.place import bindings
from worksheet.tui.screens.view import View

_LEAST, _SHARE = 8, 0.45


class FrontScreen(View):
    """What can be had at the least."""

    PLACE = commands.FRONT
    BINDINGS = bindings(commands.FRONT)
    ABOUT = "bias current across, gate area up"

    def job(self) -> Callable[[], Any]:
        """The front."""
        session, snapshot, name = self.book.session, self.snapshot, self.name_of_sheet
        return lambda: in_book(session, snapshot, name, front_of)

    def picture(self) -> Sequence[str]:
        """The drawing, and where the present choice stands."""
        found: Front = self.found
        width, height = self.app.size.width - 3, max(int(self.app.size.height * _SHARE), _LEAST)
        said = wrapped(front_text.standing(found), width)
        if found.reason is not None:
            return [f"No point to show: {found.reason}.", *said]
        return [*front_text.drawing(found, width, height), *said]

    def rows_found(self) -> Iterable[Row]:
        """A row a point."""
        found: Front = self.found
        if found.reason is not None:
            return
        head, *body = lines(front_text.table(found), self.columns, "")
        signs = self.book.signs
        yield Row("head", ((Span(signs.text(head), HEAD),),), stops=False)
        for k, text in enumerate(body):
            present = k == len(found.points)
            subject = ("", "") if present else ("point", str(k))
            role = LABEL if present else PLAIN
            yield Row(f"point.{k}", ((Span(signs.text(text), role),),), subject=subject, copied=tuple(text.split("  ")))

    def action_take_point(self) -> None:
        """Write the point under the cursor into the choices, on the layout grid."""
        row = self.ledger.row
        if self.found is None or row is None or row.subject[0] != "point":
            return
        point = self.found.points[int(row.subject[1])]
        session, snapshot, name = self.book.session, self.snapshot, self.name_of_sheet
        request = in_book(session, snapshot, name, lambda evaluator, one: at_point(evaluator, one, self.found, point))
        if isinstance(request, list):
            self.say(request[0].message, wrong=True)
        else:
            self.ask_for(request)
