"""On which line of a TOML text each key stands, found by a scan that knows just enough of TOML for that.

The standard reader gives values without places, and a reader that keeps places takes nine times as long. The scan
therefore only follows statements, tables and nesting. It accepts whatever the standard reader accepts; where a text is
no TOML it stops, and what was found up to there still tells which key the trouble belongs to. It never recurses, so a
text that nests without end is told from a healthy one before anything else reads it.
"""

from __future__ import annotations

import re
import tomllib
from collections.abc import Iterable
from dataclasses import dataclass, field

DEEPEST = 32
"""Deepest nesting of tables and lists, and most parts of a dotted key; a sheet needs five."""

_MOST_ENTRIES = 1000  # of one list whose lines are kept; a list of a million numbers is an attack, not a sheet

BASIC = r'"(?:[^"\\\n]|\\[^\n])*+"'
LITERAL = r"'[^'\n]*+'"
_PART = rf"(?:[A-Za-z0-9_-]++|{BASIC}|{LITERAL})"
DOTTED = rf"{_PART}(?:[ \t]*+\.[ \t]*+{_PART})*+"
_SCALAR = rf"""(?:{BASIC}(?!")|{LITERAL}(?!')|[^\s"'\[\]{{}},=\#]++)"""
_FLAT = rf"[ \t]*+[A-Za-z0-9_-]++[ \t]*+=[ \t]*+{_SCALAR}[ \t]*+"
_END = r"[ \t]*+(?:\#[^\n]*+)?(?:\n|\Z)"
_BARE = re.compile(r"[A-Za-z0-9_-]+")
_PARTS = re.compile(_PART)
_STATEMENT = re.compile(
    rf"""[ \t]*+(?:
        (?P<blank>(?:\#[^\n]*+)?(?:\n|\Z))
      | (?P<name>[A-Za-z0-9_-]++)[ \t]*+=[ \t]*+(?:{BASIC}(?!")|{LITERAL}(?!')|[^\s"'\[{{\#][^\n\#]*+){_END}
      | (?P<flat>[A-Za-z0-9_-]++)[ \t]*+=[ \t]*+\{{{_FLAT}(?:,{_FLAT})*+\}}{_END}
      | \[(?P<array>\[)?[ \t]*+(?P<header>{DOTTED})[ \t]*+\](?(array)\]){_END}
      | (?P<key>{DOTTED})[ \t]*+=
    )""",
    re.VERBOSE,
)
_TOKEN = re.compile(
    r"""(?P<skip>[ \t\r]++|\#[^\n]*+)
      | (?P<newline>\n)
      | (?P<lines>\"\"\"(?:[^"\\]|\\[\s\S]|"(?!""))*+\"{3,5}|'''(?:[^']|'(?!''))*+'{3,5})
      | (?P<scalar>"(?:[^"\\\n]|\\[^\n])*+"|'[^'\n]*+'|[^\s"'\[\]{},\#]++)
      | (?P<mark>[\[\]{},])""",
    re.VERBOSE,
)
_FLAT_NAMES = re.compile(rf"([A-Za-z0-9_-]++)[ \t]*+=[ \t]*+{_SCALAR}")
_INLINE_KEY = re.compile(rf"[ \t]*+(?P<key>{DOTTED})[ \t]*+=")


class NestedTooDeeplyError(ValueError):
    """Tables, lists or dotted keys nest beyond DEEPEST. `line` counts from 1."""

    def __init__(self, line: int, key: str) -> None:
        super().__init__(f"nested more than {DEEPEST} deep")
        self.line = line
        self.key = key


Statement = tuple[int, int, str, str]
"""First line, last line, dotted key of the table it stands in, own dotted key; "" for the header of that table."""


