"""One quantity of a sheet swept against a metric, with the target as a line."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Sequence
from typing import Any

from worksheet.report import sweep_text
from worksheet.review.sweep import Curve, Sweep
from worksheet.session.alternatives import SweepAsked, in_book, sweep_of, sweepable
from worksheet.tui import commands
from worksheet.tui.rows import MISSED, PLAIN, QUIET, VALUE, Row, Span, line
from worksheet.tui.screens.place import bindings
from worksheet.tui.screens.view import View

_OTHER_LINES = 7
"""Lines of the screen that are not the drawing and not its list of metrics."""

_POINTS = 81
_ZOOM = 0.5
_NAME = 22
_CONDITIONS = ("temperature", "supply")


class SweepScreen(View):
    """How a metric goes with one quantity."""

    PLACE = commands.SWEEP
    BINDINGS = bindings(commands.SWEEP)

    def __init__(self, name: str, of: str = "bias_current") -> None:
        """Take the sheet's name and what is swept first."""
        super().__init__(name)
        self.of = of
        self.logarithmic = of not in _CONDITIONS
        self.decades = 1.0

    @property
    def about(self) -> str:
        """What is swept."""
        return f"{self.of} swept; the target as a line"

    def asked(self) -> tuple[object, ...]:
        """Another quantity, span or scale."""
        return (self.of, self.logarithmic, self.decades)

    def job(self) -> Callable[[], Any]:
        """The sweep of every target."""
        session, snapshot, name = self.book.session, self.snapshot, self.name_of_sheet
        asked = SweepAsked(self.of, points=_POINTS, logarithmic=self.logarithmic, decades=self.decades)
        return lambda: in_book(session, snapshot, name, lambda evaluator, one: sweep_of(evaluator, one, asked))

    def _curve(self) -> Curve | None:
        found: Sweep | None = self.found
        if found is None or not found.curves:
            return None
        row = self.ledger.row
        name = row.subject[1] if row is not None and row.subject[0] == "metric" else ""
        return next((curve for curve in found.curves if curve.name == name), found.curves[0])

    def picture(self) -> Sequence[str]:
        """The metric under the cursor."""
        curve = self._curve()
        if curve is None:
            return ()
        rows = max(self.app.size.height - _OTHER_LINES - min(len(self.found.curves), 6), 6)
        return list(sweep_text.drawing(self.found, curve, self.app.size.width - 3, rows))

    def rows_found(self) -> Iterable[Row]:
        """A row a metric."""
        for curve in self.found.curves:
            passage = sweep_text.passage(self.found, curve)
            role = MISSED if curve.met is not None and not curve.met.all() else PLAIN
            spans = (
                Span(self.book.signs.text(curve.name), VALUE, _NAME),
                Span(self.book.signs.text(passage), role),
            )
            yield Row(
                f"metric.{curve.name}", (line(*spans),), subject=("metric", curve.name), copied=(curve.name, passage)
            )
        if self.found.invalid.any():
            count = int((self.found.invalid > 0).sum())
            said = f"not valid somewhere at {count} of {len(self.found.values)} points"
            yield Row("invalid", ((Span(said, QUIET),),), stops=False)

    def on_ledger_moved(self) -> None:
        """Another metric: its drawing."""
        self.draw_picture()
        self.show_foot()

    def action_quantity(self) -> None:
        """Sweep something else."""
        from worksheet.tui.dialogs.pick import Item, PickDialog

        session, snapshot, name = self.book.session, self.snapshot, self.name_of_sheet
        found = in_book(session, snapshot, name, sweepable)
        items = [Item(axis.name, axis.name, f"{axis.key.help}") for axis in found if not hasattr(axis, "message")]
        self.app.push_screen(PickDialog("Sweep", items, self.book.signs, self.of), self._swept)

    def _swept(self, name: str | None) -> None:
        if name:
            self.of, self.decades, self.found = name, 1.0, None
            self.logarithmic = name not in _CONDITIONS
            self.show_book()

    def action_scale(self) -> None:
        """Equal ratios, or equal steps."""
        self.logarithmic = not self.logarithmic
        self.say("equal ratios" if self.logarithmic else "equal steps")
        self.show_book()

    def action_closer(self) -> None:
        """Less around the present value."""
        self._zoom(_ZOOM)

    def action_wider(self) -> None:
        """More around the present value."""
        self._zoom(1 / _ZOOM)

    def _zoom(self, factor: float) -> None:
        if 0.01 < self.decades * factor < 5:
            self.decades *= factor
            self.show_book()

    def action_whole(self) -> None:
        """A decade either way again."""
        self.decades = 1.0
        self.show_book()
