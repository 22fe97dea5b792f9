"""Whether two pieces of a file say the same: by value, not by how they are written.

Two ways of writing one quantity are the same, and so are a bare value and a table that holds nothing but it; text is
the same only where every character is.
"""

from __future__ import annotations

from collections.abc import Iterator
from typing import Any

from worksheet.model.keys import ANNOTATIONS, Key, Kind, Table
from worksheet.model.quantity import QuantityError, parse_free
from worksheet.model.sheet_keys import SHEET
from worksheet.model.units import UnitError, parse_unit

VALUE, FORMULA, NOTE = "value", "formula", "note"
TARGET, OWN = "target", "own"
_NUMBERS = {"assume", "choose", OWN, "bias", TARGET, "device", "corner", "conditions", "budget", "variant", "chain"}


def _keys(table: Table) -> Iterator[Key]:
    yield from table.keys
    for inner in (*table.tables, *((table.entry,) if isinstance(table.entry, Table) else ())):
        yield from _keys(inner)


_TEXTS = {key.name for table in (SHEET, ANNOTATIONS) for key in _keys(table) if key.kind is not Kind.QUANTITY}


def stated(path: tuple[str | int, ...], value: Any) -> bool:
    """Whether it states one value: bare, or a table with a value or a formula. A target is a table of limits."""
    if not isinstance(value, dict):
        return True
    return len(path) > 1 and path[0] != TARGET and (VALUE in value or FORMULA in value)


def core(value: Any) -> dict[str, Any]:
    """What states a value, without the note beside it."""
    return {key: one for key, one in value.items() if key != NOTE} if isinstance(value, dict) else {VALUE: value}


def same(path: tuple[str | int, ...], one: Any, other: Any) -> bool:
    """Whether two values say the same at a path of a file.

    Args:
        path: Where they stand; () also for an entry of an array of tables, whose quantities are compared as text.
        one, other: Plain data, None for nothing.
    """
    if isinstance(one, dict) != isinstance(other, dict):
        bare, table = (other, one) if isinstance(one, dict) else (one, other)
        return stated(path, table) and table.keys() == {VALUE} and same((*path, VALUE), table[VALUE], bare)
    if isinstance(one, dict):
        return one.keys() == other.keys() and all(same((*path, key), one[key], other[key]) for key in one)
    if isinstance(one, list) and isinstance(other, list):
        return len(one) == len(other) and all(same(path, *pair) for pair in zip(one, other, strict=True))
    if _plain_type(one) is _plain_type(other) and one == other:
        return True
    if len(path) < 2 or path[0] not in _NUMBERS or path[-1] in _TEXTS:
        return False
    here, there = _quantity(one), _quantity(other)
    if here is None or there is None:
        return False
    (number, unit), (number_there, unit_there) = here, there
    # A bare number is in the base unit of its key; an own name has no unit but the one that is written.
    return number == number_there and (unit == unit_there or (path[0] != OWN and "" in {unit, unit_there}))


def _plain_type(value: Any) -> type:
    return float if isinstance(value, float) else type(value)


def _quantity(value: Any) -> tuple[float, str] | None:
    """A quantity as a number and the base unit it is in; None for anything else."""
    if isinstance(value, bool) or not isinstance(value, str | int | float):
        return None
    try:
        number, unit = parse_free(value)
        return number, parse_unit(unit).base if unit else ""
    except (QuantityError, UnitError):
        return None
