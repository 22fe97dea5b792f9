"""The screen of an extraction: how tables were read, the fit and its curves, and the device written into its file."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING, ClassVar

from textual.binding import BindingType
from textual.message import Message
from textual.widget import Widget

from worksheet.model.keys import TRUST
from worksheet.model.problem import Problem
from worksheet.session.edits import TakeBack
from worksheet.tui import commands
from worksheet.tui.dialogs.ask import AskDialog
from worksheet.tui.dialogs.form import FormDialog, FormLine
from worksheet.tui.pages import curves_page
from worksheet.tui.recompute import Recompute, Stamped
from worksheet.tui.recomputed import today
from worksheet.tui.rows import HEAD, MISSED, PLAIN, QUIET, Page, Row, Span, line
from worksheet.tui.screens.place import Place, bindings
from worksheet.tui.widgets.ledger import Ledger
from worksheet.tui.widgets.lines import Lines

if TYPE_CHECKING:  # a fit comes with a library that nothing else here needs
    from worksheet.extract.data import Extraction
    from worksheet.session.extracting import ProcessText

_AROUND = 4
"""Lines of the screen that are not the plot: title, families, what was said, foot."""


@dataclass(frozen=True, slots=True)
class Asked:
    """What is to be fitted: tables by path, the device, and texts of the form."""

    paths: tuple[Path, ...]
    device: str
    texts: Mapping[str, str]


class CurvesScreen(Place):
    """A device fitted to tables."""

    PLACE = commands.CURVES
    BINDINGS: ClassVar[list[BindingType]] = [*bindings(commands.CURVES)]

    class Ready(Message):
        """The fit is there, or it is known why not."""

        def __init__(self, stamped: Stamped[tuple[Extraction, ProcessText] | list[Problem]]) -> None:
            super().__init__()
            self.stamped = stamped

    def __init__(self, asked: Asked) -> None:
        """Take what is to be fitted."""
        super().__init__()
        self.asked = asked
        self.result: Extraction | None = None
        self._into: ProcessText | None = None
        self._wrong: tuple[str, ...] = ()
        self._view = self._family = self._count = 0
        self._work: Recompute[tuple[Extraction, ProcessText] | list[Problem]] = Recompute(self._deliver)

    def compose_page(self) -> Iterable[Widget]:
        """The summary, or a plot and which curves it shows."""
        yield Ledger(self.book.signs.pointer, id="body")
        yield Lines(id="plot")
        yield Lines([()], id="families")

    def on_mount(self) -> None:
        """Have the fit made."""
        super().on_mount()
        self._want()

    def on_unmount(self) -> None:
        """Begin nothing more."""
        self._work.stop()

    def _deliver(self, stamped: Stamped[tuple[Extraction, ProcessText] | list[Problem]]) -> None:
        self.post_message(self.Ready(stamped))

    def _want(self) -> None:
        self._count += 1
        self.result, self._wrong = None, ()
        root, asked = self.snapshot.project.root, self.asked
        file = self.snapshot.project.file
        process = root / "process" / f"{file.process if file is not None else ''}.toml"

        def work() -> tuple[Extraction, ProcessText] | list[Problem]:
            from worksheet.session import extracting

            into = extracting.read_device(process, asked.device, None)
            if isinstance(into, list):
                return into
            request = extracting.asked(asked.texts, into.device.polarity)
            if isinstance(request, str):
                return [Problem("", None, "", request)]
            result, problems = extracting.extract(asked.paths, request, into)
            return problems if result is None else (result, into)

        self._work.want(self._count, work)
        self.show_book()

    def on_curves_screen_ready(self, message: CurvesScreen.Ready) -> None:
        """Show it, unless another one is asked for by now."""
        stamped = message.stamped
        if stamped.revision != self._count:
            return
        if isinstance(stamped.value, tuple):
            self.result, self._into = stamped.value
        else:
            problems = stamped.value or [Problem("", None, "", str(stamped.error))]
            self._wrong = tuple(map(str, problems))
        self.show_book()

    # What it shows

    def show_book(self) -> None:
        """The view that was chosen."""
        if not self.stands:
            return
        from worksheet.extract.views import VIEWS, families

        signs, result = self.book.signs, self.result
        names = ", ".join(path.name for path in self.asked.paths)
        view = None if not self._view else VIEWS[self._view - 1]
        said = "fitting..." if result is None and not self._wrong else "summary" if view is None else view.title
        head = line(Span(signs.text(f"{self.asked.device} from {names}"), HEAD), Span(signs.text(said), PLAIN), gap=2)
        self.query_one("#title", Lines).show([head])
        shown = result is not None and view is not None
        self.ledger.display, self.query_one("#plot").display = not shown, shown
        if result is None:
            texts = self._wrong or ("working...",)
            role = MISSED if self._wrong else QUIET
            page = Page(tuple(Row(f"w.{k}", (line(Span(signs.text(t), role)),)) for k, t in enumerate(texts)))
            self.ledger.show(page)
        elif view is None:
            self.ledger.show(curves_page.summary(result, self.columns, signs))
        else:
            every = families(result)
            family = every[self._family % len(every)]
            size = self.app.size.width - 2, self.app.size.height - _AROUND
            self.query_one("#plot", Lines).show(curves_page.view_lines(result, view, family, size, signs))
            text = f"{self._family % len(every) + 1} of {len(every)}: {curves_page.family_text(family)}"
            self.query_one("#families", Lines).show([(Span(signs.text(text), QUIET),)])
        if not shown:
            self.query_one("#families", Lines).show([()])
        self.show_foot()

    def holds(self) -> set[str]:
        """Whether there is a fit."""
        return super().holds() | ({"fit"} if self.result is not None else set())

    def on_resize(self) -> None:
        """Another size."""
        self.show_book()

    def on_ledger_resized(self) -> None:
        """Another width."""
        self.show_book()

    # Commands

    def action_next_view(self) -> None:
        """Another way to look at it."""
        from worksheet.extract.views import VIEWS

        self._view = (self._view + 1) % (len(VIEWS) + 1)
        self.show_book()

    def action_next_curves(self) -> None:
        """The curves of another length, source voltage or temperature."""
        self._family += 1
        self.show_book()

    def action_columns(self) -> None:
        """State how the tables are to be read, and fit again."""
        ask(self, self.asked, self._again)

    def _again(self, asked: Asked) -> None:
        self.asked = asked
        self._want()

    def action_write(self) -> None:
        """Write the device into the process file, after it was said what changes."""
        from worksheet.session import extracting

        result, into = self.result, self._into
        if result is None or into is None:
            return
        made = extracting.text_with(result, into, dated=today(), trust=TRUST[3], confirmed=True)
        if isinstance(made, list):
            self.say(str(made[0]), wrong=True)
            return
        wanted, text = made
        guessed = [one for one in result.readings if one.guessed]
        columns = f" Columns were guessed: {', '.join(guessed[0].mapping)}." if guessed else ""
        kept = f" {' '.join(wanted.kept)}" if wanted.kept else ""
        poor = " It is a poor fit." if result.poor else ""
        question = (
            f"Written into {into.device.name}: {', '.join(wanted.written)}.{kept}{columns}{poor} Undo takes it back."
        )

        def done(letter: str | None) -> None:
            if letter is not None:
                file = into.path.relative_to(self.snapshot.project.root).as_posix()
                self.ask_for(TakeBack("", {file: text.encode()}, f"{into.device.name} from its curves"))

        self.app.push_screen(AskDialog("Into the process file", question, {"y": "write it"}, self.book.signs), done)


def begin(screen: Place) -> None:
    """Ask for tables and a device, and show the fit."""

    def follow(asked: Asked) -> None:
        screen.app.push_screen(CurvesScreen(asked))

    ask(screen, None, follow)


def ask(screen: Place, present: Asked | None, follow: Callable[[Asked], None]) -> None:
    """A form for tables, device, sizes and columns; `follow` is called with what was asked."""
    process = screen.snapshot.project.process
    devices = list(process.devices) if process is not None else []
    texts = {} if present is None else dict(present.texts)
    files = ", ".join(map(str, present.paths)) if present is not None else ""
    device = present.device if present is not None else "".join(devices[:1])

    def wrong_device(text: str) -> str:
        return "" if text in devices else f"Found {text}, expected one of {', '.join(devices)}."

    def complete_device(text: str) -> list[str]:
        return [one for one in devices if one.startswith(text)]

    lines = [
        FormLine("device", "Device", f"One of {', '.join(devices)}.", device, wrong_device, complete_device),
        FormLine(
            "tables", "Tables", "CSV files with a header, with commas; left empty: those it was fitted to.", files
        ),
        FormLine("width", "Width", "Where no column says it: 10 um; with commas, one a table.", texts.get("width", "")),
        FormLine(
            "length", "Length", "Where no column says it: 1 um; with commas, one a table.", texts.get("length", "")
        ),
        FormLine("temperature", "Temperature", "Where no column says it: 27 °C.", texts.get("temperature", "")),
        FormLine(
            "columns",
            "Columns",
            "Where they are not told by their names: vg=GATE:mV, id=-I:uA (minus turns the sign).",
            texts.get("columns", ""),
        ),
    ]

    def taken(typed: Mapping[str, str]) -> str:
        from worksheet.session import extracting

        root = screen.snapshot.project.root
        paths = tuple(_placed(root, one.strip()) for one in typed["tables"].split(",") if one.strip())
        if not paths and process is not None:
            into = extracting.read_device(root / process.file, typed["device"], None)
            paths = () if isinstance(into, list) else extracting.tables_of(into, root)
        if not paths:
            return "Name at least one table; none that this device was fitted to lies in the project as it was."
        missing = [str(path) for path in paths if not path.is_file()]
        if missing:
            return f"Found no file {missing[0]}."
        asked = extracting.asked(typed, "n")
        if isinstance(asked, str):
            return asked
        chosen.append(Asked(paths, typed["device"], dict(typed)))
        return ""

    def done(accepted: bool | None) -> None:
        if accepted:
            follow(chosen[-1])

    chosen: list[Asked] = []
    screen.app.push_screen(FormDialog("A device from curves", lines, taken, screen.book.signs), done)


def _placed(root: Path, text: str) -> Path:
    path = Path(text).expanduser()
    return path if path.is_absolute() or not (root / path).exists() else root / path
