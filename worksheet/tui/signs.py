"""Signs that the screens draw with, for terminals that show Unicode and for those that show ASCII only.

Text goes through `Signs.text` before its width is reckoned, so that "kΩ" may become "kohm" without shifting a column.
"""

from __future__ import annotations

from dataclasses import dataclass

from worksheet.model.text import clean, plain_signs


@dataclass(frozen=True, slots=True)
class Signs:
    """One set of signs.

    Attributes:
        plain: ASCII only.
        across, down: A horizontal and a vertical line.
        tee_right: A line going on down with a branch to the right.
        corner_in, corner_out: From a channel's bar to the column of the channel, above and below.
        bar: The bar of a channel.
        gate: The end of a gate's line.
        arrow_left, arrow_right: Where current flows at a source.
        pointer: Before the row that has the focus.
    """

    plain: bool
    across: str
    down: str
    tee_right: str
    top: str
    bottom: str
    turn_up: str
    turn_down: str
    bar: str
    gate: str
    arrow_left: str
    arrow_right: str
    pointer: str
    marker: str

    def text(self, text: str) -> str:
        """Foreign or own text as this terminal can show it, harmless and on one line."""
        shown = clean(text)
        if not self.plain or shown.isascii():
            return shown
        return "".join(c if c.isascii() else "?" for c in plain_signs(shown))

    def lines(self, text: str) -> list[str]:
        """As text, for text of several lines."""
        return [self.text(line) for line in clean(text, lines=True).expandtabs(4).split("\n")]


FULL = Signs(
    plain=False,
    across="─",
    down="│",
    tee_right="├",
    top="┌",
    bottom="└",
    turn_up="┘",
    turn_down="┐",
    bar="┃",
    gate="┤",
    arrow_left="◂",
    arrow_right="▸",
    pointer="▶",
    marker="●",
)
PLAIN = Signs(
    plain=True,
    across="-",
    down="|",
    tee_right="+",
    top=".",
    bottom="'",
    turn_up="'",
    turn_down=".",
    bar="|",
    gate="|",
    arrow_left="<",
    arrow_right=">",
    pointer=">",
    marker="o",
)


def signs_for(plain: bool) -> Signs:
    """The set for a terminal."""
    return PLAIN if plain else FULL