@dataclass(slots=True)
class Places:
    """Where things stand in one text.

    Attributes:
        statements: Headers and keys with their values, in the order of the text.
        lines: Dotted key to line, counted from 1. An entry of a list counts as a part ("evidence.0.value").
        repeated: Keys that are stated again: (dotted key, line, line of the first).
        stopped: Line at which the scan no longer understood the text, None where it reached the end.
    """

    statements: list[Statement] = field(default_factory=list)
    lines: dict[str, int] = field(default_factory=dict)
    repeated: list[tuple[str, int, int]] = field(default_factory=list)
    stopped: int | None = None

    def line(self, key: str) -> int | None:
        """Line of a dotted key, else of the nearest thing that holds it, else None."""
        while key not in self.lines:
            key = parent(key)
            if not key:
                return None
        return self.lines[key]

    def key_at(self, line: int) -> str:
        """The last key that starts on that line or before it, "" where there is none."""
        found, best = "", 0
        for key, place in self.lines.items():
            if best <= place <= line:
                found, best = key, place
        return found


def dotted(parts: Iterable[str | int]) -> str:
    """A path as one dotted key; a part that needs quotes has them, as in TOML."""
    return ".".join(part if isinstance(part, str) and _BARE.fullmatch(part) else _quoted(part) for part in parts)


def below(key: str, part: str | int) -> str:
    """The dotted key of something inside `key` ("" for the document)."""
    plain = isinstance(part, str) and ((part.isascii() and part.isidentifier()) or _BARE.fullmatch(part))
    name = part if plain else _quoted(part)
    return f"{key}.{name}" if key else str(name)


def parent(key: str) -> str:
    """The dotted key of what holds this one, "" for the document."""
    parts = list(_PARTS.finditer(key))
    return key[: max(parts[-1].start() - 1, 0)] if parts else ""


def locate(text: str) -> Places:
    """Find the line of every key. Lines end with a line feed, with or without a carriage return before it.

    Raises: NestedTooDeeplyError.
    """
    if "\r" in text:
        text = text.replace("\r\n", "\n")
    scan = _Scan(text)
    places = scan.places
    match, lines, statements = _STATEMENT.match, places.lines, places.statements
    table, place, end = "", 0, len(text)
    while place < end:
        found = match(text, place)
        if found is None:
            if text[place:].strip():
                places.stopped = scan.line
            break
        kind = found.lastgroup
        line = scan.line
        if kind in {"name", "flat"}:
            name = found[kind]
            key = f"{table}.{name}" if table else name
            statements.append((line, line, table, key))
            if key in lines:
                places.repeated.append((key, line, lines[key]))
            else:
                lines[key] = line
                if kind == "flat":
                    scan.flat(key, found.end(kind), found.end())
        elif kind == "header":
            table = scan.header(found["header"], array=found["array"] is not None)
            statements.append((line, line, table, ""))
        elif kind == "key":
            key = scan.enter(table, found["key"])
            place = scan.value(found.end(), key)
            statements.append((line, scan.line - 1, table, key))
            if place < 0:
                places.stopped = scan.line
                break
            continue
        place = found.end()
        scan.line += 1
    return places


