"""The text of one inline table, changed without touching what stands beside the change.

An inline table is a value and small; what surrounds its entries (spaces after the brace, before a comma) is the user's
way of writing and stays. The text is known to be valid TOML before anything here sees it.
"""

from __future__ import annotations

import re
from collections.abc import Mapping
from typing import Any

from worksheet.sheetfile.locate import BASIC, DOTTED, LITERAL, dotted, split
from worksheet.sheetfile.render import flat

_TOKEN = re.compile(
    rf"""\"\"\"(?:[^"\\]|\\[\s\S]|"(?!""))*+\"{{3,5}}|'''(?:[^']|'(?!''))*+'{{3,5}}|{BASIC}|{LITERAL}|\#[^\n]*+|[\[{{]|[\]}}]|,|\s++
      |[^\s"'\[\]{{}},\#]++""",
    re.VERBOSE,
)
_KEY = re.compile(rf"[ \t]*+(?P<key>{DOTTED})[ \t]*+=[ \t]*+")


def add(table: str, key: str, value: str) -> str:
    """The table with one more entry at its end.

    Args:
        table: Text from brace to brace.
        key, value: As written in TOML.
    """
    entries, spaces = _entries(table)
    if not entries:
        return f"{{ {key} = {value} }}"
    return "{" + ",".join([*entries, f" {key} = {value}"]) + spaces + "}"


def remove(table: str, key: str) -> str:
    """The table without one entry. KeyError where it has none of that key.

    Args:
        table: Text from brace to brace.
        key: Without quotes.
    """
    entries, spaces = _entries(table)
    place = _place(entries, key)
    rest = entries[:place] + entries[place + 1 :]
    if place == 0 and rest:
        rest[0] = entries[0][: len(entries[0]) - len(entries[0].lstrip())] + rest[0].lstrip()
    return "{" + ",".join(rest) + spaces + "}" if rest else "{}"


def swap(table: str, old: str, key: str, value: str) -> str:
    """The table with one entry under another key and with another value. KeyError where it has none of the old key.

    Args:
        table: Text from brace to brace.
        old: Without quotes.
        key, value: As written in TOML.
    """
    entries, spaces = _entries(table)
    place = _place(entries, old)
    entry = entries[place]
    before, after = entry[: len(entry) - len(entry.lstrip())], entry[len(entry.rstrip()) :]
    entries[place] = f"{before}{key} = {value}{after}"
    return "{" + ",".join(entries) + spaces + "}"


def join(table: str, beside: Mapping[str, Any]) -> str:
    """The table with some more entries at its end."""
    for key, value in beside.items():
        table = add(table, dotted([key]), flat(value))
    return table


def _entries(table: str) -> tuple[list[str], str]:
    """What stands between the commas, the last one without the spaces before the closing brace; and these."""
    inside = table[1:-1]
    entries, start, depth = [], 0, 0
    for token in _TOKEN.finditer(inside):
        if token[0] in {"[", "{"}:
            depth += 1
        elif token[0] in {"]", "}"}:
            depth -= 1
        elif token[0] == "," and depth == 0:
            entries.append(inside[start : token.start()])
            start = token.end()
    last = inside[start:]
    if last.strip():
        entries.append(last.rstrip())
    return entries, last[len(last.rstrip()) :]


def _place(entries: list[str], key: str) -> int:
    for place, entry in enumerate(entries):
        found = _KEY.match(entry)
        if found is not None and split(found["key"]) == [key]:
            return place
    raise KeyError(key)
