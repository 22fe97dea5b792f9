"""One TOML value read as what its key's description says: a quantity, text, a choice, a date, a formula, ...

Here belongs what is true of a kind of value wherever it stands, and the tables with fixed keys that hold such values. A
function of this module never raises over what a file holds: it reports a problem and gives None.
"""

from __future__ import annotations

import datetime as dt
from collections.abc import Callable, Mapping
from typing import Any

from worksheet.model import dimension as dim
from worksheet.model import formula, quantity
from worksheet.model.dimension import Dimension
from worksheet.model.keys import Key, Kind, Table
from worksheet.model.project_keys import CONDITION
from worksheet.model.sheet import Condition
from worksheet.model.text import clean, nearest
from worksheet.model.units import UnitError, parse_unit
from worksheet.sheetfile.locate import below
from worksheet.sheetfile.reader import Reader, found

_LARGEST_WHOLE = 2**53
_NOT_A_DIFFERENCE = {"celsius", "decibel"}


def text(reader: Reader, key: Key, raw: object, where: str) -> str | None:
    """Any text; a required one is not empty."""
    if not isinstance(raw, str):
        reader.refuse(where, raw, f"{key.title.lower()} as text in quotes")
        return None
    if key.required and not raw.strip():
        reader.refuse(where, raw, f"{key.title.lower()}, not an empty text")
        return None
    return raw


def name(reader: Reader, key: Key, raw: object, where: str) -> str | None:
    """A name that exists elsewhere."""
    if not isinstance(raw, str) or not raw.strip() or clean(raw) != raw:
        example = f', for example "{key.example}"' if key.example else ""
        reader.refuse(where, raw, f"a name in quotes{example}")
        return None
    return raw


def choice(reader: Reader, key: Key, raw: object, where: str) -> str | None:
    """One of the key's choices."""
    if isinstance(raw, str) and raw in key.choices:
        return raw
    near = nearest(raw, key.choices) if isinstance(raw, str) else None
    hint = f'; did you mean "{near}"?' if near else "."
    choices = " or ".join(f'"{one}"' for one in key.choices)
    reader.report(where, f"Found {found(raw)}, expected {choices}{hint}")
    return None


def flag(reader: Reader, _key: Key, raw: object, where: str) -> bool | None:
    """True or false."""
    if isinstance(raw, bool):
        return raw
    reader.refuse(where, raw, "true or false, without quotes")
    return None


def whole(reader: Reader, key: Key, raw: object, where: str) -> int | None:
    """A whole number within the key's range."""
    if isinstance(raw, bool) or not isinstance(raw, int):
        reader.refuse(where, raw, f"a whole number, {key.range_text()}")
        return None
    if abs(raw) > _LARGEST_WHOLE:
        reader.refuse(where, raw, f"a whole number, {key.range_text()}")
        return None
    expected = key.outside(raw)
    if expected is not None:
        reader.refuse(where, raw, f"a whole number, {expected}")
        return None
    return raw


def date(reader: Reader, _key: Key, raw: object, where: str) -> dt.date | None:
    """A day, without a time."""
    if type(raw) is dt.date:
        return raw
    reader.refuse(where, raw, "a day without quotes, for example 2026-11-02")
    return None


def expression(reader: Reader, _key: Key, raw: object, where: str) -> formula.Formula | None:
    """A formula; what its names mean is for others to say."""
    if not isinstance(raw, str):
        reader.refuse(where, raw, "a formula as text in quotes")
        return None
    try:
        return formula.parse(raw)
    except formula.FormulaError as error:
        reader.report(where, f"Found {found(raw)}, expected a formula: {clean(str(error))}")
        return None


def number(reader: Reader, key: Key, raw: object, where: str, dimension: Dimension | None = None) -> float | None:
    """A quantity within the key's range, in SI base units.

    `dimension` stands in place of the key's own, where that follows from a metric or from an own name.
    """
    kind = dimension or key.dimension or dim.NUMBER
    try:
        value = quantity.parse(raw, kind)
    except quantity.QuantityError as error:
        reader.report(where, str(error))
        return None
    expected = key.outside(value)
    if expected is not None:
        reader.refuse(where, raw, f"{key.title.lower()} {expected}")
        return None
    return value


def deviation(reader: Reader, key: Key, raw: object, where: str, dimension: Dimension | None) -> float | None:
    """A difference of two quantities: °C and dB are refused, because a difference is not what they state."""
    if isinstance(raw, str) and dimension is not None and dimension.also:
        try:
            unit = quantity.parse_free(raw)[1]
            shifted = bool(unit) and parse_unit(unit).kind in _NOT_A_DIFFERENCE
        except (quantity.QuantityError, UnitError):
            shifted = False  # reported below, with the dimension that is wanted
        if shifted:
            reader.refuse(where, raw, f"a difference in {dimension.unit}")
            return None
    return number(reader, key, raw, where, dimension)


def condition(reader: Reader, _key: Key, raw: object, where: str) -> Condition | None:
    """An inline table with one corner, one temperature and one supply."""
    if not isinstance(raw, dict):
        reader.refuse(where, raw, "a table { process = ..., temperature = ..., supply = ... }")
        return None
    fields = table(reader, CONDITION, raw, where)
    return None if len(fields) < len(CONDITION.keys) else Condition(**fields)


def table(reader: Reader, description: Table, raw: Mapping[str, Any], where: str) -> dict[str, Any]:
    """Read a table whose keys have fixed names; tables inside it are the caller's.

    Returns: what could be read, by key.
    """
    known = {key.name: key for key in description.keys}
    fields: dict[str, Any] = {}
    for inner, entry in raw.items():
        key = known.get(inner)
        if key is not None:
            value = READERS[key.kind](reader, key, entry, below(where, inner))
            if value is not None:
                fields[inner] = value
        elif description.table(inner) is None:
            reader.unknown(where, inner, [*known, *(inside.name for inside in description.tables)])
    missing(reader, description, raw, where)
    return fields


def missing(reader: Reader, description: Table, raw: Mapping[str, Any], where: str) -> None:
    """Report what a table must hold and does not."""
    for key in description.keys:
        if key.required and key.name not in raw:
            example = (
                f", for example {key.example if key.kind is Kind.WHOLE else _quote(key.example)}" if key.example else ""
            )
            reader.report(below(where, key.name), f"The key is missing; expected {key.title.lower()}{example}.")
    for inside in description.tables:
        if inside.required and inside.name not in raw:
            reader.report(below(where, inside.name), f"The table [{inside.name}] is missing. {inside.help}")


def part_of(description: Table, name: str) -> Table:
    """The table of that name, which the description has. KeyError where it has not."""
    part = description.table(name)
    if part is None:
        raise KeyError(name)
    return part


def subtable(reader: Reader, raw: object, where: str) -> dict[str, Any]:
    """A table, or an empty one with a problem reported."""
    if isinstance(raw, dict):
        return raw
    reader.refuse(where, raw, f"a table [{clean(where)}]")
    return {}


def _quote(example: str) -> str:
    return example if example.startswith(("{", '"')) else f'"{example}"'


READERS: Mapping[Kind, Callable[[Reader, Key, object, str], Any]] = {
    Kind.QUANTITY: number,
    Kind.TEXT: text,
    Kind.CHOICE: choice,
    Kind.NAME: name,
    Kind.FLAG: flag,
    Kind.WHOLE: whole,
    Kind.DATE: date,
    Kind.FORMULA: expression,
    Kind.CONDITION: condition,
}
"""How a value of each kind is read, where it stands alone and the key says its dimension."""
