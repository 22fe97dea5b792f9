"""The app: one owner of the run, which hands values down to its screens and takes what they ask for to the session.

Length: what comes in from threads and what goes down to screens is seen together in one place.
"""

from __future__ import annotations

import threading
from collections.abc import Callable, Mapping, Sequence
from dataclasses import replace
from pathlib import Path
from typing import TYPE_CHECKING, Any, ClassVar, Generic, TypeVar

from textual.app import App
from textual.binding import BindingType
from textual.driver import Driver
from textual.filter import LineFilter
from textual.message import Message
from textual.screen import Screen

from worksheet.model.problem import Problem
from worksheet.session.recovery import Journal
from worksheet.tui import keymap, themes
from worksheet.tui.first_picture import Picture
from worksheet.tui.guard import Guard
from worksheet.tui.plain_signs import PlainSigns
from worksheet.tui.recompute import Recompute, Stamped
from worksheet.tui.screens.first import FirstScreen
from worksheet.tui.signs import signs_for
from worksheet.tui.terminal import Terminal

if TYPE_CHECKING:  # what computes is loaded behind the first picture
    from worksheet.session.edits import Request
    from worksheet.session.session import Outcome, Session
    from worksheet.session.snapshot import Snapshot
    from worksheet.tui.recomputed import Bounded, Hands, Needed, Results
    from worksheet.tui.rows import Line
    from worksheet.tui.screens.place import Place

Result = TypeVar("Result")

_REST = 0.8
"""How long a sheet must stand still before its algebra is looked for. [s]"""

_PATIENCE = 1.0
"""Longest wait for the first picture before the book is loaded beside it. [s]"""

_LOOK = 0.5
"""How often files are looked at for changes by others. [s]"""


class _Told(Message, Generic[Result]):
    """A result from a thread, with the revision that it belongs to."""

    def __init__(self, stamped: Stamped[Result]) -> None:
        super().__init__()
        self.stamped = stamped