class _Scan:
    """The state of one scan: the text, what was found in it, and the present line."""

    __slots__ = ("entries", "headers", "line", "places", "text")

    def __init__(self, text: str) -> None:
        self.text = text
        self.places = Places()
        self.line = 1
        self.entries: dict[str, int] = {}  # arrays of tables: the number of the present entry
        self.headers: set[str] = set()

    def flat(self, key: str, start: int, end: int) -> None:
        """Enter the keys of an inline table that stands on one line and holds plain values."""
        lines, line = self.places.lines, self.line
        for name in _FLAT_NAMES.findall(self.text, start, end):
            inner = f"{key}.{name}"
            if inner in lines:
                self.places.repeated.append((inner, line, line))
            lines[inner] = line

    def header(self, written: str, *, array: bool) -> str:
        """Enter a table header; the dotted key of the table, with the number of the entry in an array of tables."""
        parts = split(written)
        if len(parts) > DEEPEST:
            raise NestedTooDeeplyError(self.line, dotted(parts[:2]))
        lines, key = self.places.lines, ""
        for part in parts[:-1]:
            key = below(key, part)
            lines.setdefault(key, self.line)
            if key in self.entries:
                key = f"{key}.{self.entries[key]}"
        key = below(key, parts[-1])
        if array:
            lines.setdefault(key, self.line)
            self.entries[key] = self.entries.get(key, -1) + 1
            key = f"{key}.{self.entries[key]}"
        elif key in self.headers:
            self.places.repeated.append((key, self.line, lines[key]))
        else:
            self.headers.add(key)
        lines.setdefault(key, self.line)
        return key

    def enter(self, table: str, written: str) -> str:
        """Enter a dotted key below a table; its own dotted key."""
        parts = split(written)
        if len(parts) + table.count(".") > DEEPEST:
            raise NestedTooDeeplyError(self.line, below(table, parts[0]))
        lines, key = self.places.lines, table
        for part in parts[:-1]:
            key = below(key, part)
            lines.setdefault(key, self.line)
        key = below(key, parts[-1])
        if key in lines:
            self.places.repeated.append((key, self.line, lines[key]))
        else:
            lines[key] = self.line
        return key

    def value(self, place: int, key: str) -> int:
        """Follow one value to the start of the next statement; -1 where it is no TOML."""
        token, text = _TOKEN.match, self.text
        holders: list[_Holder] = []
        while found := token(text, place):
            place = found.end()
            kind = found.lastgroup
            if kind == "newline":
                self.line += 1
                if not holders:
                    return place
            elif kind == "mark":
                place = self.mark(holders, found[0], place, key)
            elif kind != "skip":
                self.begin(holders)
                if kind == "lines":
                    self.line += found[0].count("\n")
            if place < 0:
                return place
        if holders or place < len(text):
            return -1
        self.line += 1  # the last line has no line feed
        return place

    def begin(self, holders: list[_Holder]) -> str | None:
        """A value begins: enter it where it is an entry of a list; its dotted key there."""
        if not holders or not holders[-1].is_list:
            return None
        holder = holders[-1]
        key = f"{holder.key}.{holder.entry}"
        if holder.entry < _MOST_ENTRIES:
            self.places.lines.setdefault(key, self.line)
        return key

    def mark(self, holders: list[_Holder], mark: str, place: int, key: str) -> int:
        """Follow a bracket or a comma; where to go on, -1 where it does not fit."""
        if mark in "[{":
            if holders:
                key = self.begin(holders) or holders[-1].inner
            if not key:
                return -1
            if len(holders) + key.count(".") > DEEPEST:
                raise NestedTooDeeplyError(self.line, split(key)[0])
            holders.append(_Holder(key, mark == "["))
            return self.inner(holders[-1], place)
        if not holders or (mark != "," and (mark == "]") != holders[-1].is_list):
            return -1
        if mark != ",":
            holders.pop()
            return place
        holders[-1].entry += 1
        return self.inner(holders[-1], place)

    def inner(self, holder: _Holder, place: int) -> int:
        """Enter the next key of an inline table; where its value begins."""
        found = _INLINE_KEY.match(self.text, place) if not holder.is_list else None
        if found is None:
            holder.inner = ""
            return place
        holder.inner = self.enter(holder.key, found["key"])
        return found.end()


@dataclass(slots=True)
class _Holder:
    """A list or inline table that is open: its key, the present entry of a list, the present key of a table."""

    key: str
    is_list: bool
    entry: int = 0
    inner: str = ""


def split(key: str) -> list[str]:
    """The parts of a dotted key as written, without their quotes."""
    if _BARE.fullmatch(key):
        return [key]
    return [_unquoted(part) for part in _PARTS.findall(key)]


def _unquoted(part: str) -> str:
    if part[0] == "'":
        return part[1:-1]
    if part[0] != '"':
        return part
    if "\\" not in part:
        return part[1:-1]
    try:
        return str(tomllib.loads(f"x = {part}")["x"])
    except tomllib.TOMLDecodeError:
        return part[1:-1]


def _quoted(part: str | int) -> str:
    if isinstance(part, int):
        return str(part)
    escaped = part.replace("\\", "\\\\").replace('"', '\\"').replace("\n", "\\n")
    return f'"{escaped}"'
