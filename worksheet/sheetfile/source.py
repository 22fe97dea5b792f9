"""From the bytes of a file to text and plain TOML data, whatever the bytes are.

Files come from colleagues, from git and from editors of every kind, so each way in which a file can fail to be a
sensible TOML text is told apart here and becomes a problem with its line. Nothing in this module knows what a sheet is.
"""

from __future__ import annotations

import os
import re
import stat
import tomllib
from dataclasses import dataclass
from pathlib import Path
from typing import Any, Self

from worksheet.model.problem import Problem
from worksheet.model.text import clean
from worksheet.sheetfile.locate import NestedTooDeeplyError, Places, locate

LARGEST = 2_000_000
"""Largest file that is read. [bytes]"""

BYTE_ORDER_MARK = "\ufeff"

_CONFLICT_START = re.compile(r"^<{7}(?: [^\n]*)?$", re.MULTILINE)
_CONFLICT_MIDDLE = re.compile(r"^={7}\r?$", re.MULTILINE)
_CONFLICT_END = re.compile(r"^>{7}(?: [^\n]*)?$", re.MULTILINE)
_LEFTOVER = re.compile(r"[<>=|]{7}(?: |\r?$)")
_AT = re.compile(r" \(at (?:line (\d+), column \d+|end of document)\)$")
_BARE_QUANTITY = re.compile(
    r"=[ \t]*([-+]?[0-9][0-9.eE]*[ \t]?[^\W\d][^#\n]*?|[-+]?[0-9]+,[0-9]+[^#\n]*?)[ \t]*(?:#.*)?$"
)
_HUGE_INTEGER = re.compile(r"[0-9](?:_?[0-9]){4000,}")
_MOST_REPEATED = 50


class Written(float):
    """A TOML float that remembers how it was written ("1e11")."""

    __slots__ = ("text",)
    text: str

    def __new__(cls, text: str) -> Self:
        """Keep the text beside the number."""
        number = super().__new__(cls, text)
        number.text = text
        return number


@dataclass(frozen=True, slots=True)
class Source:
    """A TOML text that was read.

    Attributes:
        data: What it says; floats are Written.
        places: Where each key stands.
    """

    data: dict[str, Any]
    places: Places


def load(path: Path, shown: str) -> bytes | Problem:
    """Read the bytes of an ordinary file, at most LARGEST of them.

    Args:
        path: The file.
        shown: What messages call it.
    """
    try:
        descriptor = os.open(path, os.O_RDONLY | getattr(os, "O_NONBLOCK", 0))  # a pipe in its place must not hang
    except FileNotFoundError:
        return Problem(shown, None, "", "There is no such file.")
    except (OSError, ValueError) as error:
        return Problem(shown, None, "", f"The file cannot be read: {_reason(error)}.")
    try:
        status = os.fstat(descriptor)
        if not stat.S_ISREG(status.st_mode):
            return Problem(shown, None, "", f"Found {_kind(status.st_mode)}, expected an ordinary file.")
        content = os.read(descriptor, LARGEST + 1)
        while 0 < len(content) <= LARGEST and (more := os.read(descriptor, LARGEST + 1 - len(content))):
            content += more
    except OSError as error:
        return Problem(shown, None, "", f"The file cannot be read: {_reason(error)}.")
    finally:
        os.close(descriptor)
    return _too_large(shown, max(status.st_size, len(content))) if len(content) > LARGEST else content


def decode(content: bytes, shown: str) -> str | Problem:
    """Bytes to text. A byte-order mark is left in its place; it belongs to the file.

    Args:
        content: UTF-8, with or without a byte-order mark.
        shown: What messages call the file.
    """
    if len(content) > LARGEST:
        return _too_large(shown, len(content))
    try:
        text = content.decode("utf-8")
    except UnicodeDecodeError as error:
        line = content.count(b"\n", 0, error.start) + 1
        if content[:2] in {b"\xff\xfe", b"\xfe\xff"}:
            return Problem(shown, 1, "", "Found UTF-16, expected UTF-8: save the file as UTF-8.")
        found = f"the byte 0x{content[error.start]:02x}"
        return Problem(shown, line, "", f"Found {found}, expected UTF-8 text: save the file as UTF-8.")
    return text


