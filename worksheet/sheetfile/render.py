"""Values as TOML text, in the way of writing that was there before where that can hold the new value."""

from __future__ import annotations

import datetime as dt
import math
import re
from collections.abc import Mapping, Sequence
from typing import Any

import tomlkit

from worksheet.sheetfile.locate import dotted
from worksheet.sheetfile.source import Written

Stated = str | int | float | bool | dt.date | Sequence[Any] | Mapping[str, Any]
"""What a key may be set to; a mapping is written as an inline table."""

_ESCAPES = {"\b": "\\b", "\t": "\\t", "\n": "\\n", "\f": "\\f", "\r": "\\r", '"': '\\"', "\\": "\\\\"}
_UNFIT = re.compile(r'[\x00-\x1f\x7f"\\]')
_UNFIT_ON_LINES = re.compile(r'[\x00-\x08\x0b-\x1f\x7f\\]|"(?=""|"?\Z)')
_NUMBER = re.compile(r"(?=[^.eE]*[.eE])[+-]?(?:0|[1-9][0-9]*)(?:\.[0-9]+)?(?:[eE][+-]?[0-9]+)?")
_LITERAL = re.compile(r"[^'\x00-\x08\x0a-\x1f\x7f]*")
_LINES = re.compile(r"[^\x00-\x08\x0b-\x1f\x7f]*")


def plain(value: Stated) -> Any:
    """The value as a TOML reader gives it: a list for a sequence, a dict for a mapping.

    Raises: ValueError, for a number that does not exist. TypeError, for what TOML cannot hold.
    """
    if isinstance(value, Mapping):
        return {key: plain(inner) for key, inner in value.items()}
    if isinstance(value, str):
        value.encode()  # half of a surrogate pair has no place in a file
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
    single = plain(value)
    if isinstance(value, Mapping):
        return "{ " + ", ".join(f"{dotted([key])} = {flat(inner)}" for key, inner in value.items()) + " }"
    if isinstance(value, str):
        return f'"{_escaped(single, _UNFIT)}"'
    if isinstance(value, Sequence):
        return "[" + ", ".join(map(flat, value)) + "]"
    if isinstance(value, Written) and _NUMBER.fullmatch(value.text):
        return value.text
    return str(tomlkit.item(single).as_string())


def stated(value: Stated) -> str:
    """The value of a statement of its own: text of several lines stands on several lines."""
    if isinstance(value, str) and "\n" in value and _LINES.fullmatch(value):
        return _on_lines(value, "\n")
    return flat(value)


def like(old: str, value: Stated) -> str:
    """The value, with the quotes of the text it takes the place of.

    Args:
        old: The old value as written.
        value: The new one.
    """
    if not isinstance(value, str):
        return flat(value)
    if old.startswith(("'''", '"""')) and _LINES.fullmatch(value):
        first = "\n" if old[3:5].startswith(("\n", "\r\n")) or value.startswith("\n") else ""
        if old.startswith("'''") and "'" not in value:
            return f"'''{first}{value}'''"
        return _on_lines(value, first)
    if old.startswith("'") and _LITERAL.fullmatch(value):
        return f"'{value}'"
    return stated(value) if old.startswith(("'", '"')) else flat(value)


def _on_lines(value: str, first: str) -> str:
    """Text of several lines between three quotes; `first` is a line feed after these that is no part of it."""
    return f'"""{first}{_escaped(value, _UNFIT_ON_LINES)}"""'


def _escaped(value: str, unfit: re.Pattern[str]) -> str:
    """Text with everything escaped that cannot stand between quotes, as TOML has it."""
    return unfit.sub(lambda found: "".join(_ESCAPES.get(one, f"\\u{ord(one):04x}") for one in found[0]), value)
