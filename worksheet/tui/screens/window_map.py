"""The map's screen: a cross to point with, zoom, and the point that is pointed at taken into the sheet."""

from __future__ import annotations

from collections.abc import Iterable
from typing import ClassVar

from textual.binding import Binding, BindingType
from textual.message import Message
from textual.widget import Widget

from worksheet.model.quantity import format_input
from worksheet.session.edits import ChangeSheet, Put
from worksheet.session.mapping import ACROSS, UP, Mapped, mapped
from worksheet.solver.plane import Span
from worksheet.tui import commands
from worksheet.tui.pages import map_page
from worksheet.tui.pages.map_page import Marks
from worksheet.tui.recompute import Recompute, Stamped
from worksheet.tui.rows import HEAD, MISSED, PLAIN, QUIET, line
from worksheet.tui.rows import Span as Piece
from worksheet.tui.screens.place import Place, bindings
from worksheet.tui.widgets.lines import Lines

Found = Mapped | tuple[object, ...]
_ZOOM = 0.7
_AROUND = 5
"""Lines of the screen that are not the map: title, two of places, what was said, foot."""


class MapLines(Lines, can_focus=True):
    """The picture; it has the focus, so that the arrows reach the screen."""


class MapScreen(Place):
    """Where all targets of one sheet hold."""

    PLACE = commands.MAP
    AUTO_FOCUS = "MapLines"
    BINDINGS: ClassVar[list[BindingType]] = [
        *bindings(commands.MAP),
        Binding("left", "point(-1, 0)", show=False),
        Binding("right", "point(1, 0)", show=False),
        Binding("up", "point(0, 1)", show=False),
        Binding("down", "point(0, -1)", show=False),
        Binding("pageup", "point(0, 4)", show=False),
        Binding("pagedown", "point(0, -4)", show=False),
        Binding("shift+left", "point(-8, 0)", show=False),
        Binding("shift+right", "point(8, 0)", show=False),
    ]

    class Ready(Message):
        """A map has been worked out."""

        def __init__(self, stamped: Stamped[Found]) -> None:
            super().__init__()
            self.stamped = stamped

    def __init__(self, name: str) -> None:
        """Take the sheet's name."""
        super().__init__()
        self.name_of_sheet = name
        self.found: Mapped | None = None
        self.cross: tuple[float, float] | None = None
        self._problems: tuple[object, ...] = ()
        self._frame: tuple[Span, Span] | None = None
        self._asked: object = None
        self._count = 0
        self._work: Recompute[Found] = Recompute(self._deliver)

    def compose_page(self) -> Iterable[Widget]:
        """The map, then where the cross stands."""
        yield MapLines(id="map")
        yield Lines([(), ()], id="places")

    def on_unmount(self) -> None:
        """Begin nothing more."""
        self._work.stop()

    def _deliver(self, stamped: Stamped[Found]) -> None:
        self.post_message(self.Ready(stamped))

    # What it shows

    def show_book(self) -> None:
        """The map of the book as it stands."""
        if not self.stands:
            return
        self._want()
        self._draw()
        self.show_foot()

    def _want(self) -> None:
        """Have the map worked out for this state, frame and size, where that has not been asked for."""
        size = self.app.size
        constraints = 2 + 2 * len(self._targets())
        cells = map_page.cells(size.width - 2, size.height - _AROUND, constraints)
        asked = (self.snapshot.revision, self.name_of_sheet, self._frame, cells)
        if asked == self._asked:
            return
        self._asked = asked
        self._count += 1
        session, snapshot, name, frame = self.book.session, self.snapshot, self.name_of_sheet, self._frame
        self._work.want(self._count, lambda: mapped(session, snapshot, name, cells, frame))

    def _targets(self) -> tuple[str, ...]:
        sheet = self.snapshot.project.sheets.get(self.name_of_sheet)
        return () if sheet is None else tuple(sheet.targets)

    def on_map_screen_ready(self, message: MapScreen.Ready) -> None:
        """Show it, unless another one is asked for by now."""
        stamped = message.stamped
        if stamped.revision != self._count:
            return
        if isinstance(stamped.value, Mapped):
            self.found, self._problems = stamped.value, ()
            plane = stamped.value.plane
            self._frame = self._frame or (plane.x_span, plane.y_span)
            self._asked = (self.snapshot.revision, self.name_of_sheet, self._frame, *self._asked_cells())
            self.cross = self.cross or self._present()
        else:
            self.found, self._problems = None, stamped.value or (stamped.error or "there is no map",)
        self._draw()
        self.show_foot()

    def _asked_cells(self) -> tuple[object, ...]:
        return (self._asked[-1],) if isinstance(self._asked, tuple) else ()

    def _present(self) -> tuple[float, float]:
        assert self.found is not None  # asked for where there is a map
        return self.found.plane.x.present, self.found.plane.y.present

    def _draw(self) -> None:
        signs = self.book.signs
        self.query_one("#title", Lines).show([self._title()])
        picture, places = self.query_one("#map", Lines), self.query_one("#places", Lines)
        if self.found is None:
            text = " ".join(map(str, self._problems)) or "working..."
            picture.show([(Piece(signs.text(text), MISSED if self._problems else QUIET),)])
            return
        marks = self._marks()
        picture.show(map_page.lines(self.found.plane, marks, self.app.size.width - 2, signs))
        missed = self.found.missed(*marks.cross)
        places.show(map_page.place_lines(self.found.plane, marks, missed, signs))

    def _title(self) -> tuple[Piece, ...]:
        over = "" if self.found is None else {"all": "in every condition", "nominal": "at the nominal condition"}[
            self.found.trials.over
        ]  # fmt: skip
        said = f"where all targets hold {over}"
        return line(Piece(self.name_of_sheet, HEAD), Piece(self.book.signs.text(said), PLAIN), gap=2)

    def _marks(self) -> Marks:
        needed = self.book.needed
        proposal = None
        present = self._present()
        if needed is not None and needed.name == self.name_of_sheet and needed.proposal:
            current = needed.proposal.get(ACROSS)
            proposal = None if current is None else (current, needed.proposal.get(UP, present[1]))
        return Marks(present, proposal, self.cross or present)

    def on_resize(self) -> None:
        """Another size: other cells."""
        self.show_book()

    def holds(self) -> set[str]:
        """Whether there is a place to take."""
        held = super().holds() | {"sheet"}
        return held | {"place"} if self.found is not None and self._free() else held

    # Pointing

    def action_point(self, across: int, up: int) -> None:
        """Move the cross by cells; at the edge the map goes along."""
        if self.found is None or self.cross is None:
            return
        plane = self.found.plane
        up_cells, across_cells = plane.holds.shape
        x = self._moved(plane.x_span, self.cross[0], across, across_cells)
        y = self._moved(plane.y_span, self.cross[1], up, up_cells)
        self.cross = (x, y)
        if plane.x_span.cell(x, across_cells) is None or plane.y_span.cell(y, up_cells) is None:
            self._frame = (plane.x_span.closer(x, 1.0), plane.y_span.closer(y, 1.0))
            self._want()
        self._draw()

    @staticmethod
    def _moved(span: Span, value: float, steps: int, cells: int) -> float:
        """The middle of a cell some cells on, or the value where it stays."""
        if not steps:
            return value
        step = (span.high / span.low) ** (1 / cells)
        cell = span.cell(value, cells)
        middle = value if cell is None else span.low * step ** (cell + 0.5)
        return float(middle * step**steps)

    def action_closer(self) -> None:
        """Half as much around the cross."""
        self._zoom(_ZOOM)

    def action_wider(self) -> None:
        """More around the cross."""
        self._zoom(1 / _ZOOM)

    def _zoom(self, factor: float) -> None:
        if self._frame is None or self.cross is None:
            return
        x, y = (span.closer(at, factor) for span, at in zip(self._frame, self.cross, strict=True))
        if 0.05 < x.decades < 16 and 0.05 < y.decades < 16:
            self._frame = (x, y)
            self._want()

    def action_whole(self) -> None:
        """Everything near the present point again."""
        self._frame = self.cross = None
        self._want()

    # Taking over

    def _free(self) -> tuple[str, ...]:
        """Which of the two variables the sheet chooses by a number of its own."""
        data = self.snapshot.data(self.name_of_sheet)
        assumed, chosen = data.get("assume", {}), data.get("choose", {})
        return tuple(name for name in (ACROSS, UP) if name not in assumed and not isinstance(chosen.get(name), dict))

    def action_take_place(self) -> None:
        """Write the place of the cross into the choices, to three digits."""
        if self.found is None or self.cross is None:
            return
        plane = self.found.plane
        pieces = []
        for variable, value in zip((plane.x, plane.y), self.cross, strict=True):
            if variable.name in self._free():
                assert variable.key.dimension is not None  # of a map
                text = format_input(float(f"{value:.3g}"), variable.key.dimension)
                pieces.append(Put(("choose", variable.name), text))
        self.ask_for(ChangeSheet(self.name_of_sheet, tuple(pieces), "place on the map"))

    # Help and copying have no ledger here

    def action_help(self) -> None:
        """What the map shows, and the keys."""
        from worksheet.tui.dialogs.reading import ReadingDialog
        from worksheet.tui.helping import paragraphs

        drawn = (
            "A boundary is drawn with the letter of the target that sets it; as a capital where something else fails "
            "on both sides of it."
        )
        about = [
            "# The map of the window",
            "Each cell is one bias current and one load capacitance, the other choices held as in the sheet.",
            "It is filled where every target holds in every condition that counts.",
            drawn,
            "Arrows move the cross, shift and arrows by eight cells; at the edge the map goes along.",
        ]
        found = [*about, *paragraphs(self.PLACE, None, None, self.book.keys)]
        self.app.push_screen(ReadingDialog("Help", found, self.book.signs))

    def action_copy(self) -> None:
        """The picture as text, into a file and to the terminal's clipboard."""
        from worksheet.tui.copying import FILE, into_file

        text = "\n".join("".join(p.text for p in one).rstrip() for one in self.query_one("#map", Lines).lines)
        self.app.copy_to_clipboard(text)
        self.say(f"copied to the clipboard, and {into_file(self.book.terminal.state / FILE, text)}")
