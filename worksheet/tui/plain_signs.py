"""The last look at what goes to a terminal that shows ASCII only."""

from __future__ import annotations

from rich.segment import Segment
from textual.color import Color
from textual.filter import LineFilter

_SIGNS = str.maketrans(
    dict.fromkeys("─━▔▁▀▄", "-")
    | dict.fromkeys("│┃▌▐▎▊▏▕", "|")
    | dict.fromkeys("┌┐└┘├┤┬┴┼╭╮╰╯", "+")
    | dict.fromkeys("▂▃▅▆▇█░▒▓", "#")
    | {"…": "~"}
)


class PlainSigns(LineFilter):
    """Lines of the toolkit's own drawing become ASCII; what is left of anything else becomes a question mark."""

    def apply(self, segments: list[Segment], background: Color) -> list[Segment]:
        """One line."""
        del background
        return [
            segment
            if segment.control or segment.text.isascii()
            else Segment(_ascii(segment.text), segment.style, segment.control)
            for segment in segments
        ]


def _ascii(text: str) -> str:
    return "".join(c if c.isascii() else "?" for c in text.translate(_SIGNS))
