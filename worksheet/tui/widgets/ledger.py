"""The ledger: rows of a page with a cursor on one field of one row.

Drawn line by line, and of a new page only the lines that changed are drawn again, so that a step of a choice repaints
what moved and nothing else. It owns the cursor; what a row means is the business of the screen above.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import ClassVar

from textual import events
from textual.binding import Binding, BindingType
from textual.geometry import Region, Size
from textual.message import Message
from textual.scroll_view import ScrollView
from textual.strip import Strip

from worksheet.report.table import width_of
from worksheet.tui.rows import Field, Page, Row
from worksheet.tui.widgets.lines import ROLE_CLASSES, strip_of


class Ledger(ScrollView, can_focus=True):
    """Rows with a cursor."""

    COMPONENT_CLASSES: ClassVar[set[str]] = set(ROLE_CLASSES)
    BINDINGS: ClassVar[list[BindingType]] = [
        Binding("up", "move(-1)", show=False),
        Binding("down", "move(1)", show=False),
        Binding("left", "across(-1)", show=False),
        Binding("right", "across(1)", show=False),
        Binding("pageup", "leap(-1)", show=False),
        Binding("pagedown", "leap(1)", show=False),
        Binding("home", "edge(-1)", show=False),
        Binding("end", "edge(1)", show=False),
    ]
    DEFAULT_CSS = "Ledger { height: 1fr; scrollbar-size-vertical: 1; overflow-x: hidden; }"

    @dataclass
    class Moved(Message):
        """The cursor stands somewhere else."""

        row: Row | None
        field: Field | None

        def can_replace(self, message: Message) -> bool:
            """Only the newest place matters."""
            return isinstance(message, Ledger.Moved)

    class Resized(Message):
        """There is another width to fill."""

        def can_replace(self, message: Message) -> bool:
            """Only the newest width matters."""
            return isinstance(message, Ledger.Resized)

    def __init__(self, pointer: str, *, id: str | None = None) -> None:  # noqa: A002
        super().__init__(id=id)
        self._pointer = pointer
        self._page = Page()
        self._where: list[tuple[int, int]] = []
        self._starts: list[int] = []
        self._row = -1
        self._field = 0

    # What it shows

    @property
    def page(self) -> Page:
        """The rows that are shown."""
        return self._page

    @property
    def row(self) -> Row | None:
        """The row with the cursor."""
        return self._page.rows[self._row] if 0 <= self._row < len(self._page.rows) else None

    @property
    def field(self) -> Field | None:
        """The field with the cursor."""
        fields = self.row.fields if self.row is not None else ()
        return fields[min(self._field, len(fields) - 1)] if fields else None

    def show(self, page: Page) -> None:
        """Show other rows. The cursor stays on the row of the same key, and that row where it is on the screen."""
        before, old_where, key = self._page, self._where, self.row.key if self.row is not None else None
        height = self._height_on_screen()
        self._page = page
        self._where = [(k, n) for k, row in enumerate(page.rows) for n in range(len(row.lines))]
        self._starts = [sum(len(row.lines) for row in page.rows[:k]) for k in range(len(page.rows))]
        self._place(key)
        self.virtual_size = Size(self.size.width, len(self._where))
        self._repaint(before, old_where)
        if height is not None and self._row >= 0:
            self.scroll_to(y=max(self._starts[self._row] - height, 0), animate=False, immediate=True)
        self.post_message(self.Moved(self.row, self.field))

    def _height_on_screen(self) -> int | None:
        """At which line of the window the cursor's row stands; None at the top of the page, which stays in sight."""
        if not 0 <= self._row < len(self._starts) or not self.scroll_offset.y:
            return None
        return self._starts[self._row] - round(self.scroll_offset.y)

    def _place(self, key: str | None) -> None:
        rows = self._page.rows
        found = next((k for k, row in enumerate(rows) if row.key == key), None)
        if found is None:
            start = min(max(self._row, 0), len(rows) - 1)
            order = [*range(start, len(rows)), *range(start - 1, -1, -1)]
            found = next((k for k in order if rows[k].stops), -1)
        self._row = found

    def _repaint(self, before: Page, old_where: list[tuple[int, int]]) -> None:
        width, top = self.size.width, self.scroll_offset.y
        if len(old_where) != len(self._where):
            self.refresh()
            return
        changed = []
        for y, ((k, n), (was, line)) in enumerate(zip(self._where, old_where, strict=True)):
            if self._page.rows[k].lines[n] != before.rows[was].lines[line]:
                changed.append(Region(0, y - top, width, 1))
        if changed:
            self.refresh(*changed)

    def render_line(self, y: int) -> Strip:
        """One line of the window on the rows."""
        place = y + self.scroll_offset.y
        width = self.size.width
        if place >= len(self._where):
            return Strip.blank(width, self.rich_style)
        k, n = self._where[place]
        line = self._page.rows[k].lines[n]
        focus: frozenset[int] = frozenset()
        if k == self._row:
            focus = self._focused(line, first=n == 0)
        strip = strip_of(self, line, max(width - 2, 1), focus=focus)
        mark = self._pointer if k == self._row and n == 0 else " "
        from rich.segment import Segment

        edge = Strip([Segment(f"{mark} ", self.get_component_rich_style("span--head"))])
        return Strip.join([edge, strip])

    def _focused(self, line: tuple[object, ...], *, first: bool) -> frozenset[int]:
        field = self.field
        spans = [(k, getattr(span, "field", None)) for k, span in enumerate(line)]
        if field is not None:
            return frozenset(k for k, one in spans if one is field)
        return frozenset({0}) if first else frozenset()

    # Where the cursor is

    def field_region(self) -> Region:
        """Where the focused field stands on the screen."""
        field, row = self.field, self.row
        if field is None or row is None:
            return Region(0, 0, 0, 0)
        for n, line in enumerate(row.lines):
            at = 2
            for span in line:
                if span.field is field:
                    y = self._starts[self._row] + n - self.scroll_offset.y
                    return Region(self.region.x + at, self.region.y + y, width_of(span.shown), 1)
                at += width_of(span.shown)
        return Region(0, 0, 0, 0)

    def go(self, key: str, field: int = 0) -> bool:
        """Put the cursor on the row of that key. False where there is none."""
        for k, row in enumerate(self._page.rows):
            if row.key == key and row.stops:
                self._go(k, field)
                return True
        return False

    def go_section(self, step: int) -> None:
        """Put the cursor into the next part, or the one before."""
        rows = self._page.rows
        heads = [k for k, row in enumerate(rows) if row.key in self._page.sections]
        if not heads:
            return
        present = max((i for i, k in enumerate(heads) if k <= self._row), default=0)
        start = heads[(present + step) % len(heads)]
        first = next((k for k in range(start, len(rows)) if rows[k].stops), None)
        if first is not None:
            self._go(first, 0)
            self.scroll_to(y=self._starts[start], animate=False)

    def _go(self, row: int, field: int = 0) -> None:
        before = self._row
        self._row, self._field = row, max(field, 0)
        for k in {before, row}:
            self._refresh_row(k)
        self._follow()
        self.post_message(self.Moved(self.row, self.field))

    def _refresh_row(self, k: int) -> None:
        if 0 <= k < len(self._starts):
            y = self._starts[k] - self.scroll_offset.y
            self.refresh(Region(0, y, self.size.width, len(self._page.rows[k].lines)))

    def _follow(self) -> None:
        if not 0 <= self._row < len(self._starts):
            return
        top, height = self._starts[self._row], len(self._page.rows[self._row].lines)
        if not any(row.stops for row in self._page.rows[: self._row]):
            height, top = height + top, 0
        first, room = round(self.scroll_offset.y), self.size.height
        if top < first:
            self.scroll_to(y=top, animate=False)
        elif top + height > first + room:
            self.scroll_to(y=top + height - room, animate=False)

    # Keys

    def action_move(self, step: int) -> None:
        """One row on or back."""
        k = self._row + step
        while 0 <= k < len(self._page.rows):
            if self._page.rows[k].stops:
                self._go(k, self._field)
                return
            k += step
        if step < 0:
            self.scroll_to(y=0, animate=False)

    def action_across(self, step: int) -> None:
        """One field on or back within the row."""
        fields = self.row.fields if self.row is not None else ()
        place = min(self._field, len(fields) - 1) + step
        if 0 <= place < len(fields):
            self._go(self._row, place)

    def action_leap(self, step: int) -> None:
        """As many rows as the window holds."""
        room = max(self.size.height - 2, 1)
        wanted = self._starts[self._row] + step * room if 0 <= self._row < len(self._starts) else 0
        stops = [k for k, row in enumerate(self._page.rows) if row.stops]
        if stops:
            self._go(min(stops, key=lambda k: abs(self._starts[k] - wanted)))

    def action_edge(self, step: int) -> None:
        """The first row, or the last."""
        stops = [k for k, row in enumerate(self._page.rows) if row.stops]
        if stops:
            self._go(stops[0 if step < 0 else -1])

    def on_click(self, event: events.Click) -> None:
        """The row, and the field, that was pointed at."""
        place = event.y + self.scroll_offset.y
        if not 0 <= place < len(self._where):
            return
        k, n = self._where[place]
        row = self._page.rows[k]
        if not row.stops:
            return
        at, chosen = 2, 0
        for span in row.lines[n]:
            if span.field is not None and at <= event.x < at + width_of(span.shown):
                chosen = row.fields.index(span.field)
            at += width_of(span.shown)
        self._go(k, chosen)

    def on_resize(self) -> None:
        """Another width: the rows are made anew by the screen."""
        self.post_message(self.Resized())
        self.call_after_refresh(self._follow)