class BookApp(App[int]):
    """A project in the terminal."""

    ENABLE_COMMAND_PALETTE = False
    CSS_PATH = "styles/book.tcss"
    BINDINGS: ClassVar[list[BindingType]] = []

    class Pictured(Message):
        """The first picture has been made."""

        def __init__(self, picture: Picture) -> None:
            super().__init__()
            self.picture = picture

    class Opened(Message):
        """The book has been read and reviewed; None with the error where that failed."""

        def __init__(self, session: Session | None, results: Results | None, error: Exception | None = None) -> None:
            super().__init__()
            self.session, self.results, self.error = session, results, error

    class Reviewed(_Told["Results"]):
        """A review has been worked out."""

    class Solved(_Told["Needed"]):
        """A sheet's needs have been worked out."""

    class Windows(_Told["Bounded"]):
        """A sheet's windows have been found, its proposal not yet."""

    class Explained(_Told["Hands"]):
        """The algebra of a sheet's bounds has been found."""

    class Changed(Message):
        """Somebody else changed the files."""

        def can_replace(self, message: Message) -> bool:
            """Only the newest state matters."""
            return isinstance(message, BookApp.Changed)

    def __init__(
        self,
        session: Session | Callable[[], Session],
        terminal: Terminal,
        guard: Guard | None = None,
        *,
        driver_class: type[Driver] | None = None,
    ) -> None:
        """Take what the terminal can do; `guard` keeps the end from cutting a write in two.

        `session` is one that is open, or what opens one, which is called in a thread behind the first picture.
        """
        self.terminal = terminal
        self.themes, theme_problems = themes.read(terminal.configuration)  # before the style sheet is read
        super().__init__(driver_class=driver_class, ansi_color=True if terminal.no_colour else None)
        self.fault: Exception | None = None
        self._given = session
        self._loading = False
        self.first_picture: Callable[[], Picture | None] = lambda: None
        self.signs = signs_for(terminal.plain_signs)
        self._plain = [PlainSigns()] if terminal.plain_signs else []
        self.session: Session
        self.snapshot: Snapshot
        self.journal: Journal
        self.results: Results | None = None
        self.needed: Needed | None = None
        self.keys = keymap.read(terminal.configuration)
        self.own_problems: tuple[Problem, ...] = (*self.keys.problems, *theme_problems)
        self.writing = guard.writing if guard is not None else threading.Lock()
        self._reviews: Recompute[Results] = Recompute(lambda one: self._deliver(self.Reviewed(one)))
        self._solves: Recompute[Needed] = Recompute(lambda one: self._deliver(self.Solved(one)))
        self._explains: Recompute[Hands] = Recompute(lambda one: self._deliver(self.Explained(one)))
        self.hands: Hands | None = None
        self.left_in_forms: dict[str, dict[str, str]] = {}
        self._ended = threading.Event()

    # Beginning and end

    def _fatal_error(self) -> None:
        """Leave after a fault of the program; `start` tells of it without a traceback."""
        self.fault = self._exception
        self._close_messages_no_wait()

    def get_line_filters(self) -> Sequence[LineFilter]:
        """The toolkit's own; where only ASCII can be shown, one that lets nothing else through."""
        return [*super().get_line_filters(), *self._plain]

    def get_theme_variable_defaults(self) -> dict[str, str]:
        """Colours of the roles before a theme is on."""
        return dict(self.themes[self._first_theme()].theme().variables)

    def get_default_screen(self) -> Screen[Any]:
        """The first picture, where there is something to wait for."""
        return FirstScreen(self.first_picture) if callable(self._given) else super().get_default_screen()

    def on_mount(self) -> None:
        """The project's screen, and the work behind it."""
        for one in self.themes.values():
            self.register_theme(one.theme())
        self.theme = self._first_theme()
        self.set_keymap(self.keys.changed())
        if callable(self._given):
            self.set_timer(_PATIENCE, self._load)
        else:
            self._begin(self._given)

    def _load(self) -> None:
        """Begin to load the book, once the first picture is on the screen or has been waited for long enough.

        Loading keeps the interpreter busy; beside it the picture would be drawn in twice the time.
        """
        if callable(self._given) and not self._loading:
            self._loading = True
            threading.Thread(target=self._open, args=(self._given,), name="opening", daemon=True).start()

    def _open(self, opener: Callable[[], Session]) -> None:
        """In a thread: read and review the book, and load what shows it."""
        try:
            import worksheet.tui.screens.book  # noqa: F401 - loaded here, so that the event loop need not wait for it
            from worksheet.tui.recomputed import review_of, today

            session = opener()
            self._deliver(self.Opened(session, review_of(session, session.snapshot(), today())))
        except Exception as error:  # noqa: BLE001 - raised again on the event loop
            self._deliver(self.Opened(None, None, error))

    def on_book_app_pictured(self, message: BookApp.Pictured) -> None:
        """Show the first picture, where the screens proper are not there yet."""
        if isinstance(self.screen, FirstScreen):
            self.screen.show_picture(message.picture)

    def on_first_screen_shown(self) -> None:
        """The first picture is on the screen."""
        self._load()

    def on_book_app_opened(self, message: BookApp.Opened) -> None:
        """The book is there: the project's screen, and the keys that were pressed before it came."""
        if message.session is None:
            raise message.error or RuntimeError("the book could not be opened")
        self.results = message.results
        first = self.screen
        self._begin(message.session)
        for key in first.pressed if isinstance(first, FirstScreen) else ():
            self.call_after_refresh(self.simulate_key, key)

    def _begin(self, session: Session) -> None:
        """The project's screen, and the work behind it."""
        from worksheet.tui.screens.book import BookScreen

        self.session, self.snapshot = session, session.snapshot()
        self.journal = Journal(self.terminal.state / "typing", session.root)
        self.push_screen(BookScreen())
        self.work()
        threading.Thread(target=self._look, name="look", daemon=True).start()
        self.call_after_refresh(self._offer_left)

    def shown(self) -> tuple[Mapping[str, bytes], Mapping[str, list[Line]]] | None:
        """The files of the book and the project's screen of them, None where there are no results for them."""
        results = self.results
        if results is None or results.revision != self.snapshot.revision:
            return None
        from worksheet.tui.pages import book_page

        return self.snapshot.contents, book_page.parts(self.snapshot, results.review, self.size, self.signs)

    def _first_theme(self) -> str:
        if self.terminal.no_colour:
            return themes.SIXTEEN  # the toolkit takes all colours out of a theme of the terminal's own palette
        chosen = themes.remembered(self.terminal.state)
        fallback = themes.SIXTEEN if self.terminal.few_colours else themes.DARK
        return chosen if chosen in self.themes else fallback

    def on_unmount(self) -> None:
        """Begin nothing more."""
        self._ended.set()
        self._reviews.stop()
        self._solves.stop()
        self._explains.stop()

    def _look(self) -> None:
        while not self._ended.wait(_LOOK):
            if self.session.refresh():
                self._deliver(self.Changed())

    def _deliver(self, message: Message) -> None:
        if not self._ended.is_set():
            self.post_message(message)

    def _offer_left(self) -> None:
        left = self.journal.left()
        if left:
            from worksheet.tui.leaving import offer

            offer(self, left)

    # Values down

    def work(self) -> None:
        """Have worked out what belongs to the book as it stands."""
        from worksheet.tui.recomputed import review_of, today

        snapshot = self.snapshot = self.session.snapshot()
        self._reviews.want(snapshot.revision, lambda: review_of(self.session, snapshot, today()))

    def _solve(self) -> None:
        """Have worked out what the open sheet needs."""
        from worksheet.tui.recomputed import needs_of

        snapshot, sheet = self.snapshot, self.open_name
        if sheet is not None:

            def early(found: Bounded) -> None:
                self._deliver(self.Windows(Stamped(snapshot.revision, found)))

            self._solves.want(snapshot.revision, lambda: needs_of(self.session, snapshot, sheet, early))

    @property
    def open_name(self) -> str | None:
        """The sheet that is open, if one is."""
        from worksheet.tui.screens.sheet import SheetScreen

        return next((one.name_of_sheet for one in self.screen_stack if isinstance(one, SheetScreen)), None)

    def show_book(self) -> None:
        """Hand the state down to the uppermost screen that shows it; those below take it in when they come up again.

        A screen below that is drawn makes the toolkit draw the one above it as a whole.
        """
        screen = self._uppermost()
        if screen is not None and self.is_running:  # while it ends, parts of a screen are gone already
            screen.show_book()

    def _uppermost(self) -> Place | None:
        from worksheet.tui.screens.place import Place

        return next((one for one in reversed(self.screen_stack) if isinstance(one, Place)), None)

    def on_book_app_reviewed(self, message: BookApp.Reviewed) -> None:
        """Show it, unless it belongs to another revision by now."""
        stamped = message.stamped
        if stamped.revision != self.snapshot.revision:
            return
        if stamped.error:
            self._say(f"The results cannot be worked out: {stamped.error}")
        self.results = stamped.value or self.results
        self.show_book()
        self.call_after_refresh(self._solve)  # at the same time it would hold up the values and verdicts

    def on_book_app_windows(self, message: BookApp.Windows) -> None:
        """Show windows beside the proposal that there was, unless they belong to another revision by now."""
        found, needed = message.stamped.value, self.needed
        late = message.stamped.revision != self.snapshot.revision
        if late or found is None or needed is None or needed.solved is None or needed.name != found.name:
            return
        self.needed = replace(needed, solved=replace(needed.solved, needed=found.windows))
        self.show_book()

    def on_book_app_solved(self, message: BookApp.Solved) -> None:
        """Show it, unless it belongs to another revision by now."""
        stamped = message.stamped
        if stamped.revision != self.snapshot.revision or stamped.value is None:
            return
        self.needed = needed = stamped.value
        self.show_book()
        self.set_timer(_REST, lambda: self._explain(needed))

    def _explain(self, needed: Needed) -> None:
        """Look for the algebra once nothing has moved for a while: it takes a core for seconds."""
        from worksheet.tui.recomputed import hands_of

        snapshot, session = self.snapshot, self.session
        if needed is not self.needed or needed.revision != snapshot.revision or needed.solved is None:
            return
        self._explains.want(
            snapshot.revision,
            lambda: hands_of(
                session, snapshot, needed.name, lambda: not self._ended.is_set() and needed is self.needed
            ),
        )

    def on_book_app_explained(self, message: BookApp.Explained) -> None:
        """Show it, unless it belongs to another revision by now."""
        stamped = message.stamped
        if stamped.revision == self.snapshot.revision and stamped.value is not None:
            self.hands = stamped.value
            self.show_book()

    def hands_for(self, name: str) -> Mapping[tuple[str, str, str], str]:
        """Formulas by hand of a sheet as it stands; empty while they are being looked for."""
        hands = self.hands
        return hands.texts if hands and hands.name == name and hands.revision == self.snapshot.revision else {}

    def on_book_app_changed(self) -> None:
        """Take in what somebody else wrote."""
        self.work()
        self.show_book()
        self._say("taken in: files changed by somebody else")

    def _say(self, text: str) -> None:
        screen = self._uppermost()
        if screen is not None:
            screen.say(text)

    # What screens ask for

    def change(self, request: Request) -> Outcome:
        """Have something changed; it is on disk when this returns accepted."""
        with self.writing:
            outcome = self.session.apply(request)
        return self._after(outcome)

    def undo(self) -> Outcome:
        """Take the last change back."""
        with self.writing:
            outcome = self.session.undo()
        return self._after(outcome)

    def redo(self) -> Outcome:
        """Make it again."""
        with self.writing:
            outcome = self.session.redo()
        return self._after(outcome)

    def _after(self, outcome: Outcome) -> Outcome:
        self.work()
        self.show_book()
        return outcome

    def reload(self) -> None:
        """Read every file again."""
        self.session.refresh(force=True)
        self.work()
        self.show_book()

    def open_sheet(self, name: str, row: str = "") -> None:
        """Show a sheet, with the cursor on a row of it."""
        from worksheet.tui.screens.sheet import SheetScreen

        screen = SheetScreen(name, row)
        if isinstance(self.screen, SheetScreen):
            self.switch_screen(screen)
        else:
            self.push_screen(screen)
        self.call_after_refresh(self.work)

    def choose_theme(self, name: str | None) -> None:
        """Take other colours and remember them."""
        if name in self.themes:
            self.theme = str(name)
            themes.remember(self.terminal.state, str(name))


def run(root: Path, *, read_only: bool = False) -> int:
    """Open a project in the terminal.

    Args:
        root: The project folder.
        read_only: Whether nothing may be changed.
    Returns: exit status: 0, 2 where the terminal cannot show the app (said on standard error)
    """
    from worksheet.tui.start import start

    return start(root, read_only=read_only)
