"""Values as TOML text, in the way of writing that was there before where that can hold the new value."""

from __future__ import annotations

import datetime as dt
import math
import re
from collections.abc import Mapping, Sequence
from typing import Any

import tomlkit

from worksheet.sheetfile.locate import dotted

Stated = str | int | float | bool | dt.date | Sequence[Any] | Mapping[str, Any]
"""What a key may be set to; a mapping is written as an inline table."""

_LITERAL = re.compile(r"[^'\x00-\x08\x0a-\x1f\x7f]*")
_LITERAL_LINES = re.compile(r"(?!\n)[^'\x00-\x08\x0b-\x1f\x7f]*")


def plain(value: Stated) -> Any:
    """The value as a TOML reader gives it: a list for a sequence, a dict for a mapping.

    Raises: ValueError, for a number that does not exist. TypeError, for what TOML cannot hold.
    """
    if isinstance(value, Mapping):
        return {key: plain(inner) for key, inner in value.items()}
    if isinstance(value, str):
        return str(value)
    if isinstance(value, bool) or type(value) is dt.date:
        return value
    if isinstance(value, int):
        return int(value)
    if isinstance(value, float):
        if not math.isfinite(value):
            raise ValueError(f"{value} is not a value")
        return float(value)
    if isinstance(value, Sequence):
        return [plain(inner) for inner in value]
    raise TypeError(f"{type(value).__name__} has no place in a file")


def flat(value: Stated) -> str:
    """The value on one line."""
    value = plain(value)
    if isinstance(value, dict):
        return "{ " + ", ".join(f"{dotted([key])} = {flat(inner)}" for key, inner in value.items()) + " }"
    if isinstance(value, list):
        return "[" + ", ".join(map(flat, value)) + "]"
    return str(tomlkit.item(value).as_string())


def stated(value: Stated) -> str:
    """The value of a statement of its own: text of several lines stands on several lines."""
    if isinstance(value, str) and "\n" in value and _LITERAL_LINES.fullmatch(value.replace("'", "").lstrip("\n")):
        return '"""\n' + str(tomlkit.string(value, multiline=True).as_string())[3:]
    return flat(value)


def like(old: str, value: Stated) -> str:
    """The value, with the quotes of the text it takes the place of.

    Args:
        old: The old value as written.
        value: The new one.
    """
    if isinstance(value, str):
        if old.startswith(("'''", '"""')):
            first = "\n" if old[3:4] == "\n" or old[3:5] == "\r\n" or value.startswith("\n") else ""
            if old.startswith("'''") and _LITERAL_LINES.fullmatch(value.lstrip("\n")):
                return f"'''{first}{value}'''"
            if _LITERAL_LINES.fullmatch(value.replace("'", "").lstrip("\n")):
                return '"""' + first + str(tomlkit.string(value, multiline=True).as_string())[3:]
        if old.startswith("'") and _LITERAL.fullmatch(value):
            return f"'{value}'"
        return stated(value) if "\n" in value and "\n" in old else flat(value)
    return flat(value)
