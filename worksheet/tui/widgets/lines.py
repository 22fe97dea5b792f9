"""Lines of spans on the screen: the one place where a span's role becomes a style and its text reaches the terminal."""

from __future__ import annotations

from collections.abc import Sequence
from typing import ClassVar

from rich.segment import Segment
from rich.style import Style
from textual.geometry import Region, Size
from textual.strip import Strip
from textual.widget import Widget

from worksheet.report.table import width_of
from worksheet.tui.rows import QUIET, ROLES, Line

ROLE_CLASSES = frozenset(f"span--{role}" for role in ROLES) | {"span--focus"}


def strip_of(widget: Widget, line: Line, width: int, *, focus: frozenset[int] = frozenset()) -> Strip:
    """A line as the toolkit draws it.

    Args:
        widget: Gives the styles.
        line: Its spans, already harmless.
        width: Columns; longer lines are cut and end in a mark, shorter ones are filled.
        focus: Spans that the cursor is on, by place.
    """
    segments = [
        Segment(span.shown, style_of(widget, "focus" if k in focus else span.role)) for k, span in enumerate(line)
    ]
    strip = Strip(segments)
    if strip.cell_length > width and width_of("".join(segment.text for segment in segments).rstrip()) > width:
        mark = Segment("…", style_of(widget, QUIET))
        return Strip.join([strip.crop(0, width - 1).adjust_cell_length(width - 1, widget.rich_style), Strip([mark])])
    return strip.adjust_cell_length(width, widget.rich_style)


def style_of(widget: Widget, role: str) -> Style:
    """The style of a role."""
    return widget.get_component_rich_style(f"span--{role}")


class Lines(Widget):
    """Lines that only show something."""

    COMPONENT_CLASSES: ClassVar[set[str]] = set(ROLE_CLASSES)
    DEFAULT_CSS = "Lines { height: auto; }"

    def __init__(self, lines: Sequence[Line] = (), *, id: str | None = None, classes: str | None = None) -> None:  # noqa: A002
        super().__init__(id=id, classes=classes)
        self._lines: tuple[Line, ...] = tuple(lines)

    @property
    def lines(self) -> tuple[Line, ...]:
        """What is shown."""
        return self._lines

    def show(self, lines: Sequence[Line]) -> None:
        """Show other lines; only those that differ are drawn again."""
        before, self._lines = self._lines, tuple(lines)
        if len(before) != len(self._lines):
            self.refresh(layout=True)
            return
        changed = [y for y, (old, new) in enumerate(zip(before, self._lines, strict=True)) if old != new]
        if changed:
            self.refresh(*(Region(0, y, self.size.width, 1) for y in changed))

    def get_content_height(self, container: Size, viewport: Size, width: int) -> int:
        """As many lines as there are."""
        del container, viewport, width
        return len(self._lines)

    def get_content_width(self, container: Size, viewport: Size) -> int:
        """All the room there is."""
        del viewport
        return container.width

    def render_line(self, y: int) -> Strip:
        """One line."""
        if y >= len(self._lines):
            return Strip.blank(self.size.width, self.rich_style)
        return strip_of(self, self._lines[y], self.size.width)
