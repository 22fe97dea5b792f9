"""Small helpers for text that came from a file or a keyboard.

Here belongs what every part needs before it shows or compares foreign text: making it harmless to a terminal, finding
the name that was meant, and telling whether something can be a name at all.
"""

from __future__ import annotations

import keyword
import re
from collections.abc import Iterable

__all__ = ["REPLACEMENT", "SIGNS", "clean", "is_identifier", "nearest", "plain_signs"]

REPLACEMENT = "�"
"""Stands where a character was that a terminal could obey or that would hide others."""

_LINE_CHARACTERS = "\t\n"
_UNSAFE = re.compile(
    "["
    "\x00-\x1f\x7f-\x9f"  # C0, DEL and C1: escape sequences begin here
    "\u061c\u200e\u200f\u202a-\u202e\u2066-\u206f"  # bidirectional marks, overrides and isolates, old format controls
    "\u2028\u2029"  # line and paragraph separators
    "\u200b\u2060\ufeff\ufff9-\ufffb"  # without width, so that two texts look alike
    "\ud800-\udfff\ufffe\uffff"  # surrogates and noncharacters cannot be written as UTF-8 or mean nothing
    "\U000e0000-\U000e007f"  # tag characters: invisible text
    "]"
)
_LONGEST_NAME = 80


def clean(text: str, *, lines: bool = False) -> str:
    """Make foreign text safe to show: control, bidirectional and invisible characters become U+FFFD.

    This is the one function at the boundary; markup is not its concern (text is shown unparsed).

    Args:
        text: Anything, surrogates included.
        lines: Keep line ends and tabs, for text of several lines. Otherwise each becomes a space.

    Returns: text of the same meaning without a character that a terminal obeys. `clean(clean(x)) == clean(x)`.
    """
    if text.isascii() and text.isprintable():
        return text
    text = text.replace("\r\n", "\n")
    if lines:
        return _UNSAFE.sub(lambda found: found[0] if found[0] in _LINE_CHARACTERS else REPLACEMENT, text)
    return _UNSAFE.sub(lambda found: " " if found[0] in _LINE_CHARACTERS else REPLACEMENT, text)


SIGNS = {
    "Ω": "ohm",
    "µ": "u",
    "μ": "u",
    "√": "rt",
    "²": "^2",
    "°": "deg",
    "≥": ">=",
    "≤": "<=",
    "×": "x",
    "·": "-",
    "…": "~",
    "−": "-",
    "–": "-",
    "—": "-",
    "′": "'",
    "κ": "kappa",
    "σ": "sigma",
}
"""The signs that this program writes, and what stands for each where only ASCII can be shown."""

_PLAIN = str.maketrans(SIGNS)


def plain_signs(text: str) -> str:
    """A text with this program's own signs spelled in ASCII; other characters stay."""
    return text if text.isascii() else text.translate(_PLAIN)


def nearest(name: str, candidates: Iterable[str]) -> str | None:
    """The candidate that was probably meant, or None where none is near.

    Args:
        name: What was found.
        candidates: Names that would have been right.
    """
    if len(name) > _LONGEST_NAME:
        return None
    known = list(candidates)
    folded = name.casefold().replace("-", "_")
    for candidate in known:
        if candidate.casefold().replace("-", "_") == folded:
            return candidate
    import difflib  # most text is never misspelt

    found = difflib.get_close_matches(name, known, n=1, cutoff=0.6)
    return found[0] if found else None


def is_identifier(name: str) -> bool:
    """Whether the text can name a sheet: a Python identifier that is not a keyword."""
    return name.isidentifier() and not keyword.iskeyword(name)
