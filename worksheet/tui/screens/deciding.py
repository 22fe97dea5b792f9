"""What every screen shares on which somebody decides: who it is, and forms whose texts become a request."""

from __future__ import annotations

from collections.abc import Callable, Mapping

from worksheet.session import deciding, revisions
from worksheet.session.edits import ChangeSheet
from worksheet.tui.dialogs.form import FormDialog, FormLine
from worksheet.tui.recomputed import today
from worksheet.tui.screens.forming import submit
from worksheet.tui.screens.place import Place

Made = Callable[[Mapping[str, str]], "ChangeSheet | str"]
"""What the texts of a form ask for, or what is wrong with them."""


class DecidingPlace(Place):
    """A screen on which somebody decides."""

    def __init__(self) -> None:
        super().__init__()
        self._by: str | None = None

    @property
    def person(self) -> str:
        """Who decides: as typed last, at first as git knows it, "" where it does not."""
        if self._by is None:
            self._by = revisions.identity(self.snapshot.project.root)
        return self._by

    def decide(self, title: str, lines: list[FormLine], made: Made) -> None:
        """Ask who decides and what else there is to say, and have it written."""

        def follow(texts: Mapping[str, str]) -> str:
            if not texts["by"]:
                return "Say who decides."
            request = made(texts)
            if isinstance(request, str):
                return request
            self._by = texts["by"]
            return submit(self.book, request)

        def done(accepted: bool | None) -> None:
            if accepted:
                self.say(self.snapshot.undo)

        by = FormLine("by", "By (needed)", "Who decides.", self.person)
        self.app.push_screen(FormDialog(title, [by, *lines], follow, self.book.signs), done)

    def settle_remark(self, sheet: str, number: int) -> None:
        """Settle a remark of a sheet with an answer."""

        def made(texts: Mapping[str, str]) -> ChangeSheet | str:
            return deciding.settle(sheet, number, texts["by"], texts["answer"], today())

        self.decide(f"Settle a remark on {sheet}", [FormLine("answer", "Answer", "What came of it.")], made)
