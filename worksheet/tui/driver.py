"""A driver that keeps a picture of the terminal and sends only the cells that changed, for slow lines.

Switched on with BIASBOOK_CELLS=1. The toolkit sends whole regions; over a slow line most of that is what stands there
already. What the driver does not understand it passes on as it is and forgets its picture, so that it can only ever be
slower, never wrong.
"""

from __future__ import annotations

import re
from typing import Any

from rich.cells import cell_len
from textual.drivers.linux_driver import LinuxDriver

_TOKEN = re.compile(
    r"\x1b\[(?P<row>\d+);(?P<column>\d+)H"
    r"|\x1b\[(?P<style>[\d;:]*)m"
    r"|(?P<line>\r?\n)"
    r"|(?P<text>[^\x00-\x1f\x7f]+)"
    r"|(?P<other>.)",
    re.DOTALL,
)
_MOVE = re.compile(r"\x1b\[\d+;\d+H")
_OTHER_SCREEN = "\x1b[?1049"

Cell = tuple[str, str]
"""A character and its style; the right half of a wide character is ""."""


class Picture:
    """What stands on the terminal, as far as it is known."""

    def __init__(self) -> None:
        self._cells: dict[tuple[int, int], Cell] = {}

    def forget(self) -> None:
        """Nothing is known any more."""
        self._cells.clear()

    def changes(self, data: str) -> str | None:
        """What has to be sent so that the terminal shows what `data` would make it show.

        Args:
            data: Moves, styles, line ends and text, beginning with a move.
        Returns: the same with fewer cells; None where there is something else in it
        """
        pen = _Pen()
        row = column = 0
        style = ""
        for token in _TOKEN.finditer(data):
            kind = token.lastgroup
            if kind == "column":
                row, column = int(token["row"]), int(token["column"])
            elif kind == "style":
                code = token["style"]
                style = "" if code in {"", "0"} else f"{style};{code}" if style else code
            elif kind == "line":
                row, column = row + 1, 1
            elif kind == "text":
                moved = self._text(pen, token["text"], row, column, style)
                if moved is None:
                    return None
                column = moved
            else:
                return None
        return pen.finished(row, column)

    def _text(self, pen: _Pen, text: str, row: int, column: int, style: str) -> int | None:
        """Put text; the column after it, None where a character takes no column of its own."""
        for character in text:
            wide = 1 if character < "\u0300" else cell_len(character)
            if wide not in {1, 2}:
                return None
            if self._put((row, column), (character, style), wide):
                pen.write(row, column, style, character, wide)
            column += wide
        return column

    def _put(self, place: tuple[int, int], cell: Cell, wide: int) -> bool:
        """Whether a cell has to be sent. Halves of wide characters that it cuts are forgotten."""
        row, column = place
        right = (row, column + 1)
        known = self._cells.get(place)
        if known == cell and (wide == 1 or self._cells.get(right) == ("", cell[1])):
            return False
        if known is not None and not known[0]:
            self._cells.pop((row, column - 1), None)
        if self._halved(row, column + wide):
            self._cells.pop((row, column + wide), None)
        self._cells[place] = cell
        if wide == 2:
            self._cells[right] = ("", cell[1])
        return True

    def _halved(self, row: int, column: int) -> bool:
        """Whether the right half of a wide character stands there whose left half is being replaced."""
        known = self._cells.get((row, column))
        return known is not None and not known[0]


class _Pen:
    """Writes cells with as few moves and styles as they need."""

    def __init__(self) -> None:
        self._out: list[str] = []
        self._at: tuple[int, int] | None = None
        self._style = ""

    def write(self, row: int, column: int, style: str, character: str, wide: int) -> None:
        """One character at a place."""
        if self._at is None or self._at[0] != row or column < self._at[1]:
            self._out.append(f"\x1b[{row};{column}H")
        elif self._at[1] != column:
            self._out.append(f"\x1b[{column - self._at[1]}C")
        if style != self._style:
            self._out.append(f"\x1b[0;{style}m" if style else "\x1b[0m")
            self._style = style
        self._out.append(character)
        self._at = (row, column + wide)

    def finished(self, row: int, column: int) -> str:
        """Everything, with the cursor where the whole text would have left it and no style on."""
        if self._style:
            self._out.append("\x1b[0m")
        self._out.append(f"\x1b[{row};{column}H")
        return "".join(self._out)


class CellDriver(LinuxDriver):
    """Sends changed cells only."""

    def __init__(self, *arguments: Any, **options: Any) -> None:
        super().__init__(*arguments, **options)
        self._picture = Picture()
        self._known_size: tuple[int, int] | None = None

    def write(self, data: str) -> None:
        """Send what changes. After a change of size the terminal may show anything."""
        size = self._get_terminal_size()
        if size != self._known_size or _OTHER_SCREEN in data:
            self._known_size = size
            self._picture.forget()
        if not _MOVE.match(data):
            super().write(data)
            return
        changed = self._picture.changes(data)
        if changed is None:
            self._picture.forget()
            super().write(data)
        else:
            super().write(changed)
