"""Variants of a sheet: named sets of changed values beside it, each held to what the sheet itself may state."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import replace
from types import MappingProxyType
from typing import Any, cast

from worksheet.model.keys import Key, Kind, Table
from worksheet.model.sheet import Value, Variant
from worksheet.model.sheet_keys import FINGERS, OWN, VARIANT
from worksheet.model.text import is_identifier
from worksheet.sheetfile.annotated import annotated, free_dimension
from worksheet.sheetfile.locate import below
from worksheet.sheetfile.reader import Reader, found
from worksheet.sheetfile.taken import ASSUME, Taken, refusal
from worksheet.sheetfile.values import READERS, subtable
from worksheet.stages.stage import MAIN

_ENTRY = cast(Table, VARIANT.entry)
_TEXTS = {key.name: key for key in _ENTRY.keys}
_LONGEST = 100


def read_variants(
    reader: Reader, keys: Taken, own: Mapping[str, Value], chosen: Mapping[str, Value], data: Mapping[str, Any]
) -> dict[str, Variant]:
    """Every [variant.NAME].

    Args:
        reader: Takes the problems.
        keys: What the sheet may hold.
        own: Its own names.
        chosen: What stands in its [choose], which a variant may leave to the solver.
        data: The file's data.
    """
    known = {**keys.assumptions, **keys.design, **{name: _own_key(value) for name, value in own.items()}}
    proposable = {name for name in keys.design if name in chosen or name not in data.get(ASSUME, {})}
    variants = {}
    for name, raw in subtable(reader, data.get(VARIANT.name, {}), VARIANT.name).items():
        where = below(VARIANT.name, name)
        if not is_identifier(name) or len(name) > _LONGEST:
            message = "expected letters, digits and underscores, not beginning with a digit, no Python keyword"
            reader.report(where, f"Found the variant name {found(name)}: {message}.")
        variants[name] = _variant(reader, keys, known, proposable, name, raw)
    return variants


def _own_key(value: Value) -> Key:
    """An own name keeps what it measures; without a unit beside its formula that is not known."""
    if value.formula is not None and not value.unit:
        return OWN
    return replace(OWN, dimension=free_dimension(value.unit))


def _variant(
    reader: Reader, keys: Taken, known: Mapping[str, Key], proposable: set[str], name: str, stated: object
) -> Variant:
    before, where = reader.count, below(VARIANT.name, name)
    raw = subtable(reader, stated, where)
    changes: dict[str, Value] = {}
    fingers: dict[str, int] = {}
    texts: dict[str, str] = {}
    for inner, entry in raw.items():
        key, place = known.get(inner), below(where, inner)
        if inner in _TEXTS:
            texts[inner] = READERS[Kind.TEXT](reader, _TEXTS[inner], entry, place) or ""
        elif key is None:
            reader.unknown(where, inner, [*known, *_TEXTS], lambda one: refusal(keys, one, ASSUME))
        elif key.kind is Kind.WHOLE:
            count = READERS[key.kind](reader, key, entry, place)
            if count is not None:
                fingers[inner.removesuffix(FINGERS.name).removesuffix("_") or MAIN] = count
        else:
            value = annotated(reader, replace(key, formula=False), entry, place, propose=inner in proposable)
            if value is not None:
                changes[inner] = value
    if not raw.keys() - _TEXTS.keys() and reader.count == before:
        reader.report(where, "Found a variant that changes nothing, expected at least one changed value.")
    return Variant(name, MappingProxyType(changes), MappingProxyType(fingers), line=reader.places.line(where), **texts)
