"""A problem is a value: what is wrong, where, the likely cause and what to try.

The same object becomes a line on standard error, a row in the app and an item in JSON, so every layer
that finds something wrong returns problems instead of raising.
"""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class Problem:
    """One thing that is wrong with the user's input.

    Attributes:
        file: Path as the user would type it, relative to the project where there is one.
        line: Line number counted from 1, None where no line can be named.
        key: Dotted key ("assume.load_capacitance"), "" where none is concerned.
        message: What was found, what was expected, the nearest known key where there is one.
    """

    file: str
    line: int | None
    key: str
    message: str

    def __str__(self) -> str:
        """`file:line: key: message`, leaving out what is not known."""
        place = self.file if self.line is None else f"{self.file}:{self.line}"
        return ": ".join(part for part in (place, self.key, self.message) if part)
