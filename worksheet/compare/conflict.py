"""A text with git's conflict markers taken apart into both sides, and put together again.

Whoever merged without the merge driver has such files. They are no TOML, but each side is, and showing both is the
first thing that helps. A line counts as a marker only in its place: a row of equals signs in a note is none.
"""

from __future__ import annotations

import difflib
import re
from dataclasses import dataclass

from worksheet.model.text import clean

_LINE = re.compile(r"[^\n]*\n|[^\n]+")
_START = re.compile(r"<{7}(?: (?P<label>.*))?")
_BASE = re.compile(r"\|{7}(?: .*)?")
_MIDDLE = re.compile(r"={7}")
_END = re.compile(r">{7}(?: (?P<label>.*))?")


@dataclass(frozen=True, slots=True)
class Hunk:
    """One place where the sides differ.

    Attributes:
        line: Line of the first marker, counted from 1.
        ours, theirs: The lines of each side.
        base: What both started from, None where the markers do not say.
    """

    line: int
    ours: str
    theirs: str
    base: str | None = None


@dataclass(frozen=True, slots=True)
class Conflict:
    """Both sides of a text with conflict markers.

    Attributes:
        ours, theirs: The whole text of each side.
        our_label, their_label: What the markers of the first place call them ("HEAD", "side"), harmless to show.
        hunks: Every place, in order; at least one.
    """

    ours: str
    theirs: str
    our_label: str
    their_label: str
    hunks: tuple[Hunk, ...]


def split(text: str) -> Conflict | None:
    """Both sides of a text with conflict markers; None where it has none, or where they do not fit together."""
    lines = _lines(text)
    ours: list[str] = []
    theirs: list[str] = []
    hunks: list[Hunk] = []
    labels: list[str] = []
    place = 0
    while place < len(lines):
        start = _START.fullmatch(_bare(lines[place]))
        if start is None:
            ours.append(lines[place])
            theirs.append(lines[place])
            place += 1
            continue
        middle = _next(lines, place + 1, _MIDDLE)
        end = _next(lines, middle + 1, _END)
        if end >= len(lines):
            return None
        above = min(_next(lines, place + 1, _BASE), middle)
        mine, base, other = (
            "".join(lines[first:last]) for first, last in ((place + 1, above), (above + 1, middle), (middle + 1, end))
        )
        hunks.append(Hunk(place + 1, mine, other, base if above < middle else None))
        ours.append(mine)
        theirs.append(other)
        found = _END.fullmatch(_bare(lines[end]))
        labels += [clean(start["label"] or ""), clean(found["label"] or "") if found else ""]
        place = end + 1
    return Conflict("".join(ours), "".join(theirs), labels[0], labels[1], tuple(hunks)) if hunks else None


def mark(ours: str, theirs: str, our_label: str = "ours", their_label: str = "theirs") -> str:
    """One text that holds both sides, with git's markers where they differ.

    Args:
        ours, theirs: The sides; a missing last line end is put in where a marker follows.
        our_label, their_label: What the markers call them.

    Returns: the text itself where both are equal.
    """
    mine, other = _lines(ours), _lines(theirs)
    end = "\r\n" if mine and mine[0].endswith("\r\n") else "\n"
    parts: list[str] = []
    for kind, first, last, start, stop in difflib.SequenceMatcher(None, mine, other, autojunk=False).get_opcodes():
        if kind == "equal":
            parts += mine[first:last]
            continue
        parts.append(f"<<<<<<< {our_label}{end}")
        parts += _ended(mine[first:last], end)
        parts.append(f"======={end}")
        parts += _ended(other[start:stop], end)
        parts.append(f">>>>>>> {their_label}{end}")
    return "".join(parts)


def _lines(text: str) -> list[str]:
    """Lines as git has them: a line feed ends one, and nothing else does."""
    return _LINE.findall(text)


def _bare(line: str) -> str:
    return line.removesuffix("\n").removesuffix("\r")


def _next(lines: list[str], place: int, marker: re.Pattern[str]) -> int:
    """The next line that is a marker, or the number of lines."""
    while place < len(lines) and not marker.fullmatch(_bare(lines[place])):
        place += 1
    return place


def _ended(lines: list[str], end: str) -> list[str]:
    return lines if not lines or lines[-1].endswith("\n") else [*lines[:-1], lines[-1] + end]
