"""A screen that looks at one sheet in its own way: worked out off the event loop, shown as a picture over rows."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Sequence
from typing import Any, ClassVar

from textual.message import Message
from textual.widget import Widget

from worksheet.report.table import wrapped
from worksheet.tui.recompute import Recompute, Stamped
from worksheet.tui.rows import HEAD, LABEL, MISSED, PLAIN, Page, Row, Span, line
from worksheet.tui.screens.place import Place
from worksheet.tui.widgets.ledger import Ledger
from worksheet.tui.widgets.lines import Lines


class View(Place):
    """What is found for the book as it stands; a subclass says how to find it and how to show it."""

    ABOUT: ClassVar[str] = ""
    """What the screen shows, after the name in its title."""

    class Ready(Message):
        """It has been worked out."""

        def __init__(self, stamped: Stamped[Any]) -> None:
            super().__init__()
            self.stamped = stamped

    def __init__(self, name: str) -> None:
        """Take the sheet's name."""
        super().__init__()
        self.name_of_sheet = name
        self.found: Any = None
        self._problems: tuple[str, ...] = ()
        self._asked: object = None
        self._count = 0
        self._work: Recompute[Any] = Recompute(self._deliver)

    def compose_page(self) -> Iterable[Widget]:
        """The picture, and the rows below it."""
        yield Lines(id="picture")
        yield Ledger(self.book.signs.pointer, id="body")

    def on_unmount(self) -> None:
        """Begin nothing more."""
        self._work.stop()

    def _deliver(self, stamped: Stamped[Any]) -> None:
        self.post_message(self.Ready(stamped))

    # For a subclass

    def asked(self) -> tuple[object, ...]:
        """What is wanted besides the book as it stands; another one is worked out anew."""
        return ()

    def job(self) -> Callable[[], Any]:
        """What finds it: problems as a list, anything else is found."""
        raise NotImplementedError

    def picture(self) -> Sequence[str]:
        """Lines of text above the rows."""
        return ()

    def rows_found(self) -> Iterable[Row]:
        """The rows."""
        return ()

    # What it shows

    def show_book(self) -> None:
        """The book as it stands."""
        if not self.stands:
            return
        asked = (self.snapshot.revision, *self.asked())
        if asked != self._asked:
            self._asked = asked
            self._count += 1
            self._work.want(self._count, self.job())
        self.draw()

    def on_view_ready(self, message: View.Ready) -> None:
        """Show it, unless another one is asked for by now."""
        stamped = message.stamped
        if stamped.revision != self._count:
            return
        self.found, self._problems = None, ()
        if stamped.error is not None:
            self._problems = (stamped.error,)
        elif isinstance(stamped.value, list) and stamped.value and not isinstance(stamped.value[0], self.item()):
            self._problems = tuple(getattr(one, "message", str(one)) for one in stamped.value)
        else:
            self.found = stamped.value
        self.draw()

    def item(self) -> type:
        """What a list that is found holds, to tell it from a list of problems."""
        return type(None)

    @property
    def about(self) -> str:
        """What the title says of the screen."""
        return self.ABOUT

    def draw(self) -> None:
        """Title, rows, picture, foot."""
        signs = self.book.signs
        title = [Span(signs.text(self.name_of_sheet), HEAD)] if self.name_of_sheet else []
        stale = [Span("working...", LABEL)] if self.found is None and not self._problems else []
        self.query_one("#title", Lines).show([line(*title, *stale, Span(signs.text(self.about), PLAIN), gap=2)])
        rows = () if self.found is None else tuple(self.rows_found())
        self.ledger.show(Page(rows or (Row("none", ((),), stops=False),)))
        self.draw_picture()
        self.show_foot()

    def draw_picture(self) -> None:
        """What stands above the rows, or why there is nothing."""
        texts, role = (self.picture(), PLAIN) if self.found is not None else (self._wrong(), MISSED)
        shown = [(Span(self.book.signs.text(f" {text}"), role),) for text in texts]
        self.query_one("#picture", Lines).show(shown)

    def _wrong(self) -> list[str]:
        return [part for problem in self._problems for part in wrapped(problem, self.columns)]

    def on_ledger_moved(self) -> None:
        """Other commands may hold here."""
        self.show_foot()

    def on_resize(self) -> None:
        """Another size."""
        self.show_book()

    def holds(self) -> set[str]:
        """What the cursor is on."""
        held = super().holds() | {"sheet"}
        row = self.ledger.row if self.is_mounted else None
        return held if row is None else held | {"row", row.subject[0]}
