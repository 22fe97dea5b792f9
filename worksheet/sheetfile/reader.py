"""The problems of one file, collected while it is read, and what a value looks like in a message.

A message has one form throughout: what was found, what was expected, and the nearest known key where there is one.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable

from worksheet.model.problem import Problem
from worksheet.model.text import clean, nearest
from worksheet.sheetfile.locate import Places, below
from worksheet.sheetfile.source import Written

MOST_PROBLEMS = 100
"""Problems that are reported of one file; a file with more has another kind of problem."""

_LONGEST = 60


class Reader:
    """Collects the problems of one file and knows where everything stands in it.

    Attributes:
        shown: What messages call the file.
        places: Where its keys stand.
        problems: What was found so far.
    """

    __slots__ = ("places", "problems", "shown", "unreported")

    def __init__(self, shown: str, places: Places) -> None:
        self.shown = shown
        self.places = places
        self.problems: list[Problem] = []
        self.unreported = 0

    @property
    def count(self) -> int:
        """Problems so far, those beyond the limit included."""
        return len(self.problems) + self.unreported

    def report(self, key: str, message: str) -> None:
        """Add a problem at a dotted key."""
        if len(self.problems) >= MOST_PROBLEMS:
            self.unreported += 1
        else:
            self.problems.append(Problem(self.shown, self.places.line(key) or 1, clean(key), message))

    def refuse(self, key: str, raw: object, expected: str) -> None:
        """Add a problem of the form found and expected."""
        self.report(key, f"Found {found(raw)}, expected {expected}.")

    def unknown(self, where: str, name: str, known: Iterable[str], explain: Callable[[str], str] | None = None) -> None:
        """Add a problem about a key that does not exist there, with the nearest one that does.

        Args:
            where: Dotted key of the table.
            name: What was found.
            known: What would have been right.
            explain: Gives a clause that stands instead of a suggestion, or "".
        """
        key = below(where, name)
        if len(self.problems) >= MOST_PROBLEMS:
            self.unreported += 1
            return
        reason = explain(name) if explain else ""
        if reason:
            self.report(key, f"Found the key {clean(name)}, which is not taken here: {reason}.")
            return
        names = list(known)
        near = nearest(name, names)
        if near is not None:
            hint = f"did you mean {clean(near)}?"
        else:
            hint = f"expected one of {', '.join(map(clean, names[:30]))}." if names else "none is expected here."
        self.report(key, f"Found the unknown key {clean(name)}; {hint}")

    def result(self) -> list[Problem]:
        """Every problem, in the order of the file."""
        problems = sorted(self.problems, key=lambda problem: problem.line or 0)
        if self.unreported:
            problems.append(
                Problem(self.shown, None, "", f"There are {self.unreported} further problems in this file.")
            )
        return problems


def found(raw: object) -> str:
    """A TOML value as a message shows it: short and harmless."""
    if isinstance(raw, str):
        shown = clean(raw[:100])
        return f'"{shown[:60]}…"' if len(shown) > 60 else f'"{shown}"'
    if isinstance(raw, bool):
        return "true" if raw else "false"
    if isinstance(raw, Written):
        return clean(raw.text[:60])
    if isinstance(raw, int):
        return str(raw) if abs(raw) < 10**20 else "an integer of more than twenty digits"
    if isinstance(raw, dict):
        return "a table"
    if isinstance(raw, list):
        return "a list"
    return clean(str(raw))[:60]
