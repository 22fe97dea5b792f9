"""What every dialog has: a frame with a title, a way out, and the signs of the terminal."""

from __future__ import annotations

from typing import ClassVar, TypeVar

from textual.binding import Binding, BindingType
from textual.screen import ModalScreen

from worksheet.tui.signs import Signs

Answer = TypeVar("Answer")


class Dialog(ModalScreen[Answer]):
    """A dialog; its answer is None where the user leaves it."""

    BINDINGS: ClassVar[list[BindingType]] = [Binding("escape", "leave", show=False, priority=True)]

    def __init__(self, title: str, signs: Signs) -> None:
        super().__init__()
        self.heading = signs.text(title)
        self.signs = signs

    def action_leave(self) -> None:
        """Leave without an answer."""
        self.dismiss(None)