def parse(text: str, shown: str) -> Source | list[Problem]:
    """Text to plain data with the line of every key, or every problem that keeps it from being TOML.

    Args:
        text: A TOML document; a byte-order mark before it is passed over.
        shown: What messages call the file.
    """
    text = text.removeprefix(BYTE_ORDER_MARK)
    if len(text) > LARGEST:
        return [_too_large(shown, len(text))]
    zero = text.find("\0")
    if zero >= 0:
        line = text.count("\n", 0, zero) + 1
        return [Problem(shown, line, "", "Found a zero byte, expected text: is this a TOML file?")]
    conflicts = _conflicts(text, shown)
    if conflicts:
        return conflicts
    try:
        places = locate(text)
    except NestedTooDeeplyError as error:
        return [_too_deep(shown, error.line, error.key)]
    try:
        return Source(tomllib.loads(text, parse_float=Written), places)
    except tomllib.TOMLDecodeError as error:
        return _broken(text, shown, places, str(error))
    except RecursionError:
        return [_too_deep(shown, places.stopped, places.key_at(places.stopped or 1))]
    except ValueError:  # an integer of more digits than Python converts
        huge = _HUGE_INTEGER.search(text)
        at = text.count("\n", 0, huge.start()) + 1 if huge else 1
        message = "Found an integer of thousands of digits, expected a number within 1e308."
        return [Problem(shown, at, places.key_at(at), message)]


def _broken(text: str, shown: str, places: Places, error: str) -> list[Problem]:
    """What the standard reader says, as problems with line and key; repeated keys all at once."""
    if places.repeated and error.startswith(("Cannot", "Duplicate")):
        return [
            Problem(shown, line, clean(key), f"Found {_last(key)} again, expected it once: it stands on line {first}.")
            for key, line, first in places.repeated[:_MOST_REPEATED]
        ]
    at = _AT.search(error)
    lines = text.split("\n")
    line = int(at[1]) if at and at[1] else max(len(text.rstrip().split("\n")), 1)
    found = lines[line - 1].strip() if line <= len(lines) else ""
    if _LEFTOVER.match(found):
        return [Problem(shown, line, "", _conflict_message(found))]
    reason = clean(error[: at.start()] if at else error)
    key = clean(places.key_at(line))
    quantity = _BARE_QUANTITY.search(found)
    hint = f'; a value with a unit stands in quotes: "{_short(quantity[1])}"' if quantity else ""
    return [Problem(shown, line, key, f"Found {_short(found) or 'nothing'}, expected valid TOML: {reason}{hint}.")]


def _conflicts(text: str, shown: str) -> list[Problem]:
    """The conflicts that a merge left behind, each with the line it starts on."""
    if "<<<<<<<" not in text or ">>>>>>>" not in text:
        return []
    problems, place = [], 0
    while start := _CONFLICT_START.search(text, place):
        middle = _CONFLICT_MIDDLE.search(text, start.end())
        end = middle and _CONFLICT_END.search(text, middle.end())
        if not end:
            break
        line = text.count("\n", 0, start.start()) + 1
        problems.append(Problem(shown, line, "", _conflict_message(start[0].rstrip("\r"))))
        place = end.end()
        if len(problems) == _MOST_REPEATED:
            break
    return problems


def _conflict_message(found: str) -> str:
    return f"Found the conflict marker {_short(found)}, expected a merged file: keep one side and delete the markers."


def _too_large(shown: str, size: int) -> Problem:
    return Problem(shown, None, "", f"Found a file of {size} bytes, expected at most {LARGEST}.")


def _too_deep(shown: str, line: int | None, key: str) -> Problem:
    return Problem(shown, line, clean(key), "Found tables or lists nested without end, expected a few levels at most.")


def _last(key: str) -> str:
    return clean(key.rsplit(".", 1)[-1])


def _short(text: str) -> str:
    text = clean(text)
    return f"{text[:60]}…" if len(text) > 60 else text


def _kind(mode: int) -> str:
    """What stands in the place of a file."""
    if stat.S_ISDIR(mode):
        return "a folder"
    return "a pipe or a device"


def _reason(error: Exception) -> str:
    return clean(getattr(error, "strerror", None) or str(error)).rstrip(".").lower()
