"""Values that may carry what is known about them: a range, a source, trust, a note; or a formula in their place.

Here belongs everything about the table that may stand in place of a bare value, and about lists of conditions.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import replace
from functools import lru_cache
from typing import Any

from worksheet.model import dimension as dim
from worksheet.model import quantity
from worksheet.model.dimension import Dimension
from worksheet.model.keys import ANNOTATIONS, Key, Kind
from worksheet.model.sheet import Value
from worksheet.model.sheet_keys import PROPOSE
from worksheet.model.units import parse_unit
from worksheet.sheetfile.locate import below
from worksheet.sheetfile.reader import Reader, found
from worksheet.sheetfile.source import Written
from worksheet.sheetfile.values import READERS, deviation, expression, number

_ANNOTATIONS = {key.name: key for key in ANNOTATIONS.keys}
_VALUE, _FORMULA = "value", "formula"


def listed(reader: Reader, key: Key, raw: object, where: str) -> tuple[Any, ...] | None:
    """One value or a list of them, without repetition; for conditions."""
    read = READERS[key.kind]
    entries = raw if isinstance(raw, list) else [raw]
    if not entries:
        reader.refuse(where, raw, f"at least one {key.title.lower()}")
        return None
    places = [f"{where}.{index}" for index in range(len(entries))] if isinstance(raw, list) else [where]
    values = [read(reader, key, entry, place) for entry, place in zip(entries, places, strict=True)]
    return None if None in values else tuple(dict.fromkeys(values))


def annotated(reader: Reader, key: Key, raw: object, where: str, *, propose: bool = False) -> Value | None:
    """A bare value, or a table with a value or a formula and what is known about it.

    `propose` says whether the value may be left to the solver.
    """
    line = reader.places.line(where)
    if not isinstance(raw, dict):
        return _bare(reader, key, raw, where, line, propose=propose)
    before = reader.count
    for inner in raw:
        if inner not in _ANNOTATIONS:
            reader.unknown(where, inner, _ANNOTATIONS)
    given = [inner for inner in (_VALUE, _FORMULA) if inner in raw]
    if len(given) != 1:
        both = "both value and formula" if given else "neither value nor formula"
        reader.report(where, f"Found {both}, expected one of them.")
        return None
    if given == [_FORMULA]:
        stated = _formula(reader, key, raw[_FORMULA], below(where, _FORMULA), line)
    else:
        stated = _bare(reader, key, raw[_VALUE], below(where, _VALUE), line, propose=propose)
    if stated is None:
        return None
    fields = _beside(reader, key, raw, where, stated)
    if reader.count > before:
        return None
    return replace(stated, **fields) if fields else stated


def _bare(reader: Reader, key: Key, raw: object, where: str, line: int | None, *, propose: bool) -> Value | None:
    """A value without a table around it."""
    if raw == PROPOSE:
        if propose:
            return Value(propose=True, text=PROPOSE, line=line)
        reader.refuse(where, raw, "a value: only what stands in [choose] can be left to the solver")
        return None
    if key.listed and isinstance(raw, list):
        numbers = listed(reader, key, raw, where)
        if numbers is None:
            return None
        return Value(numbers[0], numbers=numbers, text=", ".join(map(_typed, raw)), line=line)
    unit = ""
    if key.dimension is None:
        try:
            value, unit = quantity.parse_free(raw)
        except quantity.QuantityError as error:
            reader.report(where, str(error))
            return None
    else:
        known = number(reader, key, raw, where)
        if known is None:
            return None
        value = known
    return Value(value, numbers=(value,), unit=unit, text=_typed(raw), line=line)


def _formula(reader: Reader, key: Key, raw: object, where: str, line: int | None) -> Value | None:
    """A formula in place of a value."""
    if not key.formula:
        reader.report(where, f"Found a formula, expected a value: {key.title.lower()} is stated as a number.")
        return None
    read = expression(reader, key, raw, where)
    return None if read is None else Value(formula=read, text=read.text, line=line)


def _beside(reader: Reader, key: Key, raw: Mapping[str, Any], where: str, stated: Value) -> dict[str, Any]:
    """What stands beside the value, checked against it."""
    dimension = key.dimension or free_dimension(stated.unit or _first_unit(raw))
    fields: dict[str, Any] = {}
    for inner, entry in raw.items():
        annotation = _ANNOTATIONS.get(inner)
        if annotation is None or inner in {_VALUE, _FORMULA}:
            continue
        place = below(where, inner)
        if annotation.kind is not Kind.QUANTITY:
            fields[inner] = READERS[annotation.kind](reader, annotation, entry, place)
        elif inner == "standard_error":
            fields[inner] = deviation(reader, annotation, entry, place, dimension)
        elif stated.propose:
            reader.report(place, f"Found a range beside {PROPOSE}, expected none: what is proposed has no range.")
        else:
            fields[inner] = number(reader, key, entry, place, dimension)
    in_order(reader, where, raw, fields.get("low"), stated.numbers, fields.get("high"))
    return fields


def _first_unit(raw: Mapping[str, Any]) -> str:
    """The unit of the first annotation that has one: beside a formula of an own name nothing else says it."""
    for inner, entry in raw.items():
        if inner in _ANNOTATIONS and _ANNOTATIONS[inner].kind is Kind.QUANTITY:
            try:
                unit = quantity.parse_free(entry)[1]
            except quantity.QuantityError:
                continue
            if unit:
                return unit
    return ""


def in_order(
    reader: Reader, where: str, raw: Mapping[str, Any], low: float | None, values: Iterable[float], high: float | None
) -> None:
    """Report a range that is empty, or that does not hold the value beside it."""
    for value in values:
        if low is not None and low > value:
            reader.refuse(below(where, "low"), raw["low"], "at most the value itself")
            return
        if high is not None and high < value:
            reader.refuse(below(where, "high"), raw["high"], "at least the value itself")
            return
    if low is not None and high is not None and low > high:
        reader.refuse(below(where, "low"), raw["low"], f"at most the high end, {found(raw['high'])}")


@lru_cache(maxsize=256)
def free_dimension(unit: str) -> Dimension:
    """The dimension of a unit text that a user wrote for something of his own ("kHz", "" for none).

    Raises: UnitError, where the text is no product of known units.
    """
    if not unit:
        return dim.NUMBER
    known = parse_unit(unit)
    name = f"value in {known.base}" if known.base else "number"
    also = ("dB", "rms", "°C")
    return Dimension(name, known.base, known.exponents, plain=not known.base, example=f"1 {unit}", also=also)


def _typed(raw: object) -> str:
    """A value as it was typed."""
    if isinstance(raw, str):
        return raw
    return raw.text if isinstance(raw, Written) else str(raw)
